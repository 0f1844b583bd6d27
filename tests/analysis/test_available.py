"""What a device can do towards each rail, on figures made up for the test."""

import msgspec
import pytest

from railguard.analysis.available import (
    PRACTICE_CURRENT,
    carried,
    current_reach,
    input_reach,
    output_reach,
)
from railguard.devices.catalogue import load
from railguard.devices.model import UNLISTED_CURRENT, Figure, SwingPoint

FIGURES = {
    "input_low": Figure(-0.1, 0.2, None, "catalogue", "memory", "over temperature"),
    "input_high": Figure(-1.2, -1.5, None, "memory", "catalogue", "at 25 °C"),
}


def device(**fields):
    """Return a device of the catalogue with other figures."""
    return msgspec.structs.replace(load().match("TL072").device, **{**FIGURES, **fields})


def test_each_rail_has_its_own_input_figure():
    """Volts from the lower rail at the lower end, from the upper one at the upper."""
    low = input_reach(device(), 12.0, -5.0, upper=False)
    high = input_reach(device(), 12.0, -5.0, upper=True)
    assert (low.typical, low.guaranteed) == (pytest.approx(-5.1), pytest.approx(-4.8))
    assert (low.typical_basis, low.guaranteed_basis) == ("catalogue", "memory")
    assert low.condition == "over temperature"
    assert (high.typical, high.guaranteed) == (pytest.approx(10.8), pytest.approx(10.5))
    assert (high.typical_basis, high.guaranteed_basis) == ("memory", "catalogue")
    assert high.condition == "at 25 °C"


@pytest.mark.parametrize(("figure", "expected"), [("typical", -5.1), ("guaranteed", -4.8)])
def test_a_figure_nobody_lists_is_no_number(figure, expected):
    """The other one stands."""
    gone = msgspec.structs.replace(FIGURES["input_low"], **{figure: None})
    reach = input_reach(device(input_low=gone), 12.0, -5.0, upper=False)
    assert getattr(reach, figure) is None
    whole = input_reach(device(), 12.0, -5.0, upper=False)
    assert getattr(whole, figure) == pytest.approx(expected)


def test_an_input_that_may_stand_above_its_own_rail():
    """What is listed from the lower rail counts from there, and only at the upper end."""
    over = device(input_reach=44.0)
    high = input_reach(over, 5.0, -1.0, upper=True)
    assert (high.typical, high.guaranteed) == (None, pytest.approx(43.0))
    assert (high.guaranteed_basis, high.condition) == ("catalogue", "at 25 °C")
    assert input_reach(over, 5.0, -1.0, upper=False).guaranteed == pytest.approx(-0.8)


def test_an_unknown_device_has_no_input_range():
    """Nothing is made up for it."""
    for upper in (True, False):
        reach = input_reach(None, 5.0, 0.0, upper=upper)
        assert (reach.typical, reach.guaranteed) == (None, None)
        assert (reach.typical_basis, reach.guaranteed_basis) == ("practice", "practice")


@pytest.mark.parametrize("source", [True, False])
def test_an_unknown_device_gives_a_few_milliamperes(source):
    """By common practice, and it is said so."""
    reach = current_reach(None, source)
    assert (reach.typical, reach.guaranteed) == PRACTICE_CURRENT
    assert (reach.typical_basis, reach.guaranteed_basis) == ("practice", "practice")
    assert reach.condition == "common practice"


@pytest.mark.parametrize(
    ("supplies", "total", "other"),
    [
        ([10.0], 10.0, False),
        ([10.0], 10.4, False),
        ([10.0], 9.6, False),
        ([10.0], 10.6, True),
        ([10.0], 9.4, True),
        ([10.0, 5.0], 5.1, False),
        ([10.0, 5.0], 7.0, True),
        ([None], 5.0, False),
        ([], 5.0, False),
        ([None, 10.0], 5.0, True),
    ],
)
def test_a_swing_tested_at_another_supply_is_carried(supplies, total, other):
    """A twentieth either way is the same supply; where none is listed nothing can be said."""
    points = tuple(SwingPoint(amps=0.0, supply=supply) for supply in supplies)
    assert carried(points, total) is other


@pytest.mark.parametrize(("rail_to_rail", "drops"), [(True, (0.1, 0.2)), (False, (1.0, 2.0))])
def test_a_swing_nobody_lists_is_common_practice(rail_to_rail, drops):
    """Inward from either rail, typical and worst."""
    bare = device(swing_high=(), swing_low=(), rail_to_rail_output=rail_to_rail)
    high = output_reach(bare, 12.0, -5.0, True, lambda _: 1e-3)
    low = output_reach(bare, 12.0, -5.0, False, lambda _: 1e-3)
    assert (high.typical, high.guaranteed) == tuple(pytest.approx(12 - drop) for drop in drops)
    assert (low.typical, low.guaranteed) == tuple(pytest.approx(-5 + drop) for drop in drops)
    assert {high.typical_basis, high.guaranteed_basis} == {"practice"}
    assert {low.typical_basis, low.guaranteed_basis} == {"practice"}


SWINGS = device(
    swing_high=(
        SwingPoint(0.0, 1.0, 1.5, None, "catalogue", "catalogue", condition="no load"),
        SwingPoint(10e-3, 2.0, 3.0, None, "catalogue", "catalogue", condition="1 kΩ"),
    ),
    swing_low=(
        SwingPoint(0.0, 0.1, 0.2, None, "catalogue", "catalogue"),
        SwingPoint(10e-3, 1.1, 2.2, None, "catalogue", "catalogue"),
    ),
)
"""100 and 150 ohm behind 1 and 1.5 V at the upper end; 100 and 200 ohm at the lower one."""


def into(ohms, upper=True):
    """Return the current a load to ground asks for: sourced above it, sunk below."""
    return lambda level: (level if upper else -level) / ohms


@pytest.mark.parametrize(
    ("ohms", "upper", "typical", "guaranteed"),
    [
        (1e12, True, 12 - 1.0, 12 - 1.5),
        (1000.0, True, 11 / 1.1, 10.5 / 1.15),
        (100.0, True, 11 / 2, 10.5 / 2.5),  # as steep as the load: going to and fro never ends
        (20.0, True, 11 / 6, 10.5 / 8.5),
        (1e12, False, -5 + 0.1, -5 + 0.2),
        (1000.0, False, -4.9 / 1.1, -4.8 / 1.2),
        (20.0, False, -4.9 / 6, -4.8 / 11),
    ],
)
def test_the_swing_ends_where_drop_and_load_meet(ohms, upper, typical, guaranteed):
    """By hand: the drop is a voltage and a resistance, and the load divides what they leave."""
    reach = output_reach(SWINGS, 12.0, -5.0, upper, into(ohms, upper))
    assert reach.typical == pytest.approx(typical, abs=1e-3)
    assert reach.guaranteed == pytest.approx(guaranteed, abs=1e-3)


def test_what_the_rail_loses_on_its_way_is_lost_to_the_swing():
    """50 ohm before the pin stand in series with the output's own."""
    high = output_reach(SWINGS, 12.0, -5.0, True, into(1000.0), rail_ohms=50.0)
    low = output_reach(SWINGS, 12.0, -5.0, False, into(1000.0, False), rail_ohms=50.0)
    assert high.typical == pytest.approx(11 / 1.15, abs=1e-3)
    assert low.typical == pytest.approx(-4.9 / 1.15, abs=1e-3)


def test_a_current_the_other_way_is_no_load():
    """An output that would sink at its upper end drops no more than it does alone."""
    reach = output_reach(SWINGS, 12.0, -5.0, True, lambda _: -10e-3, rail_ohms=50.0)
    assert reach.typical == pytest.approx(11.0)


def test_no_drop_goes_past_the_other_rail():
    """A current it cannot give leaves an output at the far rail at worst."""
    assert output_reach(SWINGS, 12.0, -5.0, True, lambda _: 1.0).typical == pytest.approx(-5.0)
    assert output_reach(SWINGS, 12.0, -5.0, False, lambda _: 1.0).typical == pytest.approx(12.0)


def test_a_swing_names_its_test_and_how_well_it_is_known():
    """Between two points it is as well known as they are, beyond them it is carried on."""
    light = output_reach(SWINGS, 12.0, -5.0, True, lambda _: 0.0)
    assert (light.typical_basis, light.guaranteed_basis) == ("catalogue", "catalogue")
    assert light.condition == "no load"
    heavy = output_reach(SWINGS, 12.0, -5.0, True, into(20.0))
    assert (heavy.typical_basis, heavy.guaranteed_basis) == ("memory", "memory")
    assert heavy.condition == "carried on beyond 1 kΩ"


def test_what_is_guaranteed_gives_the_condition_and_each_figure_its_own_basis():
    """At 950 ohm the typical current is beyond the last point listed, the guaranteed one is not."""
    points = tuple(
        msgspec.structs.replace(point, guaranteed_basis="user") for point in SWINGS.swing_high
    )
    reach = output_reach(device(swing_high=points), 12.0, -5.0, True, into(950.0))
    assert (reach.typical_basis, reach.guaranteed_basis) == ("memory", "user")
    assert reach.condition == "1 kΩ"
    light = output_reach(device(swing_high=points), 12.0, -5.0, True, lambda _: 0.0)
    assert (light.typical_basis, light.guaranteed_basis) == ("catalogue", "user")


def test_a_swing_of_another_supply_is_guaranteed_from_memory_only():
    """The typical one is a matter of the circuit inside and carries over."""
    points = (SwingPoint(0.0, 1.0, 1.5, 30.0, "catalogue", "catalogue"),)
    other = output_reach(device(swing_high=points), 12.0, -5.0, True, into(1e12))
    assert (other.typical_basis, other.guaranteed_basis) == ("catalogue", "memory")
    same = output_reach(device(swing_high=points), 15.0, -15.0, True, into(1e12))
    assert (same.typical_basis, same.guaranteed_basis) == ("catalogue", "catalogue")


def test_the_supply_a_swing_was_tested_at_is_the_nearest_listed():
    """A sheet that lists several supplies has a drop for each."""
    points = (SwingPoint(0.0, 1.0, 1.5, 5.0), SwingPoint(0.0, 2.0, 2.5, 30.0))
    both = device(swing_high=points)
    assert output_reach(both, 5.0, 0.0, True, into(1e12)).typical == pytest.approx(4.0)
    assert output_reach(both, 15.0, -15.0, True, into(1e12)).typical == pytest.approx(13.0)


@pytest.mark.parametrize(
    ("point", "typical", "guaranteed"),
    [
        (SwingPoint(0.0, None, 1.5, condition="no load"), None, 10.5),
        (SwingPoint(0.0, 1.0, None, condition="no load"), 11.0, None),
    ],
)
def test_half_a_swing_is_half_a_reach(point, typical, guaranteed):
    """What is not listed is no number, and the condition is that of the other."""
    reach = output_reach(device(swing_high=(point,)), 12.0, -5.0, True, into(1e12))
    assert (reach.typical, reach.guaranteed) == (
        typical and pytest.approx(typical),
        guaranteed and pytest.approx(guaranteed),
    )
    assert reach.condition == "no load"


def test_a_device_nobody_knows_swings_by_common_practice():
    """One and two volts from either rail, and it is said so."""
    reach = output_reach(None, 12.0, -5.0, True, into(1000.0))
    assert (reach.typical, reach.guaranteed) == (pytest.approx(11.0), pytest.approx(10.0))
    assert (reach.typical_basis, reach.condition) == ("practice", "common practice")


TEST_LOAD = f"{UNLISTED_CURRENT}: swing is guaranteed at 2 kΩ"


@pytest.mark.parametrize(
    ("figure", "short", "typical", "guaranteed"),
    [
        # what the sheet lists counts, whatever the short-circuit current is
        ((20e-3, 10e-3, ""), (60e-3, 50e-3), (20e-3, "memory"), (10e-3, "catalogue")),
        ((None, 10e-3, ""), (60e-3, 50e-3), (60e-3, "assumed"), (10e-3, "catalogue")),
        # half the short-circuit current, the guaranteed one where listed
        ((20e-3, None, ""), (60e-3, 30e-3), (20e-3, "memory"), (15e-3, "practice")),
        ((20e-3, None, ""), (30e-3, None), (20e-3, "memory"), (15e-3, "practice")),
        ((None, None, ""), (60e-3, None), (60e-3, "assumed"), (30e-3, "practice")),
        # the load of a swing test is known to be driven, and no rating
        ((None, 5e-3, TEST_LOAD), (60e-3, None), (60e-3, "assumed"), (30e-3, "practice")),
        ((None, 30e-3, TEST_LOAD), (40e-3, None), (40e-3, "assumed"), (30e-3, "catalogue")),
        ((None, 5e-3, TEST_LOAD), (None, None), (None, None), (5e-3, "catalogue")),
        ((None, 20e-3, TEST_LOAD), (40e-3, None), (40e-3, "assumed"), (20e-3, "catalogue")),
        ((10e-3, 10e-3, ""), (None, None), (10e-3, "memory"), (10e-3, "catalogue")),
        # never less typical than guaranteed
        ((5e-3, 10e-3, ""), (None, None), (10e-3, "catalogue"), (10e-3, "catalogue")),
        ((None, 50e-3, ""), (40e-3, None), (50e-3, "catalogue"), (50e-3, "catalogue")),
        ((20e-3, None, ""), (None, None), (20e-3, "memory"), (None, None)),
    ],
)
def test_the_current_a_device_gives(figure, short, typical, guaranteed):
    """Listed, else what its short-circuit current leaves usable."""
    listed = Figure(figure[0], figure[1], None, "memory", "catalogue", figure[2])
    other = Figure(1e-3, 1e-3)
    for source in (True, False):
        one, two = (listed, other) if source else (other, listed)
        made = device(
            source_current=one, sink_current=two,
            short_circuit=Figure(short[0], short[1], None, "assumed", "user"),
        )  # fmt: skip
        reach = current_reach(made, source)
        assert reach.condition == figure[2]
        for value, basis, expected in (
            (reach.typical, reach.typical_basis, typical),
            (reach.guaranteed, reach.guaranteed_basis, guaranteed),
        ):
            assert value == (expected[0] and pytest.approx(expected[0]))
            assert expected[1] in (None, basis)


def test_a_current_nobody_lists_is_common_practice():
    """As for a device nobody knows."""
    bare = device(source_current=Figure(), sink_current=Figure(), short_circuit=Figure())
    assert current_reach(bare, True) == current_reach(None, True)
