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


TRIGGER = """float switch
V1 vdd 0 3.3
C1 vdd 0 100n
VIN in 0 SIN(1.65 {peak} 50)
R1 vdd ref 100k
R2 ref 0 100k
R4 out ref {back}
XU1 ref in vdd 0 out TLV9061
RL out 0 100k
"""


@pytest.mark.parametrize(
    ("peak", "severity"),
    [
        # 50k of 150k: a third of 1.65 V, so it switches at 1.65 V +- 0.55 V.
        (1.5, "remark"),
        (0.58, "major"),  # just past both: a linear stage with its inputs swapped would just clip
        (0.5, "critical"),  # never crosses them
    ],
)
def test_a_signal_well_past_both_thresholds_shows_a_comparator(peak, severity):
    """What a linear stage with its inputs exchanged could not follow is meant to switch."""
    design, _ = looked_at(TRIGGER.format(peak=peak, back="100k"))
    found = [f for f in design.findings if f.rule == "feedback-reversed"]
    assert [f.severity for f in found] == [severity]
    assert (design.design.stages[0].use == "comparator") == (severity == "remark")


def test_a_linear_stage_behind_needs_more_than_the_signal():
    """A filter or a buffer behind it has no use for a switched level."""
    text = TRIGGER.format(peak=1.5, back="100k") + "XU2 out o2 vdd 0 o2 TLV9061\nRM o2 0 100k\n"
    design, _ = looked_at(text)
    assert design.design.stages[0].use == "linear"


SPARE = """spare channels
V1 vdd 0 5
C1 vdd 0 100n
VIN in 0 SIN(2 1 50)
XU1A in o1 vdd 0 o1 MCP6004
RL o1 0 100k
XU1B 0 nb vdd 0 nb MCP6004
XU1C vdd 0 vdd 0 nc MCP6004
XU1D vdd nd vdd 0 nd MCP6004
"""


def test_inputs_tied_to_rails_and_ground_drive_nothing():
    """Sources stand on the nets of rails and ground; they are no signal at a spare channel."""
    design, missed = looked_at(SPARE)
    uses = {s.designator: s.use for s in design.design.stages}
    assert uses == {"XU1A": "linear", "XU1B": "unused", "XU1C": "unused", "XU1D": "unused"}
    assert not [f for f in design.findings if f.severity in ("critical", "major", "minor")]
    assert not missed


def test_a_switch_and_a_device_are_named_for_what_they_are():
    """Neither leaves the sheet: the one has a position, the other an inside, nobody tells."""
    text = (
        "gain switch\nVP vdd 0 5\nC1 vdd 0 100n\nVIN in 0 SIN(1 0.1 10)\n"
        "XU1 in n vdd 0 out MCP6001\n"
        "R1 out n 9.1k\nR2 n 0 1k\n{more}\n"
    )
    for more, words in (
        ("S1 n x c 0 SW\nR3 x 0 1k\nVC c 0 5\n.model SW SW(RON=1)", "goes to the switch S1, whose"),
        ("XU9 out out 0 vdd DG419", "goes to XU9, which is not worked out"),
        ("J1 out 0 CONN", "leaves the sheet at J1"),
    ):
        (design,) = review(text.format(more=more), plugins=False).designs
        assert any(words in note.why for note in design.not_checked), more
