"""Random sound stages with transistors: nothing loud, and what ngspice shows of the whole circuit.

The value from outside is ngspice's: its own transistor, with its junction and its square law, where
the built-in solver takes a straight line. Both are given the same constant current gain.
"""

import random
import shutil

import pytest

from railguard.devices import catalogue
from railguard.engine.ngspice import find
from railguard.engine.operating import simulate
from railguard.reviewing import review
from railguard.words import at_or_above

RAILS = "VP vp 0 12\nVN vn 0 -12\nCP vp 0 100n\nCN vn 0 100n\nCB vp 0 10u\nCD vn 0 10u\n.end\n"
SEEDS = range(40)
STATED_VOLTS = 0.06
"""What a tangent is off at the ends of a range of ten to one."""
PRACTICE_VOLTS = 0.25
"""A junction of 0.7 V where nothing is stated: SPICE's own IS of 1e-16 A gives 0.9 V at 0.2 A."""
SHARE = 0.03


def sink(r):
    """Return a current sink: a set point, a transistor, an emitter resistor; V of its peak."""
    peak = r.uniform(0.5, 2.5)
    amps = 10 ** r.uniform(-3, -0.7)
    load = r.uniform(0.1, 0.6) * (12 - peak) / amps
    low = r.uniform(0.05, 0.4) * peak
    model = f"BF={r.uniform(40, 300):.0f}" + r.choice(["", " IS=1e-14", " IS=3e-13"])
    ohms = r.choice([0, 47, 470])
    base = f"RB o b {ohms}\n" if ohms else ""
    return (
        f"VIN in 0 SIN({(peak + low) / 2:.4g} {(peak - low) / 2:.4g} 10)\nXU1 in n vp vn o TL072\n"
        f"{base}Q1 c {'b' if ohms else 'o'} e QN\nRE e 0 {peak / amps:.4g}\nRF e n 1k\n"
        f"CF n o 1n\nRC vp c {load:.4g}\n.model QN NPN({model})"
    )


def source(r):
    """Return a current source from the rail: the sink of `sink`, turned upside down."""
    return (
        sink(r)
        .replace("VIN in 0 SIN(", "VIN vp in SIN(")
        .replace("RE e 0", "RE e vp")
        .replace("RC vp c", "RC c 0")
        .replace("QN NPN", "QN PNP")
        .replace("TL072", "OPA2134")
        .replace("vp vn o", "vh vn o")
        + "\nVH vh 0 15\nCH vh 0 100n\nCI vh 0 10u"
    )


def pair(r):
    """Return a follower with a complementary pair in its loop."""
    gain, peak = r.uniform(40, 200), r.uniform(1, 5)
    ohms = peak / 10 ** r.uniform(-2, -0.8)
    return (
        f"VIN in 0 SIN(0 {peak:.4g} 50)\nXU1 in n vp vn o TL072\nRF out n 1k\nCF n o 100p\n"
        f"Q1 vp o out QN\nQ2 vn o out QP\nRL out 0 {ohms:.4g}\n"
        f".model QN NPN(BF={gain:.0f} IS=1e-14)\n.model QP PNP(BF={gain:.0f} IS=1e-14)"
    )


def gate(r):
    """Return a current sink with a MOSFET."""
    peak, amps = r.uniform(0.5, 2.0), 10 ** r.uniform(-2, -0.5)
    low = r.uniform(0.1, 0.4) * peak
    return (
        f"VIN in 0 SIN({(peak + low) / 2:.4g} {(peak - low) / 2:.4g} 10)\nXU1 in n vp vn o TL072\n"
        f"RG o g 220\nM1 d g s 0 MN\nRF s n 1k\nCF n o 1n\nRS s 0 {peak / amps:.4g}\n"
        f"RD vp d {r.uniform(0.1, 0.4) * 9 / amps:.4g}\n"
        f".model MN NMOS(VTO={r.uniform(1, 3):.3g} KP={r.uniform(0.5, 5):.3g})"
    )


def reviewed(seed):
    """Return the review of one random stage."""
    r = random.Random(seed)
    cards = (sink, source, pair, gate)[seed % 4](r)
    return cards, review(f"random stage {seed}\n{cards}\n{RAILS}", plugins=False).designs[0]


@pytest.mark.parametrize("seed", SEEDS)
def test_a_sound_boosted_stage_is_quiet_and_judged(seed):
    """No critical, no major, nothing of range or current left open."""
    cards, found = reviewed(seed)
    loud = [f.message for f in found.findings if at_or_above(f.severity, "major")]
    assert not loud, (cards, loud)
    (stage,) = found.design.stages
    assert not {"output", "current", "loop"} & set(stage.unknown), (cards, stage.unknown)
    assert stage.loop.dc == "negative"
    assert stage.current.carriers


@pytest.mark.skipif(shutil.which("ngspice") is None, reason="ngspice is not installed")
@pytest.mark.parametrize("seed", SEEDS)
def test_what_it_asks_is_what_ngspice_shows(seed):
    """Peak current within 3 % or 20 uA, range within what a straight line leaves."""
    cards, found = reviewed(seed)
    (stage,) = found.design.stages
    done = simulate(found.design, catalogue.load(), find()).stages["XU1"]
    asked = max(stage.current.demand_source, stage.current.demand_sink)
    shown = max(done.current.high, -done.current.low)
    assert asked == pytest.approx(shown, rel=SHARE, abs=20e-6), cards
    (carrier,) = stage.current.carriers
    stated = carrier.volts_stated or carrier.gain is None
    volts = STATED_VOLTS if stated else PRACTICE_VOLTS
    assert stage.output.demand.high == pytest.approx(done.output.high, abs=volts), cards
    assert stage.output.demand.low == pytest.approx(done.output.low, abs=volts), cards
