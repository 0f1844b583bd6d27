"""Heat, and the case it is judged in."""

import msgspec
import pytest

from railguard.analysis.bound import Bound, Range
from railguard.analysis.rail import Supply
from railguard.analysis.stage import Case, Current, Output
from railguard.analysis.thermal import (
    bias_current,
    case_of,
    dissipation,
    junction,
    offset_current,
    package_heat,
)
from railguard.devices import catalogue
from railguard.devices.model import Figure
from railguard.settings.model import Settings
from tests.rules.stages import stage as made

LMV = catalogue.load().device("LMV358")
BUFFER = "VIN in 0 5\nXU1 in out vp vn out {device}\nRL out 0 1k"


@pytest.mark.parametrize(
    ("channels", "text", "case"),
    [
        # Listed: SC70-5 478, SOT23-5 265, SOIC-8 190, MSOP-8 235, SOIC-14 145, TSSOP-14 155 K/W.
        (1, "LMV321", "SC70-5"),
        (2, "LMV358", "MSOP-8"),
        (4, "LMV3X4", "TSSOP-14"),
        (2, "LMV358 Package_SO:SOIC-8_3.9x4.9mm", "SOIC-8"),
        (1, "LMV321 SOT23-5", "SOT23-5"),
        (1, "LMV321 SOT-23-5_Handsoldering", "SOT23-5"),
        (None, "LMV3XX", "SC70-5"),
    ],
)
def test_a_case_holds_so_many_amplifiers(channels, text, case):
    """Two amplifiers fit in no case of five pins; a footprint on the card settles it."""
    found = case_of(LMV, channels, text)
    assert (found.name, found.resistance) == (case, LMV.theta[case])


def test_junction_by_hand(stage):
    """10 V at 5 mA in the output stage, and 30 V times the quiescent current, at 25 degrees."""
    found = stage(BUFFER.format(device="TL072"))
    watts = 30.0 * found.family.supply_current.best + 10.0 * 5e-3
    assert found.dissipation == pytest.approx(watts, rel=1e-3)
    assert found.junction == pytest.approx(25.0 + watts * found.case.resistance, rel=1e-3)
    assert found.case.name.endswith("-8")


def test_both_channels_heat_their_package(design):
    """10 V at 5 mA twice, and both quiescent currents; either channel is told the whole."""
    cards = (
        "VIN in 0 5\nXU1A in o1 vp vn o1 TL072\nR1 o1 0 1k\nXU1B in o2 vp vn o2 TL072\nR2 o2 0 1k"
    )
    first, second = design(cards).stages
    watts = 2 * (30.0 * first.family.supply_current.best + 10.0 * 5e-3)
    assert first.package == second.package == "U1"
    assert first.dissipation == second.dissipation == pytest.approx(watts, rel=1e-3)
    assert first.junction == pytest.approx(25.0 + watts * first.case.resistance, rel=1e-3)
    assert first.dissipation_worst.low < watts < first.dissipation_worst.high


def test_hottest_ambient_counts(stage):
    """The stated range's upper end."""
    hot = stage(BUFFER.format(device="TL072"), "[conditions]\nambient = [-20, 60]")
    cool = stage(BUFFER.format(device="TL072"))
    assert hot.junction - cool.junction == pytest.approx(35.0)


def test_worst_level_of_a_grounded_load_is_half_the_rail(stage):
    """+-15 V into 1 kilohm swung to 12 V: most heat at 7.5 V, 56.25 mW. Source: TI SBOS293I."""
    cards = "VIN in 0 SIN(0 12 100)\nXU1 in out vp vn out TL072\nRL out 0 1k"
    found = stage(cards)
    quiescent = 30.0 * found.family.supply_current.best
    assert found.dissipation - quiescent == pytest.approx(56.25e-3, rel=0.01)


FET = msgspec.structs.replace(
    catalogue.load().match("TL072").device,
    bias_current=Figure(50e-12, 200e-12),
    offset_current=Figure(20e-12, 100e-12),
)


def ambient(high):
    """Return settings of a range of ambient temperatures."""
    return Settings(ambient=(-20.0, high))


@pytest.mark.parametrize(
    ("high", "technology", "factor"),
    [
        (25.0, "jfet", 1.0),
        (35.0, "jfet", 2.0),
        (65.0, "cmos", 16.0),
        (0.0, "jfet", 1.0),
        (65.0, "bipolar", 1.0),
    ],
)
def test_the_bias_current_of_a_field_effect_input_doubles_every_ten_kelvin(
    high, technology, factor
):
    """From 25 degrees up; that of a bipolar input is taken as it stands."""
    device = msgspec.structs.replace(FET, technology=technology)
    assert bias_current(device, ambient(high)) == pytest.approx(factor * 200e-12)


def test_a_bias_current_listed_over_temperature_counts_above_room():
    """It is the sheet's own; it never makes the current smaller than at room temperature."""
    for hot, expected in ((5e-9, 5e-9), (100e-12, 200e-12)):
        figure = Figure(50e-12, 200e-12, hot)
        device = msgspec.structs.replace(FET, bias_current=figure)
        assert bias_current(device, ambient(85.0)) == pytest.approx(expected)
        assert bias_current(device, ambient(25.0)) == pytest.approx(200e-12)
        assert bias_current(device, Settings()) == pytest.approx(200e-12)


def test_a_bias_current_nobody_lists_counts_as_none():
    """At any temperature."""
    device = msgspec.structs.replace(FET, bias_current=Figure())
    assert [bias_current(device, ambient(high)) for high in (25.0, 85.0)] == [0.0, 0.0]


def test_the_offset_current_grows_as_the_bias_current_does():
    """Half of it cold, half of it hot."""
    assert offset_current(FET, ambient(25.0)) == pytest.approx(100e-12)
    assert offset_current(FET, ambient(45.0)) == pytest.approx(400e-12)


@pytest.mark.parametrize(
    ("offset", "bias"), [(None, 200e-12), (100e-12, None), (200e-12, 200e-12), (300e-12, 200e-12)]
)
def test_an_offset_current_that_says_nothing(offset, bias):
    """Not listed, or no smaller than the bias current: the two inputs stand for themselves."""
    device = msgspec.structs.replace(
        FET, offset_current=Figure(None, offset), bias_current=Figure(None, bias)
    )
    assert offset_current(device, Settings()) is None


def _watts(stage):
    return stage.dissipation


def test_a_package_has_the_heat_of_its_channels():
    """Together, each package for itself; one channel that is not known makes the package so."""
    watts = {"XU1A": 0.1, "XU1B": 0.2, "XU2A": 0.3, "XU2B": None, "XU3A": None, "XU3B": 0.1}
    stages = [made(name, package=name[1:3], dissipation=heat) for name, heat in watts.items()]
    assert package_heat(stages, _watts) == {"U1": pytest.approx(0.3), "U2": None, "U3": None}
    assert package_heat([], _watts) == {}


def test_the_junction_stands_above_the_hottest_ambient():
    """100 K/W and 0.2 W are 20 K; without a case or its heat there is no number."""
    case = Case("SOIC-8", 100.0)
    assert junction(case, 0.2, ambient(60.0)) == pytest.approx(80.0)
    assert junction(case, 0.2, Settings()) == pytest.approx(45.0)
    assert junction(None, 0.2, Settings()) is None
    assert junction(case, None, Settings()) is None


@pytest.mark.parametrize(
    ("cases", "channels", "name"),
    [
        ({"TO-99": 200.0, "DIP-14": 300.0}, 2, "TO-99"),  # a can has eight pins, not ninety-nine
        ({"TO-99": 200.0, "DIP-14": 100.0}, 4, "DIP-14"),
        ({"DIP": 200.0, "SOIC-16": 300.0}, 1, "DIP"),  # no number: taken for eight
        ({"SC70-5": 400.0, "SOIC-8": 200.0}, 3, "SC70-5"),  # three in one case: any will do
        ({"SOIC-14": 100.0}, 2, "SOIC-14"),
        ({"SOIC-14": 200.0, "SOIC-8": 100.0}, None, "SOIC-14"),  # how many is not known
    ],
)
def test_the_hottest_case_that_holds_so_many_counts(cases, channels, name):
    """Where none does, the hottest of all."""
    device = msgspec.structs.replace(FET, theta=cases)
    assert case_of(device, channels, "TL072") == Case(name, cases[name])


def test_no_case_where_none_is_listed():
    """Nor for a device nobody knows."""
    assert case_of(None, 2, "TL072") is None
    assert case_of(msgspec.structs.replace(FET, theta={}), 2, "TL072") is None


@pytest.mark.parametrize(
    ("low", "high", "level", "amps", "load", "watts"),
    [
        # 10 V and -10 V, 1 mA of supply current: 20 mW quiescent
        (-8.0, 8.0, 0.0, 0.0, None, 0.0),
        (-8.0, 8.0, 0.0, 0.0, 1000.0, 25e-3),  # sourced: 5 V into 1 kilohm, 5 V left
        (-8.0, 0.0, 0.0, 0.0, 1000.0, 25e-3),  # sunk
        (0.0, 2.0, 0.0, 0.0, 1000.0, 16e-3),  # 2 V: 8 V left, 2 mA
        # a load to 5 V sourced from there up: 2.5 V across it at 7.5 V, sunk below it: at -2.5 V
        (5.0, 10.0, 7.0, 2e-3, 1000.0, 6.25e-3),
        (-10.0, 4.0, 0.0, -5e-3, 1000.0, 56.25e-3),
        (0.0, 0.0, 0.0, 3e-3, None, 30e-3),  # 3 mA at rest
        (0.0, 0.0, 0.0, -3e-3, None, 30e-3),
        (-50.0, -20.0, -20.0, 3e-3, None, 60e-3),  # beyond the rail it stands at the rail
        (20.0, 50.0, 20.0, -3e-3, None, 60e-3),
    ],
)
def test_the_output_stage_at_its_worst(low, high, level, amps, load, watts):
    """The volts it holds off times the current it gives, whichever way that goes."""
    device = msgspec.structs.replace(FET, supply_current=Figure(1e-3))
    supply = Supply(positive=10.0, negative=-10.0)
    current = Current(source=Bound(upper=True, level=amps), demand_source=1.0)
    output = Output(net="out", level=level, demand=Range(low, high))
    found = dissipation(device, supply, output, current, load)
    assert found == pytest.approx(20e-3 + watts, rel=0.02)


def test_no_heat_without_its_figures():
    """The quiescent current, the rails, the range and the current are all wanted."""
    device = msgspec.structs.replace(FET, supply_current=Figure(1e-3))
    supply = Supply(positive=10.0, negative=-10.0)
    output = Output(net="out", level=0.0, demand=Range(-1.0, 1.0))
    current = Current(demand_source=1.0)
    assert dissipation(device, supply, output, current, None) is not None
    for given in (
        (None, supply, output, current),
        (msgspec.structs.replace(FET, supply_current=Figure()), supply, output, current),
        (device, Supply(positive=None, negative=-10.0), output, current),
        (device, Supply(positive=10.0, negative=None), output, current),
        (device, supply, Output(net="out", level=None, demand=Range(-1.0, 1.0)), current),
        (device, supply, Output(net="out", level=0.0, demand=Range(None, 1.0)), current),
        (device, supply, Output(net="out", level=0.0, demand=Range(-1.0, None)), current),
        (device, supply, output, Current()),
    ):
        assert dissipation(*given, None) is None
