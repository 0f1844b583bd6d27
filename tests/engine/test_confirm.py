"""Findings and open stages held against ngspice."""

import math
import re
import shutil

import pytest

from railguard.engine.ngspice import find
from railguard.reviewing import review
from railguard.simulated import Ngspiced

pytestmark = pytest.mark.skipif(shutil.which("ngspice") is None, reason="ngspice is not installed")

RAILS = "VP vp 0 12\nVN vn 0 -12\nCP vp 0 100n\nCN vn 0 100n\n.end\n"


def simulated(cards, *, fill=False, confirm=True):
    """Review cards on +-12 V with ngspice beside."""
    engine = Ngspiced(find(), fill=fill, confirm=confirm)
    return review(f"station\n{cards}\n{RAILS}", engine=engine).designs[0]


def messages(design, rule):
    """Return the messages of one rule, consequences too."""
    found, queue = [], list(design.findings)
    while queue:
        finding = queue.pop()
        queue += finding.consequences
        if finding.rule == rule:
            found.append(finding.message)
    return found


@pytest.mark.parametrize("device", ["TL072", "LM358", "OPA2134", "NE5532"])
@pytest.mark.parametrize("gain", [20, 50])
def test_clipping_is_confirmed(device, gain):
    """An output asked far beyond its rail clips in ngspice as well."""
    cards = f"VIN in 0 SIN(0 1 100)\nR1 in n 1k\nR2 n out {gain}k\nXU1 0 n vp vn out {device}"
    (message,) = messages(simulated(cards), "headroom-output")
    assert "Confirmed: ngspice reaches" in message


@pytest.mark.parametrize("device", ["TL072", "LM358", "NE5532"])
def test_overload_is_confirmed(device):
    """A load of 30 ohms takes more than the device's short-circuit current."""
    cards = f"VIN in 0 SIN(0 5 100)\nXU1 in out vp vn out {device}\nRL out 0 30"
    (message,) = messages(simulated(cards), "drive-current")
    assert "Confirmed: ngspice reaches" in message


def test_corner_is_left_open():
    """What fails only at a corner of tolerance is not told from a nominal run."""
    cards = "VIN in 0 SIN(0 0.92 100)\nR1 in n 1k\nR2 n out 10k\nXU1 0 n vp vn out TL072"
    for message in messages(simulated(cards), "headroom-output"):
        assert "Confirmed" not in message


def test_stage_behind_diodes_gets_its_range():
    """A half-wave rectifier: the built-in solver leaves it open, ngspice fills it in."""
    cards = (
        "VIN in 0 SIN(0 1 100)\nR1 in n 10k\nR2 n r 10k\nD1 n o DX\nD2 o r DX\nRL r 0 100k\n"
        "XU1 0 n vp vn o TL072\n.model DX D"
    )
    assert simulated(cards, fill=False).design.stages[0].output.demand.high is None
    found = simulated(cards, fill=True).design.stages[0].output.demand
    assert found.high == pytest.approx(1.6, abs=0.15)
    assert found.low == pytest.approx(-0.6, abs=0.15)


def test_a_circuit_ngspice_refuses_costs_only_itself():
    """An engine error is a remark, and the next circuit runs as if nothing had been."""
    engine = Ngspiced(find(), fill=False, confirm=True)
    bad = "station\nV1 a 0 1\nV2 a 0 2\nXU1 a out vp vn out TL072\n" + RAILS
    good = (
        "station\nVIN in 0 SIN(0 1 100)\nR1 in n 1k\nR2 n out 50k\nXU1 0 n vp vn out TL072\n"
        + RAILS
    )
    first, second = review([bad, good], engine=engine).designs
    assert any("ngspice" in remark.message for remark in first.design.remarks)
    assert "Confirmed" in messages(second, "headroom-output")[0]


def test_a_stage_that_clips_in_the_simulation_is_asked_for_more_than_it_gives():
    """By hand: a diode drop below 1.9 V, twenty times over, is 25 V and more; 12 V are there."""
    cards = (
        "VIN in 0 SIN(1 0.9 10)\nD1 in p DX\nR1 p 0 10k\nXU1 p n vp 0 out LM358\n"
        "R2 out n 180k\nR3 n 0 9.53k\n.model DX D(IS=1e-14)"
    )
    (design,) = [simulated(cards, fill=True, confirm=False)]
    (stage,) = design.design.stages
    gain = 1 + 180 / 9.53
    drop = 0.0259 * math.log(1.3e-3 / 10 / 1e-14)
    assert stage.output.demand.high == pytest.approx(gain * (1.9 - drop), rel=0.02)
    (finding,) = [f for f in design.findings if f.rule == "headroom-output"]
    assert finding.severity in ("critical", "major")


def test_a_rectifier_that_rests_at_its_rail_is_not_asked_beyond_it():
    """While its diode blocks there is no loop, and nobody asks the output for anything."""
    cards = (
        "VIN in 0 SIN(0 1 100)\nXU1 in n vp vn o TL072\nD1 o n DX\nR1 n 0 10k\n"
        ".model DX D(IS=1e-14)"
    )
    design = simulated(cards, fill=True, confirm=False)
    assert [f for f in design.findings if f.severity in ("critical", "major")] == []


FOLLOWED = (
    "VIN in 0 SIN(1 0.5 10)\nQ1 vp in e QN\nRE e vn 10k\nR1 0 n 1k\nR2 n out {ohms}\n"
    "XU1 e n vp vn out OPA2134\nRL out 0 10k\n.model QN NPN(BF=200 IS=1e-14)"
)


def test_what_ngspice_filled_in_is_lowered_by_as_much_as_is_needed():
    """An emitter follower before a gain of 40; its level is multiplied too, and counts from zero.

    39 kilohm ask for 33.5 V; the gain named leaves what the data sheet guarantees, and no more.
    """
    before = simulated(FOLLOWED.format(ohms="39k"), fill=True, confirm=False)
    (found,) = [f for f in before.findings if f.rule == "headroom-output"]
    named = re.search(r"R2 = (\d+) kΩ instead of 39 kΩ", found.remedy)
    assert named, found.remedy
    kilohm = int(named[1])
    after = simulated(FOLLOWED.format(ohms=f"{kilohm}k"), fill=True, confirm=False)
    assert not [f for f in after.findings if f.severity in ("critical", "major")]
    assert all("only" in message for message in messages(after, "headroom-output"))  # reserve
    (stage,) = after.design.stages
    assert 0.9 * stage.output.guaranteed.high < stage.output.demand.high
