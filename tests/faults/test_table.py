"""Stage by fault: sound stages are quiet, and every fault a stage can have is found and named.

Each stage is a set of cards on three supplies with three devices. A fault changes one card or one
rail, sized to cross its limit by 20 % or more.
"""

import re
from typing import NamedTuple

import pytest

from railguard.reviewing import review

BAD = ("critical", "major")


class Amplifier(NamedTuple):
    """A device on its supply: volts of the rails, the middle level, the swing used, its limits."""

    name: str
    positive: float
    negative: float
    middle: float
    swing: float
    too_low: float
    amperes: float


AMPLIFIERS = {
    "JFET on +-12 V": Amplifier("TL072", 12, -12, 0.0, 3.0, 3.0, 0.040),
    "bipolar on 12 V": Amplifier("LM358", 12, 0, 5.0, 2.0, 2.0, 0.030),
    "CMOS on 5 V": Amplifier("MCP6002", 5, 0, 2.5, 1.0, 1.2, 0.023),
}


def supply(a):
    """Return the cards of the rails, a capacitor at each, and the middle level where it is one."""
    cards = {"VP": f"VP vp 0 {a.positive}", "CP": "CP vp 0 100n", "CP2": "CP2 vp 0 100n"}
    if a.negative:
        cards |= {"VN": f"VN vn 0 {a.negative}", "CN": "CN vn 0 100n", "CN2": "CN2 vn 0 100n"}
    if a.middle:
        cards["VREF"] = f"VREF ref 0 {a.middle}"
    return cards


def amplifier(a, plus, minus, out, name="XU1"):
    """Return an op-amp's card."""
    return f"{name} {plus} {minus} vp {'vn' if a.negative else '0'} {out} {a.name}"


def ref(a):
    """Return the net of the middle level."""
    return "ref" if a.middle else "0"


def signal(a, peak, net="in", name="VIN", hertz=1000):
    """Return a sine round the middle level."""
    return f"{name} {net} 0 SIN({a.middle} {peak} {hertz})"


def inverting(a):
    """Gain -2 round the middle level."""
    return {
        "VIN": signal(a, a.swing / 2), "R1": "R1 in n 10k", "R2": "R2 n out 20k",
        "XU1": amplifier(a, ref(a), "n", "out"), "RL": "RL out 0 20k",
    }  # fmt: skip


def non_inverting(a):
    """Gain 2 round the middle level."""
    return {
        "VIN": signal(a, a.swing / 2), "R1": f"R1 {ref(a)} n 10k", "R2": "R2 n out 10k",
        "XU1": amplifier(a, "in", "n", "out"), "RL": "RL out 0 20k",
    }  # fmt: skip


def follower(a):
    """The output at the inverting input."""
    return {
        "VIN": signal(a, a.swing), "XU1": amplifier(a, "in", "out", "out"), "RL": "RL out 0 20k",
    }  # fmt: skip


def difference(a):
    """Gain 2 for the difference of two signals."""
    return {
        "VA": signal(a, a.swing / 4, "a", "VA"), "VB": signal(a, a.swing / 4, "b", "VB", 1300),
        "R1": "R1 a n 10k", "R2": "R2 n out 20k", "R3": "R3 b p 10k", "R4": f"R4 p {ref(a)} 20k",
        "XU1": amplifier(a, "p", "n", "out"), "RL": "RL out 0 20k",
    }  # fmt: skip


def summing(a):
    """Two signals added."""
    return {
        "VA": signal(a, a.swing / 3, "a", "VA"), "VB": signal(a, a.swing / 3, "b", "VB", 1300),
        "R1": "R1 a n 10k", "R3": "R3 b n 10k", "R2": "R2 n out 10k",
        "XU1": amplifier(a, ref(a), "n", "out"), "RL": "RL out 0 20k",
    }  # fmt: skip


def sallen_key(a):
    """A second-order low-pass at 1 kHz."""
    return {
        "VIN": signal(a, a.swing * 0.8, hertz=300), "R1": "R1 in a 11.3k", "R2": "R2 a p 11.3k",
        "C1": "C1 a out 20n", "C2": "C2 p 0 10n", "XU1": amplifier(a, "p", "out", "out"),
        "RL": "RL out 0 20k",
    }  # fmt: skip


def transimpedance(a):
    """A photodiode's current into 200 kilohm."""
    return {
        "IPD": f"IPD n 0 SIN({a.swing / 4e5:.3g} {a.swing / 4e5:.3g} 1k)", "CPD": "CPD n 0 20p",
        "R2": "R2 n out 200k", "CF": "CF n out 10p", "XU1": amplifier(a, ref(a), "n", "out"),
        "RL": "RL out 0 20k",
    }  # fmt: skip


def integrator(a):
    """An integrator held at DC by a resistor."""
    return {
        "VIN": signal(a, a.swing / 4, hertz=1000), "R1": "R1 in n 10k", "R2": "R2 n out 20k",
        "CF": "CF n out 4.7n", "XU1": amplifier(a, ref(a), "n", "out"), "RL": "RL out 0 20k",
    }  # fmt: skip


def ac_coupled(a):
    """A coupled input biased at the middle level."""
    return {
        "VIN": f"VIN in 0 SIN(0 {a.swing / 2} 1k)", "CI": "CI in p 1u",
        "RB": f"RB p {ref(a)} 47k", "R1": "R1 n g 10k", "CG": "CG g 0 10u", "R2": "R2 n out 10k",
        "XU1": amplifier(a, "p", "n", "out"), "RL": "RL out 0 20k",
    }  # fmt: skip


def two_stage(a):
    """Two inverting stages."""
    return {
        "VIN": signal(a, a.swing / 8), "R1": "R1 in n 10k", "R2": "R2 n mid 20k",
        "XU1": amplifier(a, ref(a), "n", "mid"), "R3": "R3 mid m 10k", "R4": "R4 m out 20k",
        "XU2": amplifier(a, ref(a), "m", "out", "XU2"), "RL": "RL out 0 20k",
    }  # fmt: skip


STAGES = [
    inverting, non_inverting, follower, difference, summing, sallen_key, transimpedance,
    integrator, ac_coupled, two_stage,
]  # fmt: skip


def findings(cards):
    """Review a set of cards; return every finding, consequences too."""
    text = "stage under test\n" + "\n".join(cards.values()) + "\n.end\n"
    queue = list(review(text, plugins=False).designs[0].findings)
    found = []
    while queue:
        finding = queue.pop()
        found.append(finding)
        queue += finding.consequences
    return found


def with_value(card, factor):
    """Return a resistor's card with its value multiplied."""
    name, a, b, value = card.split()
    number = float(re.sub("k$", "e3", value))
    return f"{name} {a} {b} {number * factor:.4g}"


def no_capacitor(a, cards):
    """All capacitors of the positive rail removed."""
    return {k: v for k, v in cards.items() if k not in ("CP", "CP2")}, "decoupling", "vp"


def low_supply(a, cards):
    """The supply below what the device needs."""
    changed = {**cards, "VP": f"VP vp 0 {a.too_low}"}
    if a.negative:
        changed["VN"] = f"VN vn 0 {-a.too_low}"
    return changed, "supply", "XU1"


def heavy_load(a, cards):
    """A load that asks for half as much again as the device's short-circuit current."""
    ohms = (abs(a.middle) + a.swing * 0.5) / (1.5 * a.amperes)
    last = "XU2" if "XU2" in cards else "XU1"
    return {**cards, "RL": f"RL out 0 {ohms:.3g}"}, "drive", last


def no_bias(a, cards):
    """The resistor that biases a coupled input removed."""
    if "RB" not in cards:
        return None
    return {k: v for k, v in cards.items() if k != "RB"}, "bias", "XU1"


def low_feedback(a, cards):
    """A feedback network that takes the whole output current."""
    if "R1" not in cards or "R2" not in cards or "C2" in cards:
        return None
    ohms = a.swing / 4 / (1.5 * a.amperes)
    factor = ohms / 20e3
    resistors = [k for k in ("R1", "R2", "R3", "R4") if k in cards]
    changed = {k: with_value(cards[k], factor) for k in resistors}
    if "CG" in cards:
        changed["CG"] = "CG g 0 100m"
    if "CF" in cards:
        changed["CF"] = "CF n out 4.7u"
    return {**cards, **changed}, "feedback", "XU1"


def high_feedback(a, cards):
    """A feedback network of tens of megohms."""
    if "R1" not in cards or "R2" not in cards or "C2" in cards:
        return None
    resistors = [k for k in ("R1", "R2", "R3", "R4") if k in cards]
    changed = {k: with_value(cards[k], 2000) for k in resistors}
    if "CF" in cards:
        changed["CF"] = "CF n out 2.35p"
    return {**cards, **changed}, "feedback", "XU1"


def swapped_inputs(a, cards):
    """The two inputs exchanged."""
    name, plus, minus, *rest = cards["XU1"].split()
    return {**cards, "XU1": " ".join([name, minus, plus, *rest])}, "feedback", "XU1"


def swapped_supply(a, cards):
    """The two supply pins exchanged."""
    name, plus, minus, vp, vn, *rest = cards["XU1"].split()
    return {**cards, "XU1": " ".join([name, plus, minus, vn, vp, *rest])}, "supply", "XU1"


FAULTS = [
    no_capacitor, low_supply, heavy_load, no_bias, low_feedback, high_feedback, swapped_inputs,
    swapped_supply,
]  # fmt: skip

SOUND = [
    pytest.param(stage, amp, id=f"{stage.__name__}, {name}")
    for stage in STAGES
    for name, amp in AMPLIFIERS.items()
]
FAULTY = [
    pytest.param(*made, id=f"{stage.__name__}, {name}, {fault.__name__}")
    for stage in STAGES
    for name, amp in AMPLIFIERS.items()
    for fault in FAULTS
    if (made := fault(amp, stage(amp) | supply(amp))) is not None
]


@pytest.mark.parametrize(("stage", "amp"), SOUND)
def test_sound_stage_is_quiet(stage, amp):
    """Sound values on a sound supply draw no critical and no major."""
    found = findings(stage(amp) | supply(amp))
    assert [f"{f.rule}: {f.message}" for f in found if f.severity in BAD] == []


@pytest.mark.parametrize(("cards", "family", "subject"), FAULTY)
def test_fault_is_found_and_named(cards, family, subject):
    """The fault's family speaks, and names the designator or its rail."""
    found = findings(cards)
    named = [f for f in found if f.family == family and subject in (*f.designators, *f.nets)]
    assert named, [f"{f.rule} {f.designators} {f.nets}" for f in found]
