"""Bulk, fast devices, references, ratings."""

import pytest

from railguard.analysis.stage import Divider
from railguard.rules.decoupling.quality import BULK, FAST, RATING, REFERENCE
from tests.rules.stages import (
    FAMILY,
    capacitor,
    changed,
    design,
    figure,
    findings,
    inputs,
    outcomes,
    pin,
    rail,
    stage,
)


@pytest.mark.parametrize("farads", [1e-6, 10e-6])
def test_a_rail_with_bulk_is_quiet(farads):
    """One microfarad or more anywhere on the rail is bulk."""
    one = rail(decoupling=(capacitor(), capacitor("C9", farads)))
    assert outcomes(BULK, one) == []
    behind = rail(upstream=(capacitor("C9", farads, behind="FB1"),))
    assert outcomes(BULK, behind) == []


def test_a_rail_without_bulk_is_a_remark():
    """Sources disagree, so it is no more than a remark, and it says so."""
    (found,) = findings(BULK, rail())
    assert found.severity == "remark"
    assert "sources disagree" in found.source


def test_bulk_is_silent_on_benches_ideal_sources_bare_rails_and_unknown_values():
    """Where the question makes no sense nothing is said."""
    assert outcomes(BULK, rail(), design(stage(), kind="bench")) == []
    assert outcomes(BULK, rail(ideal=True)) == []
    assert outcomes(BULK, rail(decoupling=())) == []
    assert outcomes(BULK, rail(decoupling=(capacitor(), capacitor("C9", None)))) == []


def fast(hertz=100e6, **fields):
    """Make a design of a fast device."""
    quick = changed(FAMILY, gain_bandwidth=figure(hertz))
    return design(stage(family=quick), **fields)


def judged(whole):
    """Return the findings of decoupling-fast on the first package."""
    return findings(FAST, whole.packages[0], whole)


def test_a_fast_device_wants_a_small_capacitor():
    """Above 50 MHz each rail without 10 nF or less draws a remark."""
    found = judged(fast())
    assert [f.nets for f in found] == [("+12V",), ("-12V",)]
    assert {f.severity for f in found} == {"remark"}


def test_slow_or_well_served_devices_are_quiet():
    """At 50 MHz, with a small capacitor, on a bench, or of unknown speed nothing is said."""
    assert judged(fast(50e6)) == []
    small = rail(decoupling=(capacitor(), capacitor("C8", 10e-9)))
    assert judged(fast(rails=(small,))) == []
    assert judged(fast(kind="bench")) == []
    assert judged(fast(None)) == []


def referred(bypass, **fields):
    """Make a stage whose level comes from a divider."""
    divider = Divider(("R5", "R6"), 5e3, bypass)
    return stage(inputs=inputs(plus=pin("mid", divider=divider)), **fields)


def test_a_bypassed_reference_is_quiet():
    """Any capacitor at the tap will do, and a level without a divider needs none."""
    assert outcomes(REFERENCE, referred(1e-7)) == []
    assert outcomes(REFERENCE, stage()) == []


def test_a_bare_reference_is_minor():
    """A divider straight from the rail passes what the rail carries."""
    (found,) = findings(REFERENCE, referred(0.0))
    assert found.severity == "minor"
    assert "R5 and R6" in found.message


@pytest.mark.parametrize("use", ["comparator", "unused"])
def test_a_threshold_may_follow_its_rail(use):
    """A comparator's divider is not judged, nor a bench's."""
    assert outcomes(REFERENCE, referred(0.0, use=use)) == []
    one = referred(0.0)
    assert outcomes(REFERENCE, one, design(one, kind="bench")) == []


@pytest.mark.parametrize(
    ("rating", "severity"), [(25.0, None), (17.2, None), (16.0, "minor"), (10.0, "major")]
)
def test_a_rating_against_its_rail(rating, severity):
    """Seventy percent is the derating: beyond it minor, beyond the rating itself major."""
    one = rail(decoupling=(capacitor(rating=rating),))
    assert [f.severity for f in findings(RATING, one)] == ([severity] if severity else [])


def test_a_reversed_capacitor_is_major():
    """A polarised capacitor the wrong way round is told whatever its rating."""
    (found,) = findings(RATING, rail(decoupling=(capacitor(reversed=True),)))
    assert found.severity == "major"
    assert found.remedy == "Turn C1 round."


def test_no_rating_or_no_level_is_not_judged():
    """A card without a rating says nothing, and neither does a rail nobody states."""
    assert outcomes(RATING, rail()) == []
    assert outcomes(RATING, rail(level=None, decoupling=(capacitor(rating=1.0),))) == []


def test_a_fast_device_is_judged_on_the_rails_it_stands_on():
    """Each for itself: one that is served, bare, not its own, or the return is passed by."""
    small = rail("+5V", decoupling=(capacitor(), capacitor("C8", 10e-9)))
    bare = rail("+3V3", decoupling=())
    other = rail("+9V", packages=("U2",))
    ground = rail("0", 0.0)
    found = judged(fast(rails=(small, bare, other, ground, rail("-12V", -12.0))))
    assert [f.nets for f in found] == [("-12V",)]


def test_half_of_a_sensor_is_no_reference():
    """A capacitor there would take its signal; a divider of which one is no sensor's is judged."""
    one = referred(0.0)
    assert outcomes(REFERENCE, one, design(one, bridges=frozenset({"R5", "R6"}))) == []
    assert len(findings(REFERENCE, one, design(one, bridges=frozenset({"R5", "R7"})))) == 1


def test_an_oscillator_s_divider_is_no_reference():
    """Its thresholds follow the rail, and so does its swing."""
    assert outcomes(REFERENCE, referred(0.0, use="oscillator")) == []


def test_every_capacitor_of_a_rail_is_judged():
    """One that is sound, or that states no rating, hides none behind it."""
    one = rail(
        decoupling=(capacitor("C1", rating=25.0), capacitor("C2"), capacitor("C3", rating=16.0)),
        upstream=(capacitor("C4", rating=10.0),),
    )
    assert [f.designators for f in findings(RATING, one)] == [("C3",), ("C4",)]


def test_what_is_said_of_a_reversed_capacitor():
    """Where it stands and at what; a polarity has no numbers."""
    (found,) = findings(RATING, rail("-12V", -12.0, decoupling=(capacitor(reversed=True),)))
    assert found.message == "C1 is polarised and stands the wrong way round on -12V (-12 V)."
    assert (found.demand, found.limit, found.margin, found.unit) == (None, None, None, "")


def test_the_derating_itself_is_kept():
    """Seventy per cent of 10 V are 7 V, but for rounding."""
    for level, count in ((7.0, 0), (7.0 * (1 + 1e-12), 0), (7.0 * (1 + 1e-6), 1)):
        one = rail("+7V", level, decoupling=(capacitor(rating=10.0),))
        assert len(findings(RATING, one)) == count
