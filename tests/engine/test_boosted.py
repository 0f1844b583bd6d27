"""Stages with transistors in their loops against ngspice, with the whole transistor in it."""

import shutil
from pathlib import Path

import pytest

from railguard.devices import catalogue
from railguard.engine.ngspice import find
from railguard.engine.operating import simulate
from railguard.reviewing import review
from railguard.rules.working import standstill
from railguard.simulated import Ngspiced

pytestmark = pytest.mark.skipif(shutil.which("ngspice") is None, reason="ngspice is not installed")

SOUND = Path(__file__).resolve().parents[2] / "fixtures" / "sound"
RAILS = "VP vp 0 12\nVN vn 0 -12\nCP vp 0 100n\nCN vn 0 100n\n.end\n"
SINK = (
    "VIN in 0 SIN(1 0.8 10)\nXU1 in n vp vn o TL072\nRB o b 100\nQ1 c b e QN\nRE e 0 {ohms}\n"
    "RF e n 1k\nCF n o 1n\nRC vp c {load}\n.model QN NPN({model})"
)
BOOSTED = {
    "sink": SINK.format(ohms=47, load=100, model="BF=80 IS=1e-14"),
    "sink with SPICE's own junction": SINK.format(ohms=100, load=100, model="BF=200"),
    "Darlington": SINK.format(ohms=10, load=20, model="BF=60 IS=1e-14").replace(
        "Q1 c b e QN", "Q1 c b m QN\nQ2 c m e QN"
    ),
    "source": "VIN in 0 SIN(2 1 10)\nXU1 c n vp vn o TL072\nRF in n 1k\nCF n o 10n\nRB o b 1k\n"
    "VE ve 0 9\nQ1 c b ve QP\nRL c 0 200\n.model QP PNP(BF=80 IS=1e-14)",
    "pair": "VIN in 0 SIN(0 5 100)\nXU1 in n vp vn o TL072\nRF out n 1k\nCF n o 100p\n"
    "Q1 vp o out QN\nQ2 vn o out QP\nRL out 0 100\n"
    ".model QN NPN(BF=80 IS=1e-14)\n.model QP PNP(BF=80 IS=1e-14)",
    "MOSFET": "VIN in 0 SIN(1 0.6 10)\nXU1 in n vp vn o TL072\nRG o g 220\nM1 d g s 0 MN\n"
    "RF s n 1k\nCF n o 1n\nRS s 0 10\nRD vp d 39\n.model MN NMOS(VTO=2 KP=1)",
}
BOOSTED |= {
    "three transistors as one": BOOSTED["sink"].replace("e QN\n", "e QN 3\n"),
    "four MOSFETs as one": BOOSTED["MOSFET"].replace("0 MN\n", "0 MN m=4\n"),
}
CURRENT = 0.03
"""Share of its peak, with a gain that is constant in both."""
JUNCTION = 0.16
"""V: 0.7 V as practice, where SPICE's IS of 1e-16 A gives 0.8 V and more; curves as tangents."""


def test_size_counts_alike_in_both():
    """Area and number move the output by as much here as there."""
    for plain, large in (("sink", "three transistors as one"), ("MOSFET", "four MOSFETs as one")):
        levels = []
        for name in (plain, large):
            design = review(f"station\n{BOOSTED[name]}\n{RAILS}").designs[0].design
            ((stage, done),) = held_against(design)
            levels.append((stage.output.level, done.level))
        ours, theirs = (a - b for a, b in zip(*levels, strict=True))
        assert ours == pytest.approx(theirs, abs=2e-3)
        assert ours > 0.02


def held_against(design):
    """Yield every stage with what ngspice does."""
    done = simulate(design, catalogue.load(), find())
    for stage in design.stages:
        yield stage, done.stages[stage.designator]


@pytest.mark.parametrize("name", BOOSTED)
def test_what_is_asked_of_the_output_is_what_ngspice_shows(name):
    """Peak current within 3 %, range within what a constant junction leaves."""
    design = review(f"station\n{BOOSTED[name]}\n{RAILS}").designs[0].design
    ((stage, done),) = held_against(design)
    asked = max(stage.current.demand_source, stage.current.demand_sink)
    shown = max(done.current.high, -done.current.low)
    assert asked == pytest.approx(shown, rel=CURRENT, abs=20e-6)
    assert stage.output.demand.high == pytest.approx(done.output.high, abs=JUNCTION)
    assert stage.output.demand.low == pytest.approx(done.output.low, abs=JUNCTION)


@pytest.mark.parametrize(
    "name",
    [
        "beacon_lamp",
        "bridge_excitation",
        "heater_sink",
        "loop_transmitter",
        "sluice_driver",
        "three_wire_transmitter",
    ],
)
def test_the_sound_circuits_with_transistors_are_judged_and_right(name):
    """Nothing is left open, and current and range are those of ngspice."""
    (found,) = review(SOUND / f"{name}.cir").designs
    assert found.open == 0
    for stage, done in held_against(found.design):
        assert standstill(stage) is None
        shown = max(done.current.high, -done.current.low)
        asked = max(stage.current.demand_source, stage.current.demand_sink)
        assert asked == pytest.approx(shown, rel=CURRENT, abs=20e-6)
        assert stage.output.demand.high == pytest.approx(done.output.high, abs=JUNCTION)
        assert stage.output.demand.low == pytest.approx(done.output.low, abs=JUNCTION)


OVERLOAD = SINK.format(ohms=0.5, load=1, model="BF=50").replace("SIN(1 0.8", "SIN(0.5 0.4")


def confirmed(cards):
    """Return what is said of the current, with ngspice beside."""
    (design,) = review(
        f"station\n{cards}\n{RAILS}", engine=Ngspiced(find(), fill=False, confirm=True)
    ).designs
    return [f for f in design.findings if f.rule == "drive-current"]


def test_a_base_that_asks_too_much_is_found_and_confirmed():
    """1.8 A over a gain of 50 is more than an LM358 gives."""
    (finding,) = confirmed(OVERLOAD.replace("TL072", "LM358"))
    assert finding.severity == "critical"
    assert finding.demand == pytest.approx(1.8 / 51, rel=0.01)
    assert "into the base of Q1, which carries 1.76 A at a current gain of 50" in finding.message
    assert "Confirmed" in finding.message
    assert "gain of at least" in finding.remedy


def test_an_assumed_gain_is_minor_and_may_be_refuted():
    """SPICE takes 100 where a model gives none: half the current, and its inputs follow."""
    (finding,) = confirmed(OVERLOAD.replace("TL072", "LM358").replace("QN NPN(BF=50)", "QN NPN"))
    assert finding.severity == "minor"
    assert "no model states it" in finding.message
    assert "Refuted: ngspice needs" in finding.message
