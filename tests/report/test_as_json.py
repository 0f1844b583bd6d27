"""The JSON report: names, order, units, nulls."""

import json
import math
from pathlib import Path

import msgspec
import pytest

from railguard.report.as_json import Document, document, schema
from railguard.review import review

ROOT = Path(__file__).parents[2]
SCHEMA = ROOT / "railguard" / "report" / "report.schema.json"

DECK = """station
VIN in 0 SIN(0 0.5 1k)
R1 in n 10k
R2 n out 100k
RL out 0 600
XU1 0 n vp vn out TL072
VP vp 0 12
VN vn 0 -12
CP vp 0 100n
CN vn 0 100n
.end
"""


@pytest.fixture(scope="module")
def report():
    """Return the report of one deck as Python values."""
    return json.loads(document(review(DECK)))


def test_keys_stand_in_the_promised_order(report):
    """Readers rely on these names."""
    assert list(report) == ["schema", "tool", "settings", "designs"]
    assert report["schema"] == "railguard-report/1"
    assert list(report["settings"]) == ["file", "hold_at", "rules_off", "as_of"]
    design = report["designs"][0]
    assert list(design) == [
        "path", "sha256", "kind", "verdict", "coverage", "findings", "stages", "not_checked",
        "reading",
    ]  # fmt: skip
    assert list(design["findings"][0]) == [
        "rule", "family", "severity", "designators", "nets", "demand", "limit", "margin",
        "margin_share", "unit", "basis", "corner", "message", "remedy", "source", "file", "line",
        "column", "fingerprint", "waiver", "consequences",
    ]  # fmt: skip
    assert list(design["stages"][0]) == [
        "designator", "device", "catalogue", "package", "topology", "supply", "output", "current",
        "input", "input_allowed", "dc_loop", "noise_gain", "noise_gain_dc", "noise_gain_crossover",
        "bandwidth", "phase_margin", "dissipation", "file", "line",
    ]  # fmt: skip


def test_numbers_are_si(report):
    """Volts, amperes, hertz; a sink current is positive."""
    stage = report["designs"][0]["stages"][0]
    assert stage["supply"] == {"positive": 12.0, "negative": -12.0, "basis": "netlist"}
    assert stage["output"]["demand_high"] == pytest.approx(5.0, rel=1e-2)
    assert stage["current"]["demand_sink"] == pytest.approx(5 / 600 + 5 / 100e3, rel=1e-2)
    assert stage["noise_gain_dc"] == pytest.approx(11.0)
    assert stage["bandwidth"] == pytest.approx(3e6 / 11, rel=1e-2)
    assert stage["dc_loop"] == "negative"


def test_what_was_not_worked_out_is_null(report):
    """The phase margin hangs on figures the data sheet does not list."""
    assert report["designs"][0]["stages"][0]["phase_margin"] is None


def test_margin_is_room_left_in_the_findings_unit(report):
    """A current beyond the limit has a negative margin."""
    found = [f for f in report["designs"][0]["findings"] if f["rule"] == "drive-current"]
    assert found
    assert found[0]["unit"] == "A"
    assert found[0]["margin"] == pytest.approx(found[0]["limit"] - found[0]["demand"])
    assert found[0]["margin"] < 0


def test_fingerprint_forgets_lines_and_values():
    """A comment line above and another value leave the fingerprint as it was."""
    moved = DECK.replace("RL out 0 600", "* heavier\nRL out 0 590")
    prints = [
        [
            f["fingerprint"]
            for f in json.loads(document(review(text)))["designs"][0]["findings"]
            if f["rule"] == "drive-current"
        ]
        for text in (DECK, moved)
    ]
    assert prints[0] == prints[1] != []


def test_shipped_schema_is_the_wire_types():
    """The schema file and the types say the same; rewrite it with `as_json.schema()`."""
    assert SCHEMA.read_bytes() == schema()


def test_document_reads_back_into_its_types():
    """Every value is of the type its schema promises, and nothing is infinite."""
    found = msgspec.json.decode(document(review(DECK)), type=Document)
    for stage in found.designs[0].stages:
        for value in (stage.noise_gain, stage.bandwidth, stage.output.worst_high):
            assert value is None or math.isfinite(value)


def test_unreadable_file_still_gives_a_whole_document(tmp_path):
    """A file that does not exist is a design with one finding."""
    found = json.loads(document(review(tmp_path / "nowhere.cir")))
    assert found["designs"][0]["verdict"] == "hold"
    assert found["designs"][0]["stages"] == []
