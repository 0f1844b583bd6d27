"""The JSON report: names, order, units, nulls."""

import json
import math
from pathlib import Path

import jsonschema
import msgspec
import pytest

from railguard.analysis.bound import Range
from railguard.analysis.stage import Allowed
from railguard.report.as_json import document, schema
from railguard.report.json_types import Document
from railguard.report.places import from_root
from railguard.reviewing import review
from tests import gauge

ROOT = Path(__file__).parents[2]
SCHEMA = ROOT / "railguard" / "report" / "report.schema.json"

DECK = gauge.deck(feedback="100k", load="600")


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
        "bandwidth", "phase_margin", "loop_gain", "slew", "high_pass", "dissipation", "junction",
        "gain", "filter", "thresholds", "spread", "file", "line",
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
    """The phase margin hangs on figures the data sheet does not list: it has no ends either."""
    stage = report["designs"][0]["stages"][0]
    assert stage["phase_margin"] is None
    assert stage["spread"]["phase_margin"] is None
    assert stage["filter"] is None


def test_figures_have_their_ends(report):
    """Gain -10 and noise gain 11 of 1 % resistors: 2 % of ten."""
    stage = report["designs"][0]["stages"][0]
    (gain,) = stage["gain"]
    assert (gain["net"], gain["unit"]) == ("in", "V/V")
    assert gain["value"] == pytest.approx(-10, rel=1e-3)
    assert gain["spread"]["low"] == pytest.approx(-10.2, rel=1e-3)
    assert gain["spread"]["high"] == pytest.approx(-9.8, rel=1e-3)
    for name, nominal in (("noise_gain_dc", 11), ("bandwidth", 3e6 / 11), ("loop_gain", 272)):
        ends = stage["spread"][name]
        assert stage[name] == pytest.approx(nominal, rel=1e-2)
        assert ends["low"] == pytest.approx(stage[name] * (1 - 0.2 / 11), rel=1e-3)
        assert ends["high"] == pytest.approx(stage[name] * (1 + 0.2 / 11), rel=1e-3)


def test_a_filter_has_its_ends():
    """The Sallen-Key low-pass of two equal resistors: its own gain is one, exactly."""
    text = DECK.replace("R1 in n 10k", "R1 in a 11.25k\nR3 a p 11.25k\nC1 a out 2n\nC2 p 0 1n")
    text = text.replace("R2 n out 100k\n", "").replace("XU1 0 n vp", "XU1 p out vp")
    found = json.loads(document(review(text)))["designs"][0]["stages"][0]["filter"]
    assert found["kind"] == "low-pass"
    assert found["frequency"] == pytest.approx(10e3, rel=0.01)
    assert found["frequency_spread"]["low"] < found["frequency"]
    assert found["q_spread"]["high"] > found["q"]
    assert found["gain_spread"] == {"low": 1.0, "high": 1.0}


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


@pytest.mark.parametrize(
    "source",
    [
        DECK,
        ROOT / "fixtures" / "station" / "station.cir",
        ROOT / "fixtures" / "board" / "gauge_board.cir",
        ROOT / "fixtures" / "faults" / "supply-reversed.cir",
        ROOT / "nowhere.cir",
    ],
    ids=["text", "sound", "board", "fault", "missing"],
)
def test_documents_obey_the_shipped_schema(source):
    """A reader that holds the report to its schema is never surprised."""
    shipped = json.loads(SCHEMA.read_bytes())
    jsonschema.Draft202012Validator.check_schema(shipped)
    jsonschema.validate(json.loads(document(review(source))), shipped)


def test_schema_refuses_what_is_no_report(report):
    """A wrong severity or a missing key does not pass for a report."""
    shipped = json.loads(SCHEMA.read_bytes())
    wrong = json.loads(json.dumps(report))
    wrong["designs"][0]["findings"][0]["severity"] = "fatal"
    with pytest.raises(jsonschema.ValidationError):
        jsonschema.validate(wrong, shipped)
    short = json.loads(json.dumps(report))
    del short["designs"][0]["stages"][0]["output"]["worst_low"]
    with pytest.raises(jsonschema.ValidationError):
        jsonschema.validate(short, shipped)


def test_infinite_and_undefined_numbers_are_null():
    """JSON has neither; a value that is no number was not worked out."""
    found = review(DECK)
    stage = found.designs[0].design.stages[0]
    odd = msgspec.structs.replace(
        stage,
        dissipation=math.nan,
        output=msgspec.structs.replace(stage.output, worst=Range(-math.inf, math.inf)),
        allowed=Allowed("in", -math.inf, 1.0, "headroom-output XU1"),
    )
    design = msgspec.structs.replace(found.designs[0].design, stages=(odd,))
    changed = msgspec.structs.replace(
        found, designs=(msgspec.structs.replace(found.designs[0], design=design),)
    )
    shown = json.loads(document(changed))["designs"][0]["stages"][0]
    assert shown["dissipation"] is None
    assert shown["output"]["worst_low"] is None
    assert shown["output"]["worst_high"] is None
    assert shown["input_allowed"] is None


def test_fingerprint_names_the_deck_from_the_runs_root(tmp_path, monkeypatch):
    """The same deck has the same fingerprints from wherever and however it is named."""
    (tmp_path / "boards").mkdir()
    deck = tmp_path / "boards" / "gauge.cir"
    deck.write_text(DECK)

    def prints(name, root=None):
        found = json.loads(document(review(Path(name)), root))["designs"][0]["findings"]
        return [finding["fingerprint"] for finding in found]

    monkeypatch.chdir(tmp_path)
    plain = prints("boards/gauge.cir")
    assert plain
    assert plain == prints(deck)
    assert plain == prints("boards/../boards/gauge.cir")
    monkeypatch.chdir(tmp_path / "boards")
    assert plain == prints("gauge.cir", tmp_path)
    assert plain != prints("gauge.cir")


def test_a_deck_outside_the_root_keeps_its_name(tmp_path):
    """A path that does not lie below the run's root stands as it was given."""
    assert from_root("/elsewhere/gauge.cir", tmp_path) == "/elsewhere/gauge.cir"
