"""Stage sheets of published designs against their sources, through the CSV that would be filed.

Each figure of a source is compared with the cell of the sheet that bears it, within the rounding the
source prints. Values of the circuit that could not be read in the source say so.
"""

import csv
import io
from typing import NamedTuple

import pytest

from railguard.report.sheet import rows
from railguard.report.sheet_forms import as_csv
from railguard.reviewing import review
from railguard.settings.file import parse


class Cell(NamedTuple):
    """One published figure and where it stands on the sheet."""

    quantity: str
    column: str
    value: float
    tolerance: float
    unit: str
    note: str = ""


def sheet(cards, settings=""):
    """Return the sheet of a deck as a reader of its CSV gets it."""
    found = review(cards, parse(settings, "t.toml")) if settings else review(cards)
    return list(csv.DictReader(io.StringIO(as_csv(rows(found)).decode())))


def cell(read, wanted):
    """Return the number in one cell, and its unit."""
    row = next(
        r
        for r in read
        if r["quantity"] == wanted.quantity and (not wanted.note or wanted.note in r["text"])
    )
    return float(row[wanted.column]), row["unit"]


PHOTODIODE = """single-supply photodiode amplifier
VP vp 0 5
C1 vp 0 100n
C2 vp 0 10u
VB p 0 0.1
IPD n 0 SIN(45u 45u 1k)
RF n out 53.6k
CF n out 2.7p
CJ n 0 11p
XU1 p n vp 0 out OPA320
.end
"""
"""Texas Instruments TIDU535 (November 2014), 1 MHz, Single-Supply, Photodiode Amplifier. Seen: 5 V,
0 to 90 µA, 53.6 kΩ, 0.1 V of bias, OPA320, and table 1. CF and CJ from memory; no figure below but
the two goals rests on them."""

PHOTODIODE_FIGURES = [
    Cell("positive supply", "demand_high", 5.0, 0.0, "V"),
    Cell("gain", "demand_high", 53.6e3, 1e-3, "V/A"),
    Cell("output", "demand_low", 0.100, 1e-3, "V"),  # 100.096 mV simulated, with its offset
    Cell("output", "demand_high", 4.924, 1e-4, "V"),
    Cell("output current", "demand_high", 90e-6, 1e-3, "A"),  # RF carries the diode's current
    Cell("inputs", "demand_high", 0.100, 1e-3, "V"),
]
"""Table 1: gain 53.6 kV/A, 100 mV dark, 4.924 V at 90 µA (simulated)."""

INVERTING = """inverting amplifier of a cookbook
VP vp 0 15
VN vn 0 -15
C1 vp 0 100n
C2 vn 0 100n
VIN in 0 SIN(0 7 3k)
R1 in n 10k
R2 n out 20k
XU1 0 n vp vn out COOKBOOK1
.end
"""
"""Texas Instruments SBOA270 (in SLYY137): inverting amplifier, ±7 V to ±14 V at 3 kHz on ±15 V, with
a device of 1.2 MHz and 0.4 V/µs. Goals and bandwidth seen; R1 and R2 from memory (only their ratio
counts below)."""

COOKBOOK = """
[[devices]]
family = "COOKBOOK1"
technology = "bipolar"
supply = { low = 4.0, high = 36.0 }
gain_bandwidth = { typical = 1.2e6 }
open_loop_gain = { typical = 1e6 }
slew_rate = { typical = 0.4e6 }
names = { 1 = ["COOKBOOK1"] }
source = { title = "figures of the design" }
"""

INVERTING_FIGURES = [
    Cell("total supply", "demand_high", 30.0, 0.0, "V"),
    Cell("gain", "demand_high", -2.0, 1e-4, "V/V"),
    Cell("output", "demand_high", 14.0, 1e-3, "V"),
    Cell("output", "demand_low", -14.0, 1e-3, "V"),
    Cell("noise gain", "demand_high", 3.0, 1e-3, "V/V", "at DC"),
    Cell("bandwidth", "demand_high", 3e3, 0.0, "Hz"),
    Cell("bandwidth", "available_high", 400e3, 5e-3, "Hz"),
    Cell("slew rate", "demand_high", 0.264e6, 2e-3, "V/s"),  # 2π * 3 kHz * 14 V
    Cell("slew rate", "available_high", 0.4e6, 0.0, "V/s"),
]

POWER = """output current and package power
VP vp 0 15
VN vn 0 -15
C1 vp 0 100n
C2 vn 0 100n
VIN in 0 PWL(0 3 1 3)
R1 in n 10k
R2 n out 20k
RL out 0 2k
XU1 0 n vp vn out EXAMPLE1
.end
"""
"""S. Franco, Design with Operational Amplifiers and Analog ICs, 3rd ed., ex. 1.14: ±15 V, 0.5 mA of
quiescent current, 3 V in (inputs seen in a companion to the book, the book page not; the printed
answer there leaves the feedback current out, so 3.3 mA and 44.7 mW are derived)."""

EXAMPLE = """
[[devices]]
family = "EXAMPLE1"
technology = "bipolar"
supply = { low = 4.0, high = 36.0 }
supply_current = { typical = 0.5e-3 }
open_loop_gain = { typical = 1e6 }
names = { 1 = ["EXAMPLE1"] }
source = { title = "figures of the example" }
"""

POWER_FIGURES = [
    Cell("output", "demand_low", -6.0, 1e-4, "V"),
    Cell("output current", "demand_low", -3.3e-3, 1e-3, "A"),  # 3.0 mA load, 0.3 mA feedback
    Cell("dissipation", "demand_high", 44.7e-3, 5e-3, "W"),  # 30 V * 0.5 mA + 9 V * 3.3 mA
]

CASES = [
    pytest.param(PHOTODIODE, "", figure, id=f"TIDU535 {figure.quantity} {figure.column}")
    for figure in PHOTODIODE_FIGURES
] + [
    pytest.param(cards, settings, figure, id=f"{name} {figure.quantity} {figure.column}")
    for name, cards, settings, figures in (
        ("SBOA270", INVERTING, COOKBOOK, INVERTING_FIGURES),
        ("Franco 1.14", POWER, EXAMPLE, POWER_FIGURES),
    )
    for figure in figures
]


@pytest.mark.parametrize(("cards", "settings", "figure"), CASES)
def test_sheet_agrees_with_its_source(cards, settings, figure):
    """The cell of the filed sheet holds the published figure."""
    value, unit = cell(sheet(cards, settings), figure)
    assert unit == figure.unit
    assert value == pytest.approx(figure.value, rel=figure.tolerance or 1e-9)


def test_the_sheet_shows_that_the_photodiode_design_meets_its_goals():
    """TIDU535 asks for 0.1 V to 4.9 V, 1 MHz, 45° and less than 2 mA of supply current."""
    read = {row["quantity"]: row for row in sheet(PHOTODIODE)}
    assert float(read["output"]["available_high"]) > 4.924
    assert float(read["output"]["available_low"]) < 0.1
    assert float(read["bandwidth"]["available_high"]) > 1e6
    assert float(read["phase margin"]["available_high"]) > 45
    # guaranteed 1.75 mA at 5 V, and 90 µA from the output at its worst level
    assert float(read["dissipation"]["worst_high"]) < 5.25 * 2e-3
    # the largest current allowed is that of the design and little more
    assert 90e-6 < float(read["largest input"]["guaranteed_high"]) < 95e-6
    assert "headroom-output" in read["largest input"]["text"]
