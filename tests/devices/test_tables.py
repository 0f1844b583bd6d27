"""From a TOML table to a device."""

import tomllib

import pytest

from railguard.devices.layout import read_table
from railguard.devices.tables import device_of
from railguard.errors import CatalogueError
from railguard.location import Location

TABLE = """
family = "GAUGE1"
technology = "cmos"
conditions = "5 V"
sheet_supply = 5.0
supply = { low = 2.7, high = 5.5, absolute = 7.0, seen = ["low"] }
offset_voltage = { typical = 1e-3, guaranteed = 3e-3, seen = "typical" }
swing_high = [
  { ohms = 2000.0, typical = 0.1, guaranteed = 0.2, seen = "all" },
  { amps = 0.02, supply = 5.5, typical = 0.8 },
]
swing_low = [
  { ohms = 2000.0, to = "negative", guaranteed = 0.01 },
  { ohms = 1000.0, to = "positive", guaranteed = 0.5 },
]
[names]
1 = ["GAUGE1"]
2 = ["GAUGE2"]
[source]
title = "Gauge amplifier"
document = "G-1"
publisher = "nobody"
"""
PLACE = Location("devices.toml", 7)


def made(text=TABLE, **changes):
    """Read a table, with some fields changed."""
    return device_of(read_table({**tomllib.loads(text), **changes}, PLACE), PLACE)


def test_a_load_to_mid_supply_takes_half_the_supply_less_the_drop():
    """A load to mid supply takes half the supply less the drop."""
    typical, guaranteed = made().swing_high[:2]
    assert (typical.typical, typical.guaranteed) == (0.1, None)
    assert typical.amps == pytest.approx((2.5 - 0.1) / 2000.0)
    assert (guaranteed.typical, guaranteed.guaranteed) == (None, 0.2)
    assert guaranteed.amps == pytest.approx((2.5 - 0.2) / 2000.0)
    assert typical.supply == guaranteed.supply == 5.0
    assert typical.condition == guaranteed.condition == "2 kΩ to mid-supply, 5 V supply"


def test_a_stated_current_stands_as_it_is():
    """A stated current stands as it is."""
    point = made().swing_high[2]
    assert (point.amps, point.supply, point.guaranteed) == (0.02, 5.5, None)
    assert point.condition == "20 mA, 5.5 V supply"


def test_a_load_to_the_near_rail_asks_for_no_current():
    """It helps the output there, so the figure holds for microamperes of sink current."""
    point = made().swing_low[0]
    assert (point.amps, point.light_sink) == (0.0, True)


def test_a_load_to_the_far_rail_takes_the_whole_supply():
    """A load to the far rail takes the whole supply."""
    point = made().swing_low[1]
    assert point.amps == pytest.approx((5.0 - 0.5) / 1000.0)
    assert not point.light_sink


def test_what_was_not_seen_is_from_memory():
    """What was not seen is from memory."""
    device = made()
    assert device.offset_voltage.typical_basis == "catalogue"
    assert device.offset_voltage.guaranteed_basis == "memory"
    assert device.swing_high[1].guaranteed_basis == "catalogue"
    assert device.swing_high[2].typical_basis == "memory"
    assert device.supply_basis == {"low": "catalogue", "high": "memory", "absolute": "memory"}


def test_without_a_listed_current_the_heaviest_guaranteed_test_is_known_to_be_given():
    """Without a listed current the heaviest guaranteed test is known to be given."""
    device = made()
    assert device.source_current.guaranteed == pytest.approx((2.5 - 0.2) / 2000.0)
    assert device.source_current.typical is None
    assert device.source_current.condition == (
        "no output current is listed: swing is guaranteed at 2 kΩ to mid-supply, 5 V supply"
    )
    assert device.sink_current.guaranteed == pytest.approx(4.5e-3)


def test_a_listed_current_is_left_alone():
    """A listed current is left alone."""
    device = made(source_current={"typical": 0.03})
    assert (device.source_current.typical, device.source_current.guaranteed) == (0.03, None)


def test_what_is_not_known_stays_absent():
    """What is not known stays absent."""
    device = made()
    assert device.input_low.best is None
    assert device.phase_reversal is None
    assert device.temperature is None
    assert device.gain_bandwidth.typical is None


def test_without_listed_thermal_resistance_the_package_class_stands_as_practice():
    """Without listed thermal resistance the package class stands as practice."""
    device = made()
    assert device.theta_basis == "practice"
    assert 100.0 <= device.theta["SOIC-8"] <= 200.0
    listed = made(theta={"SOIC-8": 124.7}, theta_seen=True)
    assert (listed.theta, listed.theta_basis) == ({"SOIC-8": 124.7}, "catalogue")


def test_a_source_nobody_saw_says_so():
    """A source nobody saw says so."""
    nothing = {"swing_high": [], "supply": {}, "offset_voltage": {"typical": 1e-3}}
    assert made().source.seen
    assert not made(**nothing).source.seen
    assert str(made().source) == "nobody, G-1, Gauge amplifier"


@pytest.mark.parametrize(
    ("change", "words"),
    [
        ({"slew": 1.0}, "unknown field `slew`"),
        ({"slew_rate": 13e6}, "Expected `object`, got `float` - at `$.slew_rate`"),
        ({"slew_rate": {"typical": "13 V/us"}}, "Expected `float | null`, got `str`"),
        ({"slew_rate": {"typ": 13e6}}, "unknown field `typ`"),
        ({"feedback": "both"}, "Invalid enum value 'both'"),
        ({"family": 7}, "Expected `str`, got `int`"),
    ],
)
def test_a_table_of_another_layout_is_refused_with_its_place(change, words):
    """A table of another layout is refused with its place."""
    with pytest.raises(CatalogueError) as refused:
        made(**change)
    assert words in refused.value.what
    assert refused.value.where == PLACE
