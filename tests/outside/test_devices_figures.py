"""Figures of the catalogue against a second reading of named data sheets.

Every value here was read in the document beside it, apart from the catalogue's own making: often
another maker's or another revision, and some are values the catalogue does not hold (a swing at a
load between its points, peak to peak, a test at another supply). A drop is (side, total supply,
amperes, typical, guaranteed); None where the document says nothing.
"""

import pytest

from railguard.devices.catalogue import load
from railguard.devices.swing import drop

SHEETS = {
    "LM358": (
        "Taiwan Semiconductor TS321 (same circuit, single), DS_P0000227 version B15, page 2",
        {
            "input_low.guaranteed": 0.0,
            "input_high.guaranteed": -1.5,
            "input_high.hot": -2.0,
            "source_current.guaranteed": 20e-3,
            "sink_current.guaranteed": 10e-3,
            "sink_current.typical": 20e-3,
            "short_circuit.typical": 40e-3,
            "gain_bandwidth.typical": 1e6,
            "voltage_noise.typical": 40e-9,
            "offset_voltage.guaranteed": 7e-3,
            "open_loop_gain.guaranteed": 25e3,
            "open_loop_gain.typical": 100e3,
        },
        [
            ("high", 30.0, 26.0 / 2000.0, None, 4.0),
            ("high", 30.0, 27.0 / 10e3, 2.0, 3.0),
            ("low", 5.0, 0.0, 0.005, 0.020),
            ("low", 15.0, 12e-6, None, 0.2),
            ("low", 15.0, 10e-3, None, 2.0),
        ],
    ),
    "TL07x": (
        "STMicroelectronics TL072, Doc ID 2298, electrical characteristics on +-15 V",
        {
            "supply_current.typical": 1.4e-3,
            "supply_current.guaranteed": 2.5e-3,
            "offset_voltage.typical": 3e-3,
            "offset_voltage.guaranteed": 10e-3,
            "bias_current.guaranteed": 200e-12,
            "input_low.guaranteed": 4.0,
            "input_low.typical": 3.0,
            "input_high.guaranteed": -4.0,
            "input_high.typical": 0.0,
            "short_circuit.guaranteed": 10e-3,
            "short_circuit.typical": 40e-3,
            "slew_rate.guaranteed": 8e6,
            "supply_absolute": 36.0,
        },
        [
            ("high", 30.0, 10.0 / 2000.0, None, 5.0),
            ("low", 30.0, 10.0 / 2000.0, None, 5.0),
            ("high", 30.0, 12.0 / 10e3, None, 3.0),
        ],
    ),
    "TL08x": (
        "onsemi TL081C/TL082C/TL084C, electrical characteristics on +-15 V: 24 V peak to peak",
        {
            "supply_current.typical": 1.4e-3,
            "supply_current.guaranteed": 2.8e-3,
            "bias_current.typical": 30e-12,
            "bias_current.guaranteed": 400e-12,
            "offset_voltage.guaranteed": 15e-3,
            "input_low.typical": 3.0,
            "input_high.typical": 0.0,
            "slew_rate.typical": 13e6,
            "open_loop_gain.guaranteed": 25e3,
        },
        [
            ("high", 30.0, 12.0 / 10e3, None, 3.0),
            ("low", 30.0, 12.0 / 10e3, None, 3.0),
        ],
    ),
    "TL06x": (
        "Texas Instruments TL06xx, SLOS078L, features",
        {"supply_current.typical": 200e-6, "slew_rate.typical": 3.5e6},
        [],
    ),
    "LF353": (
        "Texas Instruments LF351, SLOS014B; National LF353, DS005649 (bandwidth 4 MHz, noise)",
        {
            "bias_current.typical": 50e-12,
            "current_noise.typical": 0.01e-12,
            "supply_current.typical": 1.8e-3,
            "offset_voltage.guaranteed": 10e-3,
            "slew_rate.typical": 13e6,
            "gain_bandwidth.typical": 4e6,
            "voltage_noise.typical": 25e-9,
            "supply_absolute": 36.0,
        },
        [],
    ),
    "LF357": (
        "National LF155 series, note 7: settling of the LF357 is tested at a gain of 5",
        {"stable_gain.guaranteed": 5.0},
        [],
    ),
    "uA741": (
        "Philips MC1458 product specification of August 31, 1994 (two 741 circuits)",
        {"output_resistance.typical": 75.0, "short_circuit.typical": 25e-3},
        [("high", 30.0, 10.0 / 2000.0, None, 5.0)],
    ),
    "MC1458": (
        "Philips MC1458/MC1558 product specification of August 31, 1994: 2.3/5 mA for two",
        {
            "output_resistance.typical": 75.0,
            "short_circuit.guaranteed": 10e-3,
            "short_circuit.typical": 25e-3,
            "supply_current.typical": 2.3e-3 / 2,
            "supply_current.guaranteed": 5.0e-3 / 2,
            "input_low.guaranteed": 3.0,
            "input_low.typical": 2.0,
            "bias_current.typical": 80e-9,
            "bias_current.guaranteed": 500e-9,
        },
        [
            ("high", 30.0, 12.0 / 10e3, None, 3.0),
            ("high", 30.0, 14.0 / 10e3, 1.0, None),
            ("low", 30.0, 10.0 / 2000.0, None, 5.0),
            ("low", 30.0, 13.0 / 2000.0, 2.0, None),
        ],
    ),
    "RC4558": (
        "ROHM BA4558/BA4558F/BA4558N, Standard ICs, electrical characteristics on +-15 V",
        {
            "offset_voltage.typical": 0.5e-3,
            "offset_voltage.guaranteed": 6e-3,
            "offset_current.guaranteed": 200e-9,
            "bias_current.typical": 60e-9,
            "input_low.guaranteed": 3.0,
            "input_low.typical": 1.0,
            "input_high.guaranteed": -3.0,
            "slew_rate.typical": 1e6,
            "open_loop_gain.typical": 10 ** (100 / 20),
            "open_loop_gain.guaranteed": 10 ** (86 / 20),
            "differential_input.guaranteed": 30.0,
            "supply_absolute": 36.0,
        },
        [
            ("high", 30.0, 12.0 / 10e3, None, 3.0),
            ("high", 30.0, 14.0 / 10e3, 1.0, None),
            ("low", 30.0, 10.0 / 2000.0, None, 5.0),
            ("low", 30.0, 13.0 / 2000.0, 2.0, None),
        ],
    ),
    "LM833": (
        "STMicroelectronics LM833, Doc ID 2169 Rev 3; National LM833 front page (minima)",
        {
            "gain_bandwidth.typical": 15e6,
            "gain_bandwidth.guaranteed": 10e6,
            "slew_rate.typical": 7e6,
            "slew_rate.guaranteed": 5e6,
            "voltage_noise.typical": 4.5e-9,
            "supply_absolute": 36.0,
        },
        [],
    ),
    "MC33078": (
        "STMicroelectronics MC33078, Rev 5 (March 2008), front page",
        {
            "slew_rate.typical": 7e6,
            "voltage_noise.typical": 4.5e-9,
            "supply_absolute": 36.0,
        },
        [],
    ),
    "OP07": (
        "Analog Devices OP07 Rev A and Texas Instruments OP07x SLOS099G, front pages",
        {
            "input_low.guaranteed": 2.0,
            "input_high.guaranteed": -2.0,
            "input_low.typical": 1.0,
            "supply_low": 6.0,
            "supply_high": 36.0,
        },
        [],
    ),
    "OP27": (
        "Analog Devices OP27 Rev C and Rev H, front page: +-10 V guaranteed into 600 ohm",
        {
            "slew_rate.typical": 2.8e6,
            "gain_bandwidth.typical": 8e6,
            "voltage_noise.typical": 3.2e-9,
        },
        [("high", 30.0, 10.0 / 600.0, None, 5.0), ("low", 30.0, 10.0 / 600.0, None, 5.0)],
    ),
    "OP177": (
        "Analog Devices OP177, front page",
        {
            "offset_voltage.guaranteed": 25e-6,
            "supply_current.guaranteed": 2.0e-3,
            "temperature": (-40.0, 85.0),
        },
        [],
    ),
    "OP1177": (
        "Analog Devices OP1177/OP2177/OP4177 Rev B, features",
        {
            "offset_voltage.guaranteed": 60e-6,
            "bias_current.guaranteed": 2e-9,
            "voltage_noise.typical": 8e-9,
            "supply_current.typical": 400e-6,
            "supply_low": 5.0,
            "supply_high": 30.0,
            "load_capacitance.typical": 1e-9,
            "stable_gain.guaranteed": 1.0,
            "phase_reversal": False,
        },
        [],
    ),
    "OP777": (
        "Analog Devices OP777/OP727/OP747, features",
        {
            "offset_voltage.guaranteed": 100e-6,
            "bias_current.guaranteed": 10e-9,
            "supply_current.guaranteed": 300e-6,
            "supply_low": 2.7,
            "supply_high": 30.0,
            "phase_reversal": False,
        },
        [],
    ),
    "LT1013": (
        "Linear Technology LT1013/LT1014 and Texas Instruments SLOS018B, front pages",
        {
            "supply_current.typical": 350e-6,
            "current_noise.typical": 0.07e-12,
            "input_low.guaranteed": 0.0,
            "phase_reversal": False,
        },
        [],
    ),
    "AD822": (
        "Analog Devices AD822 Rev A, page 2, 0/5 V, A grade",
        {
            "offset_voltage.typical": 0.1e-3,
            "offset_voltage.guaranteed": 0.8e-3,
            "bias_current.typical": 2e-12,
            "bias_current.guaranteed": 25e-12,
            "offset_current.guaranteed": 20e-12,
            "voltage_noise.typical": 16e-9,
            "current_noise.typical": 0.8e-15,
            "gain_bandwidth.typical": 1.8e6,
            "slew_rate.typical": 3e6,
            "input_low.guaranteed": -0.2,
            "input_high.guaranteed": -1.0,
            "input_capacitance.typical": 2.8e-12,
            "open_loop_gain.guaranteed": 80e3,
            "load_capacitance.typical": 350e-12,
            "source_current.guaranteed": 15e-3,
            "supply_current.guaranteed": 800e-6,
        },
        [("low", 5.0, 20e-6, 0.005, 0.007)],
    ),
    "LMC6482": (
        "Texas Instruments engineers on e2e.ti.com, thread 858466: 2 kohm to V+/2 is 1.2 mA",
        {"rail_to_rail_input": True, "rail_to_rail_output": True, "bias_current.typical": 20e-15},
        [("high", 5.0, 1.2e-3, 0.1, None), ("low", 5.0, 1.2e-3, 0.1, None)],
    ),
    "TLC227x": (
        "Texas Instruments TLC227x, SLOS190B and G, features",
        {
            "voltage_noise.typical": 9e-9,
            "bias_current.typical": 1e-12,
            "slew_rate.typical": 3.6e6,
            "input_low.guaranteed": 0.0,
        },
        [],
    ),
    "LMV358": (
        "National LMV321/LMV358 family sheet, 2.7 V table: 10 kohm to 1.35 V; TI SLOS415, front",
        {
            "input_low.typical": -0.2,
            "supply_low": 2.7,
            "supply_high": 5.5,
            "gain_bandwidth.typical": 1e6,
            "slew_rate.typical": 1e6,
            "bias_current.typical": 11e-9,
            "bias_current.guaranteed": 250e-9,
        },
        [
            ("high", 2.7, (1.35 - 0.1) / 10e3, 0.01, 0.1),
            ("low", 2.7, (1.35 - 0.18) / 10e3, 0.06, 0.18),
        ],
    ),
    "TLV246x": (
        "Texas Instruments TLV246x, SLOS220G, features",
        {
            "input_low.guaranteed": -0.2,
            "input_high.guaranteed": 0.2,
            "gain_bandwidth.typical": 6.4e6,
            "supply_current.typical": 500e-6,
            "offset_voltage.typical": 100e-6,
            "voltage_noise.typical": 11e-9,
            "slew_rate.typical": 1.6e6,
            "source_current.typical": 90e-3,
        },
        [],
    ),
    "TLV900x": (
        "Texas Instruments TLV900x, SBOS833A, page 16",
        {
            "input_low.guaranteed": -0.1,
            "input_high.guaranteed": 0.1,
            "supply_low": 1.8,
            "supply_high": 5.5,
        },
        [
            ("high", 5.5, (2.75 - 0.02) / 10e3, None, 0.02),
            ("low", 5.5, (2.75 - 0.02) / 10e3, None, 0.02),
        ],
    ),
    "TS912": (
        "STMicroelectronics TS914, Rev 5 (January 2007), description",
        {
            "supply_low": 2.7,
            "supply_high": 16.0,
            "supply_current.typical": 200e-6,
            "source_current.typical": 40e-3,
            "bias_current.typical": 1e-12,
        },
        [("high", 10.0, (5.0 - 0.05) / 10e3, 0.05, None)],
    ),
    "OPA320": (
        "Texas Instruments OPA2320, specifications page of ti.com's document viewer",
        {
            "offset_voltage.typical": 40e-6,
            "offset_voltage.guaranteed": 150e-6,
            "input_low.guaranteed": -0.1,
            "input_high.guaranteed": 0.1,
            "bias_current.typical": 0.2e-12,
            "bias_current.guaranteed": 0.9e-12,
            "voltage_noise.typical": 8.5e-9,
            "current_noise.typical": 0.6e-15,
            "input_capacitance.typical": 4e-12,
            "open_loop_gain.guaranteed": 10 ** (114 / 20),
            "open_loop_gain.typical": 10 ** (132 / 20),
            "gain_bandwidth.typical": 20e6,
            "slew_rate.typical": 10e6,
        },
        [],
    ),
    "OPA340": (
        "Texas Instruments OPAx340, SBOS073C, front page: 1 mV with 100 kohm",
        {
            "supply_current.typical": 750e-6,
            "gain_bandwidth.typical": 5.5e6,
            "slew_rate.typical": 6e6,
            "supply_low": 2.5,
            "temperature": (-40.0, 85.0),
        },
        [("high", 5.0, 2.5 / 100e3, 0.001, None)],
    ),
    "OPA344": (
        "Burr-Brown OPA344/OPA345, front page",
        {
            "gain_bandwidth.typical": 1e6,
            "slew_rate.typical": 0.8e6,
            "supply_current.typical": 150e-6,
            "supply_current.guaranteed": 250e-6,
            "stable_gain.guaranteed": 1.0,
            "input_low.guaranteed": -0.3,
        },
        [],
    ),
    "OPA345": (
        "Burr-Brown OPA344/OPA345, front page",
        {
            "gain_bandwidth.typical": 3e6,
            "slew_rate.typical": 2e6,
            "stable_gain.guaranteed": 5.0,
            "supply_low": 2.5,
            "supply_high": 5.5,
        },
        [],
    ),
    "OPA197": (
        "Texas Instruments OPAx197, SBOS737C, features and description",
        {
            "offset_voltage.typical": 25e-6,
            "offset_voltage.guaranteed": 100e-6,
            "voltage_noise.typical": 5.5e-9,
            "gain_bandwidth.typical": 10e6,
            "slew_rate.typical": 20e6,
            "supply_current.typical": 1e-3,
            "source_current.typical": 65e-3,
            "load_capacitance.typical": 1e-9,
            "input_low.guaranteed": -0.1,
            "supply_low": 4.5,
            "supply_high": 36.0,
        },
        [],
    ),
    "MCP6001": (
        "Microchip MCP6001/1R/1U/2/4, DS21733J, page 1",
        {
            "gain_bandwidth.typical": 1e6,
            "supply_current.typical": 100e-6,
            "load_capacitance.typical": 500e-12,
            "input_low.guaranteed": -0.3,
            "input_high.guaranteed": 0.3,
            "supply_low": 1.8,
            "supply_high": 6.0,
        },
        [],
    ),
    "MCP601": (
        "Microchip MCP601/1R/2/3/4, AC characteristics and features",
        {
            "gain_bandwidth.typical": 2.8e6,
            "slew_rate.typical": 2.3e6,
            "supply_current.typical": 230e-6,
            "supply_low": 2.7,
            "supply_high": 6.0,
            "supply_absolute": 7.0,
        },
        [],
    ),
    "MCP604x": (
        "Microchip MCP6041/2/3/4, DS21669D, page 2",
        {
            "offset_voltage.guaranteed": 3e-3,
            "bias_current.typical": 1e-12,
            "supply_low": 1.4,
            "supply_absolute": 7.0,
        },
        [],
    ),
    "MCP628x": (
        "Microchip MCP6281/2/3/4/5, title line",
        {"supply_current.typical": 450e-6, "gain_bandwidth.typical": 5e6},
        [],
    ),
}

FIGURES = [
    pytest.param(family, path, value, id=f"{family} {path}")
    for family, (_document, figures, _drops) in SHEETS.items()
    for path, value in figures.items()
]
DROPS = [
    pytest.param(family, *entry, id=f"{family} {entry[0]} {entry[2]:.3g} A")
    for family, (_document, _figures, drops) in SHEETS.items()
    for entry in drops
]


def test_thirty_families_have_a_second_reading():
    """Each names its document and at least one value."""
    assert len(SHEETS) >= 30
    assert all(document and (figures or drops) for document, figures, drops in SHEETS.values())


@pytest.mark.parametrize(("family", "path", "value"), FIGURES)
def test_a_figure_is_that_of_the_second_reading(family, path, value):
    """Equal within 1 %: room for decibels turned into factors, and nothing else."""
    held = load().device(family)
    for name in path.split("."):
        held = getattr(held, name)
    assert held == pytest.approx(value, rel=0.01)


@pytest.mark.parametrize(("family", "side", "supply", "amps", "typical", "guaranteed"), DROPS)
def test_a_drop_is_that_of_the_second_reading(family, side, supply, amps, typical, guaranteed):
    """The curve gives at the document's load what the document lists, within 2 %."""
    device = load().device(family)
    points = device.swing_high if side == "high" else device.swing_low
    found = drop(points, amps, supply)
    if typical is not None:
        assert found.typical == pytest.approx(typical, rel=0.02)
    if guaranteed is not None:
        assert found.guaranteed == pytest.approx(guaranteed, rel=0.02)


def test_thermal_resistance_of_the_package_class_is_near_what_makers_list():
    """STMicroelectronics TL072, Doc ID 2298 Rev 7: SO-8 125 K/W, DIP8 85 K/W."""
    theta = load().device("TL07x").theta
    assert theta["SOIC-8"] == pytest.approx(125.0, rel=0.3)
    assert theta["DIP-8"] == pytest.approx(85.0, rel=0.3)
