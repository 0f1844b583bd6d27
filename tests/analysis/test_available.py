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
from railguard.devices.model import Figure, SwingPoint

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
