"""Thirty faulty circuits: what the built-in solver says of them, and what ngspice does.

Each breaks one limit for certain, typical device and nominal values. Every finding on range and
current of theirs is confirmed by a simulation, consequences too; what stays open is listed with the
reason. Ten sound circuits beside them reach in ngspice what the built-in solver asks of them.
"""

import re
import shutil
from pathlib import Path

import pytest

from railguard.devices import catalogue
from railguard.engine.ngspice import find
from railguard.engine.operating import simulate
from railguard.reviewing import review
from railguard.simulated import CONFIRMED, Ngspiced

pytestmark = pytest.mark.skipif(shutil.which("ngspice") is None, reason="ngspice is not installed")

SUPPLIES = {
    "split": "VP vp 0 12\nVN vn 0 -12\nC1 vp 0 100n\nC2 vn 0 100n\n",
    "12 V": "VP vp 0 12\nC1 vp 0 100n\n",
    "5 V": "VP vp 0 5\nC1 vp 0 100n\n",
    "3.3 V": "VP vp 0 3.3\nC1 vp 0 100n\n",
    "own": "",
}

FAULTY = """
* inverting, split: headroom-output
VIN in 0 SIN(0 1 100)
R1 in n 1k
R2 n out 20k
XU1 0 n vp vn out TL072

* non-inverting, split: headroom-output
VIN in 0 SIN(0 1.5 100)
R1 0 n 1k
R2 n out 15k
XU1 in n vp vn out OPA2134

* single supply level, 12 V: headroom-output
VIN in 0 1
R1 0 n 1k
R2 n out 14k
XU1 in n vp 0 out LM358
RL out 0 10k

* CMOS top, 5 V: headroom-output
VIN in 0 SIN(1 0.5 50)
R1 0 n 10k
R2 n out 30k
XU1 in n vp 0 out MCP6002

* CMOS bottom, 5 V: headroom-output
VR r 0 2.5
VIN in 0 SIN(2.5 1 50)
R1 in n 10k
R2 n out 30k
XU1 r n vp 0 out MCP6002

* difference, split: headroom-output
VA a 0 SIN(0 0.5 100)
VB b 0 -0.3
R1 a n 1k
R2 n out 20k
R3 b p 1k
R4 p 0 20k
XU1 p n vp vn out NE5532

* summing, split: headroom-output
VA a 0 SIN(0 1 100)
VB b 0 -0.6
R1 a n 1k
R3 b n 1k
R2 n out 10k
XU1 0 n vp vn out TL072

* transimpedance, 5 V: headroom-output
IPD 0 n SIN(-20u 20u 100)
R2 n out 200k
C2 n out 10p
XU1 0 n vp 0 out TLV9002

* Sallen-Key with gain, split: headroom-output
VIN in 0 SIN(0 5 100)
R1 in a 10k
R2 a p 10k
C3 a out 10n
C4 p 0 10n
R3 n 0 10k
R4 n out 18k
XU1 p n vp vn out TL072

* second stage, split: headroom-output
VIN in 0 SIN(0 0.1 100)
R1 in n 1k
R2 n a 10k
XU1 0 n vp vn a TL072
R3 a m 1k
R4 m out 20k
XU2 0 m vp vn out TL072

* loaded, split: headroom-output
VIN in 0 SIN(0 11 100)
XU1 in out vp vn out TL072
RL out 0 2k

* series in the rail, own: headroom-output
VB bat 0 5
RS bat vp 100
C1 vp 0 100n
VIN in 0 SIN(2.5 2.4 100)
XU1 in out vp 0 out TLV9002
RL out 0 1k

* coupled, 12 V: headroom-output
VIN in 0 SIN(0 1 100)
CI in p 10u
RA vp p 100k
RB p 0 100k
CB2 g 0 100u
R1 n g 10k
R2 n out 100k
XU1 p n vp 0 out LM358

* follower into 30 ohm, split: drive-current
VIN in 0 SIN(0 5 100)
XU1 in out vp vn out TL072
RL out 0 30

* follower into 60 ohm, split: drive-current
VIN in 0 SIN(0 8 100)
XU1 in out vp vn out NE5532
RL out 0 60

* small feedback, split: drive-current
VIN in 0 SIN(0 3 100)
R1 in n 30
R2 n out 60
XU1 0 n vp vn out TL072

* sinking, 12 V: drive-current
VIN in 0 2
XU1 in out vp 0 out LM358
RL vp out 100

* CMOS into 50 ohm, 5 V: drive-current
VIN in 0 SIN(2.5 2 50)
XU1 in out vp 0 out MCP6002
RL out 0 50

* 3 V into 20 ohm, 3.3 V: drive-current
VIN in 0 SIN(1.65 1 50)
XU1 in out vp 0 out TLV9002
RL out 0 20

* capacitor, split: drive-current
VIN in 0 SIN(0 8 20k)
XU1 in out vp vn out OPA2134
CL out 0 220n

* two loads, split: drive-current
VIN in 0 SIN(0 5 100)
XU1 in out vp vn out TL072
RL out 0 150
RM out 0 60

* negative load, split: drive-current
VIN in 0 -6
XU1 in out vp vn out TL072
RL out 0 60

* follower to the rail, 12 V: headroom-input
VIN in 0 SIN(6 5.9 100)
XU1 in out vp 0 out LM358
RL out 0 100k

* gain 1.05, 5 V: headroom-input
VIN in 0 SIN(2.5 2 100)
R1 n 0 100k
R2 n out 5k
XU1 in n vp 0 out LM358

* below the negative rail, 5 V: headroom-input
VIN in 0 SIN(0 1 100)
XU1 in out vp 0 out MCP6002
RL out 0 10k

* reference too high, 12 V: headroom-input
VR r 0 11.5
VIN in 0 SIN(11.5 0.1 100)
R1 in n 10k
R2 n out 10k
XU1 r n vp 0 out LM358

* single supply JFET, 12 V: headroom-input
VIN in 0 SIN(0.5 0.4 100)
R1 n 0 10k
R2 n out 90k
XU1 in n vp 0 out TL072

* bridge at 5 V, 5 V: headroom-input
VX e 0 5
RA e p 1k
RB p 0 12k
R3 e q 1k
R4 q 0 12.1k
R5 q n 10k
R6 n out 10k
XU1 p n vp 0 out LM358
RL out 0 10k

* sense at the supply, 12 V: headroom-input
VIN in 0 12
R1 in a 100
R2 a 0 12k
XU1 a out vp 0 out OPA2134
RL out 0 100k

* divider from above, 3.3 V: headroom-input
VIN in 0 12
RA in p 10k
RB p 0 4.7k
XU1 p out vp 0 out LMV358
RL out 0 100k
"""

SOUND_ONES = """
* inverting, split: nothing
VIN in 0 SIN(0 0.3 100)
R1 in n 1k
R2 n out 20k
XU1 0 n vp vn out TL072

* non-inverting, split: nothing
VIN in 0 SIN(0 0.5 100)
R1 0 n 1k
R2 n out 15k
XU1 in n vp vn out OPA2134

* single supply, 12 V: nothing
VIN in 0 1
R1 0 n 1k
R2 n out 4k
XU1 in n vp 0 out LM358
RL out 0 10k

* CMOS, 5 V: nothing
VIN in 0 SIN(0.6 0.4 50)
R1 0 n 10k
R2 n out 30k
XU1 in n vp 0 out MCP6002

* difference, split: nothing
VA a 0 SIN(0 0.2 100)
VB b 0 -0.1
R1 a n 1k
R2 n out 20k
R3 b p 1k
R4 p 0 20k
XU1 p n vp vn out NE5532

* summing, split: nothing
VA a 0 SIN(0 0.4 100)
VB b 0 -0.3
R1 a n 1k
R3 b n 1k
R2 n out 10k
XU1 0 n vp vn out TL072

* transimpedance, 5 V: nothing
IPD 0 n SIN(-10u 9u 100)
R2 n out 200k
C2 n out 10p
XU1 0 n vp 0 out TLV9002

* Sallen-Key, split: nothing
VIN in 0 SIN(0 2 1k)
R1 in a 10k
R2 a p 10k
C3 a out 10n
C4 p 0 10n
R3 n 0 10k
R4 n out 5k
XU1 p n vp vn out TL072

* loaded, split: nothing
VIN in 0 SIN(0 5 100)
XU1 in out vp vn out NE5532
RL out 0 600

* two tones, split: nothing
VA a 0 SIN(0 1 40)
VB b 0 SIN(0 1 33)
R1 a n 10k
R3 b n 10k
R2 n out 10k
XU1 0 n vp vn out TL072
RL out 0 20k

* a loop's current in two seconds, split: nothing
ILOOP 0 in PWL(0 0.004 1 0.020 2 0.004)
RS in 0 75
RP in p 4.99k
C1X p 0 100n
R1 n 0 10k
R2 n out 10k
XU1 p n vp vn out TL072
RL out 0 20k

* capacitor, split: nothing
VIN in 0 SIN(0 1 5k)
XU1 in out vp vn out OPA2134
RI out o 100
CL o 0 10n
"""


def cases(text):
    """Return (rule, deck) by name: each case is a comment `name, supply: rule` and its cards."""
    found = {}
    for block in text.strip().split("\n\n"):
        heading, _, cards = block.partition("\n")
        name, supply, rule = re.fullmatch(r"\* (.+), (.+): (.+)", heading).groups()
        found[name] = rule, f"gauge\n{cards}\n{SUPPLIES[supply]}.end\n"
    return found


FAULTS, SOUND = cases(FAULTY), cases(SOUND_ONES)
SHIPPED = Path(__file__).resolve().parents[2] / "fixtures" / "faults"


def flat(findings):
    """Yield findings and their consequences."""
    for finding in findings:
        yield finding
        yield from flat(finding.consequences)


def confirmed(source):
    """Return the findings on range and current of a deck, ngspice beside it."""
    engine = Ngspiced(find(), fill=False, confirm=True)
    (design,) = review(source, engine=engine, plugins=False).designs
    return [f for f in flat(design.findings) if f.rule in CONFIRMED]


def test_there_are_thirty():
    """Of each of the three rules, and of every supply."""
    assert len(FAULTS) == 30
    assert {rule for rule, _ in FAULTS.values()} == set(CONFIRMED)


@pytest.mark.parametrize("name", FAULTS)
def test_ngspice_agrees(name):
    """The rule that is meant speaks, and nothing it or its neighbours say is refuted."""
    rule, deck = FAULTS[name]
    found = confirmed(deck)
    assert rule in {f.rule for f in found}
    for finding in found:
        assert "Confirmed: " in finding.message


@pytest.mark.parametrize("rule", CONFIRMED)
def test_ngspice_agrees_on_the_shipped_faults(rule):
    """The station's variants with a fault."""
    found = confirmed(SHIPPED / f"{rule}.cir")
    assert rule in {f.rule for f in found}
    assert all("Confirmed: " in f.message for f in found if f.corner == "nominal")


@pytest.mark.parametrize("name", SOUND)
def test_ngspice_reaches_what_is_asked_of_a_sound_stage(name):
    """Range and current within 2 %; offset and bias are no part of the demand."""
    (found,) = review(SOUND[name][1], plugins=False).designs
    assert not [f for f in flat(found.findings) if f.rule in CONFIRMED and f.corner == "nominal"]
    (stage,) = found.design.stages
    done = simulate(found.design, catalogue.load(), find()).stages["XU1"]
    volts = 0.02 * max(stage.output.demand.span, 1.0)
    assert done.output.high == pytest.approx(stage.output.demand.high, abs=volts)
    assert done.output.low == pytest.approx(stage.output.demand.low, abs=volts)
    asked, sunk = stage.current.demand_source, stage.current.demand_sink
    amps = 0.02 * max(asked, sunk) + 1e-5
    assert max(done.current.high, 0.0) == pytest.approx(asked, abs=amps)
    assert max(-done.current.low, 0.0) == pytest.approx(sunk, abs=amps)


def test_tones_that_cannot_meet_in_time_leave_it_open():
    """A hundredth of a hertz apart: what was not reached in the run may be reached later."""
    cards = (
        "gauge\nVA a 0 SIN(0 4 1000)\nVB b 0 SIN(0 4 1000.01)\nR1 a n 1k\nR3 b n 1k\nR2 n out 2k\n"
        f"XU1 0 n vp vn out TL072\n{SUPPLIES['split']}.end\n"
    )
    (finding,) = [f for f in confirmed(cards) if f.rule == "headroom-output"]
    assert "Not confirmed: its tones are too near one another" in finding.message
