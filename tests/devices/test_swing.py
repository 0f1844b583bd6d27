"""The drop to a rail as a function of output current."""

import pytest

from railguard.devices.catalogue import load
from railguard.devices.model import SwingPoint
from railguard.devices.swing import drop

TWO = (
    SwingPoint(1e-3, 1.0, 2.0, 30.0, "catalogue", "catalogue", condition="10 kΩ"),
    SwingPoint(5e-3, 2.0, 4.0, 30.0, "catalogue", "memory", condition="2 kΩ"),
)


def test_between_two_loads_the_drop_is_a_straight_line():
    """Between two loads the drop is a straight line."""
    found = drop(TWO, 3e-3)
    assert (found.typical, found.guaranteed) == pytest.approx((1.5, 3.0))
    assert (found.typical_basis, found.guaranteed_basis) == ("catalogue", "memory")
    assert found.condition == "2 kΩ"


def test_at_a_listed_load_the_drop_is_the_listed_one():
    """At a listed load the drop is the listed one."""
    assert drop(TWO, 1e-3)[:1] == pytest.approx((1.0,))
    assert drop(TWO, 5e-3).guaranteed == pytest.approx(4.0)


def test_a_lighter_load_than_any_listed_gains_nothing():
    """A lighter load than any listed gains nothing."""
    found = drop(TWO, 0.0)
    assert (found.typical, found.guaranteed) == (1.0, 2.0)
    assert found.guaranteed_basis == "catalogue"


def test_what_arithmetic_leaves_of_no_current_drops_nothing():
    """A rail-to-rail output without load stands at its rail, not 8e-18 V from it."""
    points = (SwingPoint(0.0, 0.0, 0.05), SwingPoint(1e-3, 0.15))
    assert drop(points, 5e-17).typical == 0.0


def test_beyond_the_heaviest_load_the_last_slope_goes_on_from_memory():
    """Beyond the heaviest load the last slope goes on from memory."""
    found = drop(TWO, 9e-3)
    assert (found.typical, found.guaranteed) == pytest.approx((3.0, 6.0))
    assert (found.typical_basis, found.guaranteed_basis) == ("memory", "memory")
    assert found.condition == "carried on beyond 2 kΩ"


def test_a_single_small_drop_is_a_resistance():
    """A single small drop is a resistance."""
    point = SwingPoint(1e-3, 0.05, 0.1, 5.0, "catalogue", "catalogue")
    found = drop((point,), 2e-3)
    assert (found.typical, found.guaranteed) == pytest.approx((0.1, 0.2))


def test_a_single_large_drop_holds_a_junction():
    """Half of it stays where no current flows."""
    found = drop((SwingPoint(1e-3, 1.0, None, 30.0, "catalogue"),), 3e-3)
    assert found.typical == pytest.approx(2.0)
    assert found.guaranteed is None


def test_a_single_guaranteed_point_goes_on_with_the_typical_slope_in_proportion():
    """Typical 0.5 V and 10 ohm: twice the drop, twice the slope."""
    points = (
        SwingPoint(1e-3, 0.5, 1.0, 30.0),
        SwingPoint(5e-3, 0.54, None, 30.0),
    )
    assert drop(points, 3e-3).guaranteed == pytest.approx(1.0 + 2e-3 * 20.0)


def test_what_is_carried_on_is_never_better_guaranteed_than_typical():
    """A far typical point may lie above the guaranteed curve's continuation."""
    points = (
        SwingPoint(1e-3, 0.05, 0.10, 5.0, "catalogue", "catalogue"),
        SwingPoint(2e-3, 0.06, 0.11, 5.0, "catalogue", "catalogue"),
        SwingPoint(20e-3, 0.90, None, 5.0, "catalogue"),
    )
    found = drop(points, 20e-3)
    assert (found.typical, found.guaranteed) == pytest.approx((0.9, 0.9))
    assert found.guaranteed_basis == "memory"


def test_a_heavier_load_never_drops_less():
    """A heavier load never drops less."""
    points = (SwingPoint(1e-3, 1.0, supply=30.0), SwingPoint(2e-3, 0.5, supply=30.0))
    assert drop(points, 2e-3).typical == 1.0


def test_nothing_listed_is_nothing_known():
    """Nothing listed is nothing known."""
    found = drop((), 1e-3)
    assert (found.typical, found.guaranteed, found.condition) == (None, None, "")


def test_a_figure_without_load_holds_for_microamperes_only():
    """A figure without load holds for microamperes only."""
    light = (SwingPoint(0.0, 0.01, 0.02, 5.0, "catalogue", "catalogue", light_sink=True),)
    assert drop(light, 5e-6).guaranteed == 0.02
    assert drop(light, 1e-3).typical is None
    assert drop(light, 1e-3).guaranteed is None


def test_the_points_of_the_nearest_test_supply_count():
    """The points of the nearest test supply count."""
    points = (
        SwingPoint(1e-3, 1.5, supply=5.0, typical_basis="catalogue"),
        SwingPoint(1e-3, 2.0, supply=30.0, typical_basis="catalogue"),
    )
    assert drop(points, 1e-3, 6.0).typical == 1.5
    assert drop(points, 1e-3, 24.0).typical == 2.0


def test_a_supply_far_from_the_test_makes_the_figure_one_from_memory():
    """A supply far from the test makes the figure one from memory."""
    points = (SwingPoint(1e-3, 1.5, supply=30.0, typical_basis="catalogue"),)
    assert drop(points, 1e-3, 24.0).typical_basis == "catalogue"
    assert drop(points, 1e-3, 12.0).typical_basis == "memory"


def test_a_single_point_goes_on_with_the_slope_of_another_supply():
    """A single point goes on with the slope of another supply."""
    points = (
        SwingPoint(1e-3, 1.5, supply=5.0),
        SwingPoint(1e-3, 2.0, supply=30.0),
        SwingPoint(5e-3, 2.4, supply=30.0),
    )
    assert drop(points, 3e-3, 5.0).typical == pytest.approx(1.5 + 2e-3 * 100.0)


@pytest.mark.parametrize("family", load().families())
def test_every_family_drops_more_into_a_heavier_load(family):
    """Monotone on both sides, typical and guaranteed, at its own test supply."""
    device = load().device(family)
    for points in (device.swing_high, device.swing_low):
        for which in (0, 2):
            curve = [drop(points, amps)[which] for amps in (0.0, 1e-6, 1e-4, 1e-3, 1e-2, 0.1)]
            known = [volts for volts in curve if volts is not None]
            assert known == sorted(known)
            assert curve[: len(known)] == known


def test_the_single_supply_classic_leaves_the_negative_rail_when_it_sinks():
    """Millivolts without load, one junction with a milliampere, and not before."""
    low = load().device("LM358").swing_low
    assert drop(low, 0.0).guaranteed == pytest.approx(0.02)
    assert drop(low, 12e-6).guaranteed == pytest.approx(0.2)
    assert 0.7 <= drop(low, 1e-3).typical <= 1.0
    assert drop(low, 1e-3).typical_basis == "memory"
    assert drop(low, 10e-3).guaranteed == pytest.approx(2.0)
