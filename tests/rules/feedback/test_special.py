"""Current feedback, and difference amplifiers."""

import pytest

from railguard.analysis.bound import Range
from railguard.analysis.loop import Balance, Feedback, Loop
from railguard.analysis.stage import Output
from railguard.reviewing import review
from railguard.rules.feedback.special import CURRENT_TYPE, MATCHING
from railguard.settings.model import Settings, Tolerances
from tests.rules.stages import (
    FAMILY,
    changed,
    design,
    figure,
    findings,
    inputs,
    open_points,
    outcomes,
    stage,
)

FAST = changed(FAMILY, feedback="current", feedback_resistor=figure(1000.0))


def with_resistor(ohms, family=FAST, capacitance=0.0):
    """Make a current-feedback stage with some feedback resistor."""
    network = Feedback(elements=("R2",), resistance=ohms, capacitance=capacitance)
    return stage(family=family, feedback=network)


@pytest.mark.parametrize("ohms", [700.0, 1000.0, 2000.0])
def test_the_stated_resistor_is_quiet(ohms):
    """From 0.7 to twice what the sheet states nothing is told."""
    assert outcomes(CURRENT_TYPE, with_resistor(ohms)) == []


@pytest.mark.parametrize(
    ("ohms", "severity"), [(690.0, "critical"), (0.0, "critical"), (2100.0, "remark")]
)
def test_another_resistor(ohms, severity):
    """Too small oscillates, too large is slow."""
    (found,) = findings(CURRENT_TYPE, with_resistor(ohms))
    assert found.severity == severity
    assert found.remedy == "Fit 1 kΩ from the output to the inverting input."


def test_a_capacitor_across_the_feedback():
    """With current feedback a capacitor there makes an oscillator."""
    (found,) = findings(CURRENT_TYPE, with_resistor(1000.0, capacitance=10e-12))
    assert found.severity == "critical"


def test_an_unlisted_resistor_is_not_checked_and_voltage_feedback_not_judged():
    """What the sheet states must be known; other devices have no such resistor."""
    bare = changed(FAST, feedback_resistor=figure())
    assert len(open_points(CURRENT_TYPE, with_resistor(10.0, bare))) == 1
    assert outcomes(CURRENT_TYPE, with_resistor(10.0, FAMILY)) == []


def difference(common=5.0, gains=(10.0, -10.0), span=4.0):
    """Make a difference amplifier with a common-mode level at its inputs."""
    return stage(
        topology="difference",
        gain=(("p", gains[0]), ("m", gains[1])),
        inputs=inputs(demand=Range(common, common)),
        output=Output(net="out", demand=Range(0.0, span)),
    )


def test_a_small_common_mode_is_quiet():
    """Four times 1 % of 1 V is 40 mV, 1 % of 4 V."""
    assert findings(MATCHING, difference(1.0)) == []
    assert len(findings(MATCHING, difference(1.01))) == 1


def test_a_common_mode_that_default_resistors_let_through_is_a_remark():
    """The sentence gives the rejection in decibels and the error."""
    (found,) = findings(MATCHING, difference())
    assert found.severity == "remark"
    assert "as low as 48.8 dB" in found.message
    assert "by 200 mV, 5 % of its span" in found.message


def test_stated_tolerances_weigh_more_or_clear_it():
    """With stated resistors it is minor, or quiet where they are good enough."""
    one = difference()
    poor = design(one, settings=Settings(tolerances=Tolerances(resistor=0.01)))
    good = design(one, settings=Settings(tolerances=Tolerances(resistor=0.001)))
    assert [f.severity for f in findings(MATCHING, one, poor)] == ["minor"]
    assert findings(MATCHING, one, good) == []


@pytest.mark.parametrize(
    ("span", "reference", "words"),
    [(0.5, 0.0, "40 % of its span"), (0.5, 2.5, "8 % of the 2.5 V it is to show")],
)
def test_a_current_is_shown_from_its_reference(span, reference, words):
    """200 mV of 0.5 V of span, or of what the level stands over the reference at most."""
    balance = Balance(
        elements=("R1", "R2", "R3", "R4"), gain=10.0, tolerance=0.04, stated=False,
        reference=reference, sense="RS",
    )  # fmt: skip
    (found,) = findings(MATCHING, changed(difference(span=span), balance=balance))
    assert words in found.message


def test_weights_that_differ_on_purpose_and_unknown_ranges_are_not_judged():
    """A subtractor with two gains is no difference amplifier; without a range nothing is said."""
    assert outcomes(MATCHING, difference(gains=(1.0, -3.0))) == []
    assert outcomes(MATCHING, changed(difference(), output=Output(net="out"))) == []
    assert outcomes(MATCHING, stage()) == []


@pytest.mark.parametrize(
    ("ohms", "words"),
    [
        (690.0, "690 Ω of feedback: its bandwidth runs away and it rings or oscillates."),
        (0.0, "a wire for its feedback: its bandwidth runs away and it rings or oscillates."),
        (2500.0, "2.5 kΩ of feedback: its bandwidth falls to about 40 %."),
    ],
)
def test_what_is_said_of_another_resistor(ohms, words):
    """What the sheet asks for, what there is, what it does."""
    (found,) = findings(CURRENT_TYPE, with_resistor(ohms))
    assert found.message == f"U1: a TL072 with current feedback asks for 1 kΩ and has {words}"
    assert (found.demand, found.limit, found.margin) == (ohms, 1000.0, ohms - 1000.0)


@pytest.mark.parametrize(("family", "limit", "margin"), [(FAST, 1000.0, 200.0), (None, None, None)])
def test_a_capacitor_is_told_with_the_resistor_it_stands_across(family, limit, margin):
    """Beside what the sheet states, where it states one."""
    family = family or changed(FAST, feedback_resistor=figure())
    (found,) = findings(CURRENT_TYPE, with_resistor(1200.0, family, 10e-12))
    assert (found.demand, found.limit, found.margin) == (1200.0, limit, margin)


def test_what_is_missing_of_a_current_feedback_device_is_named():
    """With the field to add."""
    bare = changed(FAST, feedback_resistor=figure())
    (point,) = open_points(CURRENT_TYPE, with_resistor(10.0, bare))
    assert point.rule == "feedback-current-type"
    assert point.why == "the stated feedback resistor of TL072 is not in the catalogue"
    assert point.add == "add feedback_resistor to a [[devices]] table of railguard.toml"


def test_a_guaranteed_resistor_has_its_own_basis():
    """It is the one compared with."""
    vague = figure(900.0, 1000.0, typical_basis="catalogue", guaranteed_basis="memory")
    (found,) = findings(CURRENT_TYPE, with_resistor(600.0, changed(FAST, feedback_resistor=vague)))
    assert (found.severity, found.basis) == ("major", ("netlist", "memory"))


@pytest.mark.parametrize(
    "fields",
    [{"use": "comparator"}, {"loop": Loop(dc="positive")}, {"topology": "summing"}],
)
def test_only_a_linear_difference_amplifier_has_matched_resistors(fields):
    """Neither a comparator nor what has no working loop."""
    assert outcomes(MATCHING, changed(difference(), **fields)) == []


@pytest.mark.parametrize(
    ("gains", "count"),
    [((10.0, -9.45), 1), ((10.0, -9.35), 0), ((0.0, -10.0), 0), ((10.0, 10.0), 0)],
)
def test_weights_within_their_tolerance_are_meant_to_be_alike(gains, count):
    """Two per cent and four times one per cent apart may be chance; more, and no sign, is not."""
    assert len(findings(MATCHING, difference(gains=gains))) == count


@pytest.mark.parametrize(
    ("demand", "count"),
    [(Range(None, 0.5), 0), (Range(0.5, None), 0), (Range(None, 0.6), 1), (Range(-0.6, 0.1), 1)],
)
def test_the_farther_end_of_the_inputs_counts(demand, count):
    """4 x 1 % of 0.5 V are 20 mV, 1 % of 2 V; an end nobody knows counts as none."""
    one = changed(difference(span=2.0), inputs=inputs(demand=demand))
    assert len(findings(MATCHING, one)) == count


def test_what_is_said_of_a_difference_amplifier():
    """Its gain, its resistors and where that figure is from, rejection, and the error."""
    (found,) = findings(MATCHING, difference())
    assert found.message == (
        "U1 is a difference amplifier with a gain of 10 and resistors of 1 % (default): "
        "common-mode rejection may be as low as 48.8 dB, and 5 V at its inputs moves the output "
        "by 200 mV, 5 % of its span."
    )
    assert found.basis == ("netlist", "assumed")


DIFFERENCE = """bridge of the river gauge, its difference amplifier
V5 v5 0 5
C1 v5 0 100n
C2 v5 0 10u
VA a 0 SIN(2.5 0.2 10)
VB b 0 SIN(2.5 0.2 33)
R1 a n 10k
R2 n out 10k
R3 b p 10k
R4 p ref 10k
{reference}
XU1 p n v5 0 out OPA2333
RL out 0 100k
"""
BARE = "R5 v5 ref 10k\nR6 ref 0 10k"


def referred(reference):
    """Review a difference amplifier with some reference."""
    return review(DIFFERENCE.format(reference=reference), plugins=False).designs[0]


def told(reference):
    """Return what feedback-matching says of a bare divider."""
    found = [f for f in referred(reference).findings if f.rule == "feedback-matching"]
    return [f for f in found if "divider" in f.message]


def test_a_bare_divider_as_reference_costs_the_balance():
    """15 kohm where 10 belong: (1 + 1) 15 / 25 = 1.2 against 1, and 20 log 5 = 14 dB."""
    (found,) = told(BARE)
    gains = dict(referred(BARE).design.stages[0].gain)
    assert gains["b"] == pytest.approx(1.2, rel=1e-3)
    assert gains["a"] == pytest.approx(-1.0, rel=1e-3)
    assert found.severity == "minor"
    assert "multiplied by 1.2 and the other by 1; 14 dB of common-mode rejection" in found.message
    assert found.remedy.endswith("or fit 5 kΩ there, which both together make the old value.")


@pytest.mark.parametrize(
    ("reference", "count"),
    [
        ("VR ref 0 2.5", 0),
        (f"{BARE.replace('ref', 'tap')}\nXU2 tap ref v5 0 ref OPA2333", 0),
        ("R5 v5 ref 390\nR6 ref 0 390", 0),  # 195 ohm are 1.95 %
        ("R5 v5 ref 430\nR6 ref 0 430", 1),
        (f"{BARE}\nC6 ref 0 100u", 0),  # 0.3 Hz, and nothing below 10 Hz counts
        (f"{BARE}\nC6 ref 0 1u", 1),  # 32 Hz
    ],
)
def test_what_a_reference_may_be(reference, count):
    """A source, an output, a stiff divider, one that a capacitor holds at all that counts."""
    assert len(told(reference)) == count


def test_a_divider_as_large_as_the_resistor_there_is_buffered():
    """No smaller resistor makes up for it."""
    (found,) = told("R5 v5 ref 15k\nR6 ref 0 15k")
    assert found.remedy == "Buffer the divider with an amplifier before R4."
