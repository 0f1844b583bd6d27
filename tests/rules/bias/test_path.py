"""Whether every input has a DC path."""

import pytest

from railguard.analysis.loop import Feedback
from railguard.analysis.stage import Unknown
from railguard.rules.bias.path import NO_DC_PATH
from tests.rules.stages import findings, inputs, open_points, outcomes, pin, single, stage


def with_pins(plus="held", minus="held", **fields):
    """Make a stage with input pins in some states."""
    return stage(
        inputs=inputs(
            plus=pin("in", state=plus, path=("C3",)), minus=pin("n", state=minus, path=("C4",))
        ),
        **fields,
    )


def test_held_inputs_are_quiet():
    """Two inputs with a DC path draw nothing."""
    assert outcomes(NO_DC_PATH, stage()) == []


def test_a_followers_inverting_input_is_held_by_its_output():
    """Feedback is a DC path for the inverting input."""
    assert outcomes(NO_DC_PATH, with_pins(minus="held-by-own-output")) == []


def test_a_floating_input_is_critical():
    """An input on a capacitor alone is told, with its bias current and a resistor to fit."""
    (found,) = findings(NO_DC_PATH, with_pins(plus="floating"))
    assert (found.severity, found.nets) == ("critical", ("in",))
    assert found.message == (
        "U1's non-inverting input (net in) has no DC path: only C3 stands on it. Its bias current "
        "of 200 pA charges the net until the output stands at a rail."
    )
    assert found.remedy == "Fit 100 kΩ from in to 0."


def test_on_a_single_supply_the_path_goes_to_mid_supply():
    """Ground is no legal level for an AC signal there."""
    (found,) = findings(NO_DC_PATH, with_pins(plus="floating", supply=single()))
    assert "a reference at 2.5 V" in found.remedy


def test_an_open_integrator_gets_a_resistor_across_its_capacitor():
    """Where only a capacitor leads back, the remedy is in the feedback."""
    one = with_pins(minus="floating", feedback=Feedback(elements=("C4",)))
    (found,) = findings(NO_DC_PATH, one)
    assert "a resistor to the output of U1" in found.remedy


def test_an_input_on_nothing_at_all():
    """A pin without any element says so."""
    one = stage(inputs=inputs(plus=pin("nc", state="floating")))
    assert "is connected to nothing" in findings(NO_DC_PATH, one)[0].message


def test_a_non_inverting_input_held_only_by_its_own_output():
    """Its level holds itself up by its own bootstraps, unless switching is meant."""
    assert len(findings(NO_DC_PATH, with_pins(plus="held-by-own-output"))) == 1
    assert outcomes(NO_DC_PATH, with_pins(plus="held-by-own-output", use="oscillator")) == []


def test_a_net_that_leaves_the_sheet_is_not_checked():
    """An input at a connector is open, with the signal to state."""
    one = with_pins(plus="open")
    assert findings(NO_DC_PATH, one) == []
    (point,) = open_points(NO_DC_PATH, one)
    assert '[signals] "in"' in point.add


def test_one_open_pin_does_not_hide_a_floating_one():
    """What is known is judged, what is not is listed."""
    one = with_pins(plus="open", minus="floating")
    assert len(findings(NO_DC_PATH, one)) == 1
    assert len(open_points(NO_DC_PATH, one)) == 1


def test_the_analysis_may_say_why():
    """The reason for an open part comes from the analysis."""
    one = stage(unknown={"bias": Unknown("net in leaves at J1", "state it")})
    assert [p.why for p in open_points(NO_DC_PATH, one)] == ["net in leaves at J1"]


@pytest.mark.parametrize(("use", "count"), [("comparator", 1), ("unused", 0)])
def test_comparators_are_judged_and_unused_channels_are_not(use, count):
    """A comparator needs its levels too; unused channels have a rule of their own."""
    assert len(findings(NO_DC_PATH, with_pins(plus="floating", use=use))) == count


@pytest.mark.parametrize(
    ("pins", "fields", "message", "remedy"),
    [
        (
            {"plus": "held-by-own-output"},
            {},
            "U1's non-inverting input (net in) has a DC path only to the stage's own output, which "
            "follows it. Its bias current of 200 pA charges the net until the output stands at a "
            "rail.",
            "Fit 100 kΩ from in to 0.",
        ),
        (
            {"plus": "floating"},
            {"family": None},
            "U1's non-inverting input (net in) has no DC path: only C3 stands on it. Its bias "
            "current charges the net until the output stands at a rail.",
            "Fit 100 kΩ from in to 0.",
        ),
        (
            {"plus": "floating"},
            {"feedback": Feedback()},
            "U1's non-inverting input (net in) has no DC path: only C3 stands on it. Its bias "
            "current of 200 pA charges the net until the output stands at a rail.",
            "Fit 100 kΩ from in to 0.",
        ),
        (
            {"minus": "floating"},
            {},
            "U1's inverting input (net n) has no DC path: only C4 stands on it. Its bias current "
            "of 200 pA charges the net until the output stands at a rail.",
            "Fit 100 kΩ from n to 0.",
        ),
    ],
)
def test_the_sentence_and_what_to_fit(pins, fields, message, remedy):
    """A resistor to a potential; in the feedback only where that lacks one at DC."""
    (found,) = findings(NO_DC_PATH, with_pins(**pins, **fields))
    assert (found.message, found.remedy) == (message, remedy)


@pytest.mark.parametrize(("path", "hangs"), [(("J1", "TP2"), " (J1 and TP2)"), ((), "")])
def test_an_open_input_says_at_what_it_leaves(path, hangs):
    """With the designators it hangs on, where there are any."""
    one = stage(inputs=inputs(plus=pin("in", state="open", path=path)))
    (point,) = open_points(NO_DC_PATH, one)
    assert (point.subject, point.rule) == ("XU1", "bias-no-dc-path")
    assert point.why == (f"its non-inverting input (net in) leaves what the netlist shows{hangs}")
