"""Phase reversal, input clamps, resting levels, offset, and the load's own limit."""

import pytest

from railguard.analysis.bound import Range
from railguard.rules.headroom.limits import DIFFERENTIAL, LOAD, OFFSET, REVERSAL
from railguard.settings.model import Load, Settings
from tests.rules.stages import (
    FAMILY,
    bound,
    changed,
    design,
    figure,
    findings,
    inputs,
    open_points,
    outcomes,
    stage,
    unknown_device,
)


def driven_to(volts, **fields):
    """Make a stage whose inputs go down to some level; -10 V is the typical limit."""
    low = bound(False, demand=volts, typical=-10.0, guaranteed=-9.0)
    return stage(inputs=inputs(low=low), **fields)


def test_inputs_inside_do_not_reverse():
    """Up to the typical limit the output keeps its sense."""
    assert outcomes(REVERSAL, driven_to(-9.9)) == []
    assert outcomes(REVERSAL, driven_to(-10.0)) == []


def test_a_reversing_device_beyond_its_range():
    """Past the limit it is told, as grave as the evidence for the limit."""
    (found,) = findings(REVERSAL, driven_to(-10.5))
    assert found.severity == "major"
    assert "turns over to the other rail" in found.message


@pytest.mark.parametrize("reverses", [False, None])
def test_devices_that_do_not_reverse_or_of_which_it_is_not_known(reverses):
    """Nothing is claimed of what is not known."""
    tame = changed(FAMILY, phase_reversal=reverses)
    assert outcomes(REVERSAL, driven_to(-11.0, family=tame)) == []
    assert outcomes(REVERSAL, unknown_device()) == []
    assert outcomes(REVERSAL, stage(inputs=inputs(low=bound(False), high=bound()))) == []


def apart(volts, limit=None, **fields):
    """Make a comparator whose inputs stand apart, of a device that stands `limit`."""
    family = changed(FAMILY, differential_input=figure(guaranteed=limit))
    return stage(
        inputs=inputs(differential=volts), use="comparator", **{"family": family, **fields}
    )


def test_inputs_within_their_differential_limit_are_quiet():
    """At the limit itself nothing is told."""
    assert outcomes(DIFFERENTIAL, apart(30.0, 30.0)) == []
    assert outcomes(DIFFERENTIAL, stage()) == []


def test_inputs_driven_apart_beyond_their_clamps():
    """A comparator made of a clamped op-amp is told."""
    (found,) = findings(DIFFERENTIAL, apart(5.0, 0.7))
    assert (found.severity, found.limit) == ("major", 0.7)


def test_an_unlisted_differential_limit_is_not_checked():
    """A device without the figure, or without a catalogue entry, is listed."""
    (point,) = open_points(DIFFERENTIAL, apart(5.0))
    assert "differential_input" in point.add
    assert len(open_points(DIFFERENTIAL, apart(5.0, family=None))) == 1


def drifting(volts, **fields):
    """Make a stage with an accumulated offset; it reaches 21 V in all."""
    output = changed(stage().output, offset=volts, available=Range(-10.5, 10.5))
    return stage(output=output, **fields)


@pytest.mark.parametrize(
    ("volts", "severity"), [(1.0, None), (1.05, None), (1.1, "minor"), (6.0, "major")]
)
def test_offset_takes_its_share_of_the_range(volts, severity):
    """A tenth of the range is allowed, half of it is major."""
    assert [f.severity for f in findings(OFFSET, drifting(volts))] == (
        [severity] if severity else []
    )


def test_an_unknown_offset_is_not_judged():
    """Nothing is said of a device whose offset is not listed."""
    assert outcomes(OFFSET, drifting(None)) == []


@pytest.mark.parametrize(
    ("low", "words"), [(0.0, "Fit a device of less offset"), (10.0, "Couple the stages"),
                       (None, "Couple the stages")],
)  # fmt: skip
def test_no_capacitor_is_asked_for_where_dc_counts(low, words):
    """A bridge's signal would not come through one."""
    (found,) = findings(OFFSET, drifting(6.0, band=Range(low, 100.0)))
    assert found.remedy.startswith(words)


def loaded(most, high=5.0, net="out", **fields):
    """Make a design whose output drives a load with a limit of its own."""
    one = stage(
        output=changed(stage().output, demand=Range(0.0, high), available=Range(-10.5, 10.5)),
        **fields,
    )
    return design(one, settings=Settings(loads=(Load(net=net, ohms=1e4, max_volts=most),)))


def judged(whole):
    """Return what headroom-load says of a design."""
    return findings(LOAD, whole, whole)


def test_a_load_that_stands_its_voltage_is_quiet():
    """At its limit a load is not exceeded, and loads without one are not judged."""
    assert judged(loaded(5.0)) == []
    assert judged(loaded(None)) == []


def test_a_load_driven_beyond_its_own_limit():
    """A converter input that stands 3.3 V and gets 5 V is critical."""
    (found,) = judged(loaded(3.3))
    assert (found.severity, found.demand, found.limit) == ("critical", 5.0, 3.3)
    assert "as stated" in found.message


def test_a_load_gets_no_more_than_the_output_reaches():
    """A demand beyond the output's range counts only as far as the output goes."""
    (found,) = judged(loaded(3.3, high=20.0))
    assert found.demand == 10.5


def test_a_load_gets_no_more_than_the_rail_where_no_swing_is_listed():
    """Twelve volts of the usual stage's supply."""
    one = stage(output=changed(stage().output, demand=Range(0.0, 20.0), available=Range()))
    whole = design(one, settings=Settings(loads=(Load(net="out", ohms=1e4, max_volts=3.3),)))
    (found,) = judged(whole)
    assert found.demand == 12.0


def test_a_load_elsewhere_is_not_checked():
    """A load that does not hang on an output is listed."""
    whole = loaded(3.3, net="elsewhere")
    assert judged(whole) == []
    assert len(open_points(LOAD, whole, whole)) == 1
