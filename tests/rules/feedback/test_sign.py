"""Positive feedback by its evidence, and feedback that is not there."""

import pytest

from railguard.analysis.bound import Range
from railguard.analysis.loop import Feedback, Loop
from railguard.analysis.stage import Unknown
from railguard.rules.feedback.sign import OPEN, REVERSED
from tests.rules.stages import findings, open_points, outcomes, stage

HYSTERESIS = Loop(
    dc="positive", beta_plus=0.09, thresholds=Range(-1.0, 1.0), drive=Range(-5.0, 5.0)
)


def looped(base=HYSTERESIS, use="linear", use_stated=False, **fields):
    """Make a stage with positive feedback."""
    values = {f: getattr(base, f) for f in base.__struct_fields__}
    return stage(loop=Loop(**{**values, **fields}), use=use, use_stated=use_stated)


def test_negative_feedback_is_quiet():
    """A sound loop draws nothing from either rule."""
    assert outcomes(REVERSED, stage()) == []
    assert outcomes(OPEN, stage()) == []


def test_hysteresis_without_other_evidence_is_major_with_its_thresholds():
    """It may be a comparator that nobody stated; the sentence says where it switches."""
    (found,) = findings(REVERSED, looped())
    assert found.severity == "major"
    assert "it switches at -1 V and 1 V; nothing shows that switching is meant" in found.message
    assert '[stages] "U1" = { use = "comparator" }' in found.remedy


@pytest.mark.parametrize(
    ("fields", "words"),
    [
        ({"capacitor_across_plus": "C3"}, "C3 stands across the positive path"),
        ({"beta_plus": 1.0}, "all of the output comes back"),
        ({"feeds_linear": True}, "its output feeds a linear stage"),
        ({"drive": Range(-0.5, 0.5)}, "never crosses both"),
        ({"drive": Range(-0.5, 5.0)}, "never crosses both"),
    ],
)
def test_evidence_of_a_mistake_is_critical(fields, words):
    """A capacitor, a latch, a linear stage behind, or a small signal: the inputs are swapped."""
    (found,) = findings(REVERSED, looped(**fields))
    assert found.severity == "critical"
    assert words in found.message
    assert found.remedy == "Swap the inputs of U1."


def test_a_signal_that_just_crosses_both_thresholds_is_no_mistake():
    """At the thresholds themselves it switches."""
    assert [f.severity for f in findings(REVERSED, looped(drive=Range(-1.0, 1.0)))] == ["major"]
    assert [f.severity for f in findings(REVERSED, looped(drive=Range()))] == ["major"]


@pytest.mark.parametrize("stated", [True, False])
@pytest.mark.parametrize("use", ["comparator", "oscillator"])
def test_a_meant_comparator_is_a_remark(use, stated):
    """Stated or shown by what it drives, its thresholds are worth knowing and no more."""
    (found,) = findings(REVERSED, looped(use=use, use_stated=stated, feeds_linear=True))
    assert found.severity == "remark"
    article, basis = "an" if use == "oscillator" else "a", "as what it drives shows"
    assert found.message == (
        "U1 has positive feedback at DC (9 % of the output comes back to the non-inverting "
        f"input): it switches at -1 V and 1 V. It is {article} {use}, "
        f"{'as stated' if stated else basis}."
    )
    assert found.remedy == ""


def test_a_signal_no_linear_stage_could_follow_shows_a_comparator():
    """It is told with its numbers; an oscillator has no such signal."""
    (found,) = findings(REVERSED, looped(use="comparator", switched=True, drive=Range(-3.0, 5.0)))
    assert found.message.endswith(
        "It is a comparator, as its signal shows, which goes from -3 V to 5 V: no linear stage "
        "could follow it."
    )
    (other,) = findings(REVERSED, looped(use="oscillator", switched=True))
    assert other.message.endswith("It is an oscillator, as what it drives shows.")


def test_a_comparator_by_its_load_that_never_switches_is_a_mistake():
    """What an output drives shows a comparator only where its signal does switch it."""
    small = {"drive": Range(-0.5, 0.5), "use": "comparator"}
    assert [f.severity for f in findings(REVERSED, looped(**small))] == ["critical"]
    stated = findings(REVERSED, looped(use_stated=True, **small))
    assert [f.severity for f in stated] == ["remark"]


def test_an_oscillator_needs_no_signal_to_switch_it():
    """It drives itself."""
    small = {"drive": Range(-0.5, 0.5), "use": "oscillator"}
    assert [f.severity for f in findings(REVERSED, looped(**small))] == ["remark"]


def test_unknown_thresholds_are_said_to_be():
    """What was not worked out is not made up."""
    (found,) = findings(REVERSED, looped(thresholds=Range()))
    assert "thresholds could not be worked out" in found.message


@pytest.mark.parametrize("missing", ["low", "high"])
@pytest.mark.parametrize("field", ["thresholds", "drive"])
def test_half_of_what_tells_a_small_signal_tells_nothing(field, missing):
    """Neither a threshold nor an end of the signal is made up."""
    small = {"thresholds": {"low": -1.0, "high": 1.0}, "drive": {"low": -0.5, "high": 0.5}}
    small[field][missing] = None
    one = looped(**{name: Range(**ends) for name, ends in small.items()})
    (found,) = findings(REVERSED, one)
    assert found.severity == "major"
    unknown = "thresholds could not be worked out" in found.message
    assert unknown == (field == "thresholds")


def test_nearly_all_of_the_output_counts_as_all():
    """From 99 % on it latches."""
    assert [f.severity for f in findings(REVERSED, looped(beta_plus=0.99))] == ["critical"]
    assert [f.severity for f in findings(REVERSED, looped(beta_plus=0.98))] == ["major"]


def test_how_much_comes_back_is_a_number_where_it_is_known():
    """Against none, which is what a linear stage has."""
    (found,) = findings(REVERSED, looped())
    assert (found.demand, found.limit, found.margin) == (0.09, 0.0, -0.09)
    (unknown,) = findings(REVERSED, looped(beta_plus=None))
    assert (unknown.demand, unknown.limit, unknown.margin) == (None, None, None)
    assert unknown.message.startswith("U1 has positive feedback at DC: it switches")


@pytest.mark.parametrize("rule", [REVERSED, OPEN])
def test_the_loop_of_an_unused_channel_is_not_asked_for(rule):
    """Not even where it could not be solved."""
    assert outcomes(rule, stage(loop=Loop(), use="unused")) == []


@pytest.mark.parametrize("rule", [REVERSED, OPEN])
def test_a_loop_that_could_not_be_solved_is_not_checked(rule):
    """An unknown sign is listed, with the analysis's reason where it gives one."""
    assert len(open_points(rule, stage(loop=Loop()))) == 1
    told = stage(loop=Loop(), unknown={"loop": Unknown("a thyristor", "run ngspice")})
    assert [p.why for p in open_points(rule, told)] == ["a thyristor"]


@pytest.mark.parametrize("rule", [REVERSED, OPEN])
def test_what_could_not_be_solved_is_not_judged_as_well(rule):
    """A loop the analysis calls unknown draws an open point and no finding."""
    for dc in ("open", "positive"):
        one = stage(loop=Loop(dc=dc), unknown={"loop": Unknown("tied to a rail", "see it")})
        assert findings(rule, one) == []


def test_no_feedback_at_all_is_critical():
    """Nothing leads back: the output stands at a rail."""
    (found,) = findings(OPEN, stage(loop=Loop(dc="open"), feedback=Feedback()))
    assert found.severity == "critical"
    assert "nothing leads from its output (net out) to its inverting input (net n)" in found.message


def test_an_integrator_without_a_resistor_is_major():
    """A capacitor alone holds no level."""
    one = stage(loop=Loop(dc="open"), feedback=Feedback(elements=("C2",)))
    (found,) = findings(OPEN, one)
    assert found.severity == "major"
    assert "C2 between its output and its inverting input passes no direct current" in found.message


def test_a_level_another_stage_holds_is_sound():
    """An integrator in a servo loop needs no resistor."""
    assert outcomes(OPEN, stage(loop=Loop(dc="open", holds=("XU2",)))) == []


@pytest.mark.parametrize(
    ("use", "stated", "severities"),
    [
        ("comparator", True, []),
        ("comparator", False, ["remark"]),
        ("oscillator", False, []),
        ("unused", False, []),
    ],
)
def test_open_loops_that_are_meant(use, stated, severities):
    """A stated comparator draws nothing, one shown by what it drives a remark."""
    one = stage(loop=Loop(dc="open"), use=use, use_stated=stated)
    assert [f.severity for f in findings(OPEN, one)] == severities
