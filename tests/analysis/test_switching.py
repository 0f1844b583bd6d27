"""What a stage that switches can be asked for, and that it turns no other stage's loop round."""

import pytest

from railguard.reviewing import review

LAMP = """lamp
VP vp 0 12
C1 vp 0 100n
VIN in 0 PWL(0 4 10 8)
VREF ref 0 6
R1 in p 10k
R2 out p 470k
XU1 p ref vp 0 out LM358
R3 out base {ohms}
Q1 lamp base 0 QN
RL vp lamp 1k
.model QN NPN(BF=100)
.end
"""


def looked_at(text):
    """Return the design of a netlist, and its open points as (rule, subject)."""
    (design,) = review(text, plugins=False).designs
    return design, {(n.rule, n.subject) for n in design.not_checked}


def test_resistors_bound_the_current_of_a_comparator():
    """22 kilohm on 12 V cannot ask for more than 0.6 mA, whatever the transistor does."""
    design, missed = looked_at(LAMP.format(ohms="22k"))
    (stage,) = design.design.stages
    assert stage.use == "comparator"
    assert not {("drive-current", "XU1"), ("drive-power", "U1")} & missed
    assert stage.dissipation == pytest.approx(12 * 1e-3, rel=1.0)


def test_a_bound_beyond_the_device_settles_nothing():
    """100 ohm might ask for 120 mA: the base takes the rest, so it is not checked, no finding."""
    design, missed = looked_at(LAMP.format(ohms="100"))
    assert ("drive-current", "XU1") in missed
    assert not [f for f in design.findings if f.rule == "drive-current"]


def test_a_base_straight_at_the_output_has_no_bound():
    """Nothing says what it takes."""
    text = LAMP.format(ohms="22k").replace("R3 out base 22k\nQ1 lamp base", "Q1 lamp out")
    _, missed = looked_at(text)
    assert {("drive-current", "XU1"), ("drive-power", "U1")} <= missed


def test_a_comparator_turns_no_buffer_round_over_the_rail():
    """1 ohm in the rail, a lamp on it, and a buffer whose divider hangs on it: the buffer is sound.

    With the comparator taken as a linear stage its gain makes the buffer's loop look positive.
    """
    text = LAMP.format(ohms="2.2k").replace("VP vp 0 12", "VP raw 0 12\nRS raw vp 1")
    text = text.replace(
        "VREF ref 0 6", "RA vp half 47k\nRB half 0 47k\nCA half 0 10u\nXU2 half ref vp 0 ref LM358"
    )
    design, _ = looked_at(text)
    signs = {s.designator: s.loop.dc for s in design.design.stages}
    assert signs == {"XU1": "positive", "XU2": "negative"}
