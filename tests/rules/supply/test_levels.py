"""Supplies against the device's range, series drops, and names that disagree."""

import pytest

from railguard.analysis.stage import Range
from railguard.rules.supply.levels import DROP, NAME_DISAGREES, RANGE
from tests.rules.stages import (
    FAMILY,
    SUPPLY,
    changed,
    design,
    findings,
    open_points,
    outcomes,
    rail,
    stage,
    unknown_device,
)


def on(total, worst=None, **fields):
    """Make a design of one stage on a symmetrical supply."""
    half = total / 2
    low, high = (half, half) if worst is None else (worst[0] / 2, worst[1] / 2)
    supply = changed(
        SUPPLY,
        positive=half,
        negative=-half,
        positive_worst=Range(low, high),
        negative_worst=Range(-high, -low),
        **fields,
    )
    return design(stage(supply=supply))


def judged(whole, **limits):
    """Return the findings of supply-range on the first package."""
    return findings(RANGE, whole.packages[0], whole, **limits)


def test_a_supply_in_range_is_quiet():
    """Twenty-four volts of 7 to 36 draw nothing."""
    assert judged(on(24.0, (22.8, 25.2))) == []


@pytest.mark.parametrize(
    ("total", "severity", "limit"),
    [
        (45.0, "critical", 42.0),
        (40.0, "critical", 36.0),
        (37.0, "major", 36.0),
        (6.8, "major", 7.0),
        (5.0, "critical", 7.0),
    ],
)
def test_a_supply_out_of_range(total, severity, limit):
    """Beyond the absolute maximum, or far beyond the range, critical; near it major."""
    (found,) = judged(on(total))
    assert (found.severity, found.limit, found.demand) == (severity, limit, total)


def test_the_range_itself_is_inside():
    """At the ends of the range nothing is broken."""
    assert judged(on(36.0)) == []
    assert judged(on(7.0)) == []


def test_figures_from_memory_weigh_less():
    """A range from memory makes a near miss minor and a far one major."""
    vague = changed(FAMILY, supply_basis={})
    one = on(6.8)
    whole = design(changed(one.stages[0], family=vague))
    assert [f.severity for f in judged(whole)] == ["minor"]
    far = design(changed(on(5.0).stages[0], family=vague))
    assert [f.severity for f in judged(far)] == ["major"]


def test_a_corner_of_default_tolerances_is_minor():
    """Only where the rails' tolerance is stated does its corner weigh more."""
    (found,) = judged(on(35.0, (33.0, 37.0)))
    assert (found.severity, found.corner) == ("minor", "worst-case")
    (stated,) = judged(on(35.0, (33.0, 37.0), tolerance_stated=True))
    assert stated.severity == "major"


def test_an_unknown_device_has_no_range():
    """Nothing is judged, and the package is listed."""
    whole = design(unknown_device())
    assert judged(whole) == []
    assert len(open_points(RANGE, whole.packages[0], whole)) == 1


def test_a_device_without_a_listed_range_is_listed():
    """A catalogue entry without supply figures is not checked."""
    bare = changed(FAMILY, supply_low=None, supply_high=None, supply_absolute=None)
    whole = design(stage(family=bare))
    (point,) = open_points(RANGE, whole.packages[0], whole)
    assert "supply range of TL072" in point.why


def test_a_reversed_supply_is_left_to_its_own_rule():
    """Below zero the range says nothing."""
    assert judged(on(-24.0)) == []


def test_a_small_drop_is_quiet():
    """Five percent of the rail are allowed."""
    assert outcomes(DROP, rail(level=11.4, series=("R9",), drop=0.6)) == []
    assert outcomes(DROP, rail()) == []


def test_a_large_drop_is_told():
    """Beyond the allowance the series element is named."""
    (found,) = findings(DROP, rail(level=11.0, series=("R9",), drop=1.0))
    assert found.severity == "minor"
    assert found.message.startswith("R9 takes 1 V from rail +12V, 8.3 % of its 12 V")


def test_an_unknown_drop_is_listed():
    """A series element of unknown current is not checked."""
    assert len(open_points(DROP, rail(series=("FB1",)))) == 1


def test_a_name_that_agrees_is_quiet():
    """Ten percent are allowed, and nets without a level in their name are not judged."""
    assert outcomes(NAME_DISAGREES, rail(level=12.0, named=12.0)) == []
    assert outcomes(NAME_DISAGREES, rail(level=13.2, named=12.0)) == []
    assert outcomes(NAME_DISAGREES, rail(level=3.0)) == []
    assert outcomes(NAME_DISAGREES, rail(level=None, named=12.0)) == []


@pytest.mark.parametrize(
    ("level", "severity"), [(13.8, "minor"), (15.0, "major"), (-12.0, "major"), (5.0, "major")]
)
def test_a_name_that_disagrees(level, severity):
    """Near the name minor, far from it or of the other sign major."""
    (found,) = findings(NAME_DISAGREES, rail(level=level, named=12.0))
    assert found.severity == severity
