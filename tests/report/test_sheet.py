"""The stage sheet: every op-amp has every row, each figure its basis, in every form."""

import csv
import io
import json
import re
from pathlib import Path

import pytest
from rich.console import Console

from railguard.analysis.bound import Range
from railguard.report import sheet_forms as forms
from railguard.report.sheet import rows
from railguard.report.sheet_row import PARTS, Row, basis_of, range_of
from railguard.report.words import with_ends
from railguard.reviewing import review

ROOT = Path(__file__).parents[2]
STATION = ROOT / "fixtures" / "station" / "station.cir"
QUANTITIES = {
    "device", "positive supply", "negative supply", "total supply", "output", "output current",
    "inputs", "slew rate", "bandwidth", "noise gain", "loop gain", "phase margin", "dissipation",
    "offset at output", "decoupling", "largest input", "findings", "not checked",
}  # fmt: skip


@pytest.fixture(scope="module")
def station():
    """The sheet of the river-gauge station."""
    return rows(review(STATION, plugins=False))


def by_stage(sheet):
    """Return the rows of each stage."""
    found = {}
    for row in sheet:
        found.setdefault(row.designator, []).append(row)
    return found


def test_every_op_amp_has_every_quantity(station):
    """Pass or not: nine channels, each with all of the sheet."""
    stages = by_stage(station)
    assert len(stages) == 10  # the deck's own rows stand under ""
    for name, own in stages.items():
        if name:
            assert {row.quantity for row in own} >= QUANTITIES, name


def test_every_figure_has_its_basis(station):
    """No number stands without a word on where it came from."""
    for row in station:
        for part in ("demand", "worst", "available", "guaranteed"):
            if range_of(row, part):
                told = getattr(row, f"{part}_basis")
                assert told, f"{row.designator} {row.quantity} {part}"


def test_what_was_not_worked_out_says_why():
    """A floating input leaves ranges without numbers, and the sheet names the reason."""
    sheet = rows(review(ROOT / "fixtures" / "faults" / "bias-no-dc-path.cir", plugins=False))
    own = {row.quantity: row for row in by_stage(sheet)["XU4A"]}
    assert own["findings"].text == "bias-no-dc-path (critical)"
    assert "floats" in own["not checked"].text


@pytest.mark.parametrize("name", ["XU4A", "U4A", "u4a"])
def test_one_stage_by_any_of_its_names(name):
    """As in the netlist, as on the schematic, in any case."""
    sheet = rows(review(STATION, plugins=False), name)
    assert {row.designator for row in sheet} == {"", "XU4A"}


def test_a_package_names_its_channels():
    """Both channels of a dual."""
    sheet = rows(review(STATION, plugins=False), "U4")
    assert {row.designator for row in sheet} == {"", "XU4A", "XU4B"}


def test_a_deck_says_what_was_read(station):
    """A filed sheet tells which text it is about, and what was taken for granted."""
    told = {row.quantity: row.text for row in station if not row.designator}
    assert re.search(r"sha256 [0-9a-f]{64}$", told["deck"])
    assert "0.1 % (stated)" in told["tolerances"]
    assert told["statements"].endswith("railguard.toml")


def test_largest_input_of_a_stage_that_is_overdriven_at_rest():
    """A level beyond its limit leaves the ends where they belong: 1.93 mV of the 10 mV fit."""
    sheet = rows(review(ROOT / "fixtures" / "faults" / "headroom-output.cir", plugins=False))
    (row,) = [r for r in by_stage(sheet)["XU5A"] if r.quantity == "largest input"]
    # the output stands at 3.04 V without signal and reaches 4.98 V, at a gain of 1006
    assert row.guaranteed_high == pytest.approx((4.98 - 3.038) / 1006, rel=0.01)
    assert row.guaranteed_low < 0


def test_rounding_of_the_solution_is_zero(station):
    """No femtovolt stands beside volts."""
    for row in station:
        for part in PARTS:
            ends = [getattr(row, f"{part}_{end}") for end in ("low", "high")]
            known = sorted(abs(v) for v in ends if v)
            assert len(known) < 2 or known[0] > 1e-9 * known[1]


def test_csv_json_and_markdown_say_the_same(station):
    """The same rows in each form, in the same order."""
    table = list(csv.DictReader(io.StringIO(forms.as_csv(station).decode())))
    document = json.loads(forms.as_json(station))
    assert document["schema"] == "railguard-sheet/1"
    assert [r["quantity"] for r in table] == [r["quantity"] for r in document["rows"]]
    assert len(table) == len(station)
    for read, wire, row in zip(table, document["rows"], station, strict=True):
        assert wire["guaranteed_high"] == row.guaranteed_high
        assert read["guaranteed_high"] == (
            "" if row.guaranteed_high is None else str(row.guaranteed_high)
        )
    text = forms.as_markdown(station).decode()
    assert text.count("| output |") == 9
    assert text.count("###") == 9


def test_screen_stays_within_80_columns(station):
    """Nine stages, none of whose lines is wider than a terminal."""
    out = io.StringIO()
    forms.screen(station, Console(file=out, width=80, highlight=False))
    lines = out.getvalue().splitlines()
    assert max(map(len, lines)) <= 80
    assert any(line.startswith("output, high") for line in lines)


def test_figures_stand_with_their_ends(station):
    """Gain of the bridge amplifier, 0.1 % resistors: enough digits to tell them apart."""
    own = by_stage(station)["XU1"]
    (gain,) = [row for row in own if row.quantity == "gain"]
    assert range_of(gain, "demand") == "20.6 V/V"
    assert range_of(gain, "worst") == "20.56 V/V to 20.64 V/V"
    out = io.StringIO()
    forms.screen(tuple(own), Console(file=out, width=80))
    shown = out.getvalue().splitlines()
    at = shown.index(next(line for line in shown if line.startswith("gain, high")))
    assert shown[at].split() == ["gain,", "high", "20.6", "V/V", "20.64", "V/V"]
    assert shown[at + 1].split() == ["gain,", "low", "20.56", "V/V"]


def test_ends_that_read_alike_take_one_line(station):
    """A follower's noise gain of one."""
    out = io.StringIO()
    forms.screen(tuple(by_stage(station)["XU5B"]), Console(file=out, width=80))
    assert not [line for line in out.getvalue().splitlines() if line.startswith("noise gain, ")]


@pytest.mark.parametrize(
    ("value", "low", "high", "unit", "text"),
    [
        (50.0, 49.1, 50.9, "V/V", "50 V/V (49.1 V/V to 50.9 V/V)"),
        (20.598, 20.561, 20.639, "", "20.6 (20.56 to 20.64)"),
        (65.21, 63.1, 67.0, "°", "65.2° (63.1° to 67°)"),
        (1.0, 1.0, 1.0, "V/V", "1 V/V"),
        (1.0, 1.0 - 1e-9, 1.0 + 1e-9, "", "1"),
        (3e6, None, None, "Hz", "3 MHz"),
    ],
)
def test_a_figure_with_its_ends_in_words(value, low, high, unit, text):
    """As an engineer writes it."""
    assert with_ends(value, Range(low, high), unit) == text


HOSTILE = "=HYPERLINK(1)\x1b[31m|<b>`x`\u202e"


def test_text_of_a_netlist_steers_nothing():
    """Neither a spreadsheet, nor a terminal, nor a page."""
    row = Row(file=HOSTILE, designator="-X1", quantity="findings", text=HOSTILE)
    table = forms.as_csv((row,)).decode()
    assert "\x1b" not in table
    assert next(csv.DictReader(io.StringIO(table)))["text"].startswith("'=HYPERLINK")
    assert next(csv.DictReader(io.StringIO(table)))["designator"] == "'-X1"
    page = forms.as_markdown((row,)).decode()
    assert "<b>" not in page.replace("\\<b\\>", "")
    assert "\x1b" not in page
    out = io.StringIO()
    forms.screen((row,), Console(file=out, width=80))
    assert "\x1b[31m" not in out.getvalue()
    assert "\u202e" not in out.getvalue()


def test_a_common_basis_is_said_once():
    """Kind by kind only where there are several."""
    one = Row(file="", designator="", quantity="q", demand_basis="netlist")
    two = Row(file="", designator="", quantity="q", demand_basis="a", guaranteed_basis="b")
    assert basis_of(one) == "netlist"
    assert basis_of(two) == "asked: a; guaranteed: b"


def test_the_least_output_resistance_taken_is_named():
    """The upper bound of a margin rests on it where a capacitor stands at the output."""
    text = (
        "level buffer\nVP vp 0 5\nC1 vp 0 100n\nVIN in 0 SIN(2 1 10)\n"
        "XU1 in out vp 0 out TLV9002\n{load}RL out 0 10k\n"
    )
    told = {}
    for load in ("C2 out 0 100n\n", ""):
        sheet = rows(review(text.format(load=load), plugins=False))
        (margin,) = [row for row in sheet if row.quantity == "phase margin"]
        told[load] = margin.available_basis
    assert told["C2 out 0 100n\n"].endswith("; at least 10 Ω of output resistance taken")
    assert "taken" not in told[""]
