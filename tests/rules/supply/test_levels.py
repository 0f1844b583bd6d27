"""Supplies against the device's range, series drops, and names that disagree."""

import pytest

from railguard.analysis.bound import Range
from railguard.rules.compose import OWN_TABLE
from railguard.rules.supply.levels import DROP, NAME_DISAGREES, RANGE
from railguard.rules.supply.presence import MISSING, REVERSED
from tests.rules.stages import (
    FAMILY,
    SUPPLY,
    changed,
    design,
    findings,
    open_points,
    outcomes,
    package,
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


def test_an_absolute_maximum_from_memory_is_critical_however_far():
    """42 V by half: what is far beyond a recommended range alone would be major."""
    vague = changed(FAMILY, supply_basis={})
    for total in (42.5, 60.0):
        (found,) = judged(design(changed(on(total).stages[0], family=vague)))
        assert (found.severity, found.limit) == ("critical", 42.0)


@pytest.mark.parametrize(
    ("total", "family", "remedy"),
    [
        (45.0, FAMILY, "Lower the total supply to at most 36 V, or fit a device made for a higher"),
        (
            45.0,
            changed(FAMILY, supply_high=None),
            "Lower the total supply to at most 42 V, or fit a device made for a higher",
        ),
        (5.0, FAMILY, "Raise the total supply to at least 7 V, or fit a device made for a lower"),
    ],
)
def test_what_to_do_about_a_supply(total, family, remedy):
    """Into the recommended range, where there is one; it says where its own level is from."""
    one = on(total, basis="user").stages[0]
    (found,) = judged(design(changed(one, family=family)))
    assert found.remedy == f"{remedy} supply."
    assert found.basis == ("user", "catalogue")


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


def test_packages_of_one_device_on_one_pair_of_rails_make_one_finding():
    """It names them all, and is told with the first."""
    supply = on(45.0).stages[0].supply
    whole = design(stage("XU1", supply=supply), stage("XU2", supply=supply))
    first, second = (findings(RANGE, p, whole) for p in whole.packages)
    assert [f.designators for f in first] == [("XU1", "XU2")]
    assert first[0].message.startswith("U1 and U2 (TL072) get 45 V in all (±22.5 V); the absolute")
    assert second == []


def test_a_hair_beyond_the_range_is_on_it():
    """A thousandth of the limit: 6.995 V of 7 V."""
    assert judged(on(6.995)) == []
    assert len(judged(on(6.98))) == 1


@pytest.mark.parametrize(("stated", "severity"), [(False, "minor"), (True, "major")])
def test_a_corner_below_the_range(stated, severity):
    """The lowest positive and the highest negative rail together."""
    (found,) = judged(on(7.2, (6.8, 7.6), tolerance_stated=stated))
    assert (found.severity, found.demand, found.limit) == (severity, pytest.approx(6.8), 7.0)
    assert (found.family, found.corner) == ("supply", "worst-case")


@pytest.mark.parametrize(
    ("total", "worst", "words"),
    [
        (6.0, None, "6 V in all (±3 V); it needs at least 7 V (data sheet), so it is 1 V short of "
         "it."),
        (37.0, None, "37 V in all (±18.5 V); the recommended range goes to 36 V (data sheet), so "
         "it is 1 V above."),
        (7.2, (6.8, 7.6), "6.8 V in all (±3.6 V) at the worst corner of the rails' tolerance; it "
         "needs at least 7 V (data sheet), so it is 200 mV short of it."),
        (35.0, (33.0, 37.0), "37 V in all (±17.5 V) at the worst corner of the rails' tolerance; "
         "the range goes to 36 V (data sheet), so it is 1 V above."),
    ],
)  # fmt: skip
def test_what_is_said_of_a_supply(total, worst, words):
    """What the package gets, what it may get, and by how much that differs."""
    (found,) = judged(on(total, worst))
    assert found.message == f"U1 (TL072) gets {words}"


def test_where_only_an_absolute_maximum_is_listed_its_basis_counts_at_the_corners():
    """That of the range is nobody's."""
    only = changed(
        FAMILY, supply_high=None, supply_basis={"high": "catalogue", "absolute": "memory"}
    )
    one = on(41.0, (40.0, 43.0), tolerance_stated=True).stages[0]
    (found,) = judged(design(changed(one, family=only)))
    assert (found.severity, found.limit, found.basis) == ("minor", 42.0, ("netlist", "memory"))


def test_what_keeps_a_supply_from_being_judged():
    """A net nobody states, a symbol without pins, a package without a channel."""
    unknown = design(stage(supply=changed(SUPPLY, positive=None, positive_net="VBAT")))
    (point,) = open_points(RANGE, unknown.packages[0], unknown)
    assert (point.subject, point.rule) == ("U1", "supply-range")
    assert point.why == "nothing states the level of its supply net VBAT"
    assert point.add == 'state it: [nets] "VBAT" = { volts = ... }'
    pins = changed(SUPPLY, positive=None, positive_net="")
    bare = design(stage(supply=pins))
    (point,) = open_points(RANGE, bare.packages[0], bare)
    assert (point.why, point.add) == (
        "its symbol has no supply pins", "use a symbol or model with supply pins",
    )  # fmt: skip
    for rule in (RANGE, MISSING, REVERSED):
        (point,) = open_points(rule, package("U9"), unknown)
        assert (point.subject, point.rule) == ("U9", rule.name)
        assert point.why == "none of its channels could be read as an amplifier"
        assert point.add == "give its pin order"


def test_a_supply_range_nobody_lists_says_what_to_add():
    """A table of one's own."""
    bare = changed(FAMILY, supply_low=None, supply_high=None, supply_absolute=None)
    whole = design(stage(family=bare))
    (point,) = open_points(RANGE, whole.packages[0], whole)
    assert (point.rule, point.add) == ("supply-range", OWN_TABLE)


def test_a_drop_nobody_knows_is_listed_under_its_rail():
    """With the element it falls on."""
    (point,) = open_points(DROP, rail(series=("FB1",)))
    assert (point.subject, point.rule) == ("+12V", "supply-drop")
    assert point.why == "the current through FB1 or its resistance is not known"
    assert point.add == "state what the rail is held at under load"


@pytest.mark.parametrize(
    ("basis", "origin", "severity", "words"),
    [
        ("netlist", "VP", "major", "VP"),
        ("netlist", "", "major", "netlist"),
        ("assumed", "", "minor", "assumed"),
        ("memory", "", "minor", "data sheet from memory"),
    ],
)
def test_a_level_that_is_not_sure_contradicts_a_name_mildly(basis, origin, severity, words):
    """The sentence says where the level is from."""
    (found,) = findings(NAME_DISAGREES, rail(level=5.0, named=12.0, basis=basis, origin=origin))
    assert found.severity == severity
    assert found.message == f"Net +12V is named for 12 V and stands at 5 V ({words})."
