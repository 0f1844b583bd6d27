"""The balanced resistors of a difference amplifier, and what its inputs stand across."""

import pytest

from railguard.reviewing import review

CARDS = """battery current of the logger
V5 v5 0 5
C1 v5 0 100n
C2 v5 0 10u
VB bat 0 12
RS bat load {sense}
IL load 0 {amps}
R1 bat p 100k{tol}
R2 p {reference} 49.9k{tol}
R3 load n 100k{tol}
R4 out n 49.9k{tol}
XU1 p n v5 0 out OPA333
RL out 0 100k
"""


def reviewed(sense="1", amps="0.5", reference="0", tol="", more=""):
    """Review a difference amplifier across a resistor in the battery's positive line."""
    text = CARDS.format(sense=sense, amps=amps, reference=reference, tol=tol) + more
    return review(text, plugins=False).designs[0]


def told(design):
    """Return the rule's findings."""
    return [f for f in design.findings if f.rule == "feedback-matching"]


def test_the_four_resistors_and_the_one_they_stand_across():
    """Their ratio is the gain; the tolerances add."""
    (stage,) = reviewed().design.stages
    found = stage.balance
    assert set(found.elements) == {"R1", "R2", "R3", "R4"}
    assert (found.sense, found.gain) == ("RS", pytest.approx(0.499))
    assert (found.tolerance, found.stated) == (pytest.approx(0.04), False)
    assert stage.topology == "difference"
    assert stage.gain == ()  # the battery's level is common mode


@pytest.mark.parametrize(
    ("tol", "severity"), [("", "minor"), (" tol=1%", "major"), (" tol=0.01%", None)]
)
def test_a_shunt_in_the_positive_line_is_all_common_mode(tol, severity):
    """12 V * 49.9 / 149.9 = 3.99 V at the inputs; 4 % of it is 160 mV of the 250 mV to be shown.

    At 0.01 % it is 1.6 mV, 0.6 %.
    """
    found = told(reviewed(tol=tol))
    assert [f.severity for f in found] == ([severity] if severity else [])
    for finding in found:
        assert finding.demand == pytest.approx(0.160, rel=0.01)
        assert "of the 250 mV it is to show" in finding.message
        assert "R3, R4, R1 and R2" in finding.remedy


def test_the_reference_is_no_signal():
    """From a reference of 1.2 V the output shows 250 mV, not 1.45 V."""
    (found,) = told(reviewed(reference="ref", more="VR ref 0 1.2\n"))
    assert "of the 250 mV it is to show" in found.message


@pytest.mark.parametrize(
    "more",
    [
        "R9 n 0 10k\n",  # a fifth resistor: a summer
        "R9 p v5 47k\n",
    ],
)
def test_five_resistors_are_no_balance(more):
    """What else conducts at an input makes other weights."""
    (stage,) = reviewed(more=more).design.stages
    assert stage.balance is None


def test_a_large_resistor_between_the_inputs_is_no_sense_resistor():
    """Half of what it feeds: a bridge's arm."""
    (stage,) = reviewed(sense="50k", amps="10u").design.stages
    assert stage.balance.sense == ""


def test_what_is_lowered_is_lowered_on_both_sides():
    """A gain of 10 asks 5 V of 5 V: the resistor back and its fellow change together."""
    text = CARDS.format(sense="1", amps="0.5", reference="0", tol=" tol=0.01%")
    text = text.replace("100k", "4.99k").replace("VB bat 0 12", "VB bat 0 3")
    (found,) = [
        f for f in review(text, plugins=False).designs[0].findings if f.rule == "headroom-output"
    ]
    assert found.remedy.startswith("Lower the gain from 10 to at most ")
    assert "R4 = " in found.remedy
    assert "R2 = " in found.remedy
