"""`railguard review`: what goes in, what comes out, and with which status."""

import json
import os
import stat
import subprocess
import sys
from pathlib import Path

import pytest
from click.testing import CliRunner

from railguard.commands.main import main
from railguard.commands.review import review
from railguard.errors import RailguardError
from tests import gauge

ROOT = Path(__file__).parents[2]
STATION = ROOT / "fixtures" / "station" / "station.cir"
CLIPPED = ROOT / "fixtures" / "faults" / "headroom-output.cir"
OPEN = ROOT / "fixtures" / "board" / "gauge_board.cir"

DECK = gauge.deck(feedback="100k", load="600")


def status(*arguments):
    """Return the exit status of a review with these arguments."""
    return CliRunner().invoke(review, [str(a) for a in arguments]).exit_code


def refused(*arguments):
    """Return the sentence a review with these arguments is refused with."""
    result = CliRunner().invoke(review, [str(a) for a in arguments])
    assert isinstance(result.exception, RailguardError)
    return str(result.exception)


def test_status_is_0_for_a_sound_station():
    """Nothing stands at the hold level."""
    assert status(STATION) == 0


def test_status_is_1_for_a_clipped_one():
    """A critical finding stands above major."""
    assert status(CLIPPED) == 1


def test_the_worst_file_counts():
    """One bad netlist among good ones gives status 1, wherever it stands."""
    assert status(STATION, CLIPPED) == 1
    assert status(CLIPPED, STATION) == 1


def test_hold_level_decides():
    """The same minor findings pass at major and hold at minor."""
    assert status(OPEN) == 0
    assert status(OPEN, "--hold-at", "minor") == 1


def test_a_required_family_must_not_stay_open():
    """What could not be checked gives status 1 only where its family is required."""
    assert status(OPEN, "--require", "headroom, drive") == 1
    assert status(OPEN, "--require", "supply") == 0


@pytest.mark.parametrize(
    ("arguments", "words"),
    [
        (["--require", "hedroom"], 'no family "hedroom"'),
        (["--report", "pdf"], 'no report format "pdf"'),
        (["--as-of", "tomorrow"], "Write it as 2027-01-31"),
        (["--settings", "nowhere.toml"], "nowhere.toml"),
        (["--root", "nowhere"], "nowhere is no folder"),
        (["--report", "json", "--report", "terminal"], "Two reports go to the screen"),
        (["--report", "json=a", "--report", "terminal=a"], "Two reports go to"),
        (["--report", "json=nowhere/report.json"], "cannot be written"),
    ],
)
def test_a_request_that_cannot_be_carried_out_says_why(arguments, words, tmp_path, monkeypatch):
    """One sentence names what is wrong."""
    monkeypatch.chdir(tmp_path)
    assert words in refused(STATION, *arguments)


def test_refused_request_is_one_line_and_status_2(monkeypatch, capsys):
    """No traceback, nothing on the standard output."""
    monkeypatch.setattr(sys, "argv", ["railguard", "review", str(STATION), "--as-of", "soon"])
    with pytest.raises(SystemExit) as left:
        main()
    told = capsys.readouterr()
    assert left.value.code == 2
    assert told.out == ""
    assert len(told.err.splitlines()) == 1
    assert told.err.startswith('railguard: "soon" is no date.')


def test_the_schema_of_the_json_report_is_printed():
    """Without a netlist, and exactly as it ships."""
    result = CliRunner().invoke(review, ["--schema"])
    assert result.exit_code == 0
    shipped = ROOT / "railguard" / "report" / "report.schema.json"
    assert result.stdout_bytes == shipped.read_bytes()


def test_a_report_never_replaces_the_netlist(tmp_path):
    """The wrong name behind --report costs nobody a netlist."""
    deck = tmp_path / "gauge.cir"
    deck.write_text(DECK)
    assert "would replace" in refused(deck, "--report", f"json={deck}")
    assert deck.read_text() == DECK
    assert "names no file" in refused(deck, "--report", "json=")


def test_several_reports_of_one_run(tmp_path):
    """JSON into a file and the terminal's text into another, in one run."""
    machine, people = tmp_path / "report.json", tmp_path / "report.txt"
    assert status(CLIPPED, "--report", f"json={machine}", "--report", f"terminal={people}") == 1
    assert json.loads(machine.read_bytes())["designs"][0]["verdict"] == "hold"
    assert "Verdict: hold" in people.read_text(encoding="utf-8")


def test_a_report_that_cannot_be_moved_leaves_nothing_behind(tmp_path):
    """A folder stands where the report should: it stays, and no half file beside it."""
    place = tmp_path / "report.json"
    place.mkdir()
    assert "cannot be written" in refused(STATION, "--report", f"json={place}")
    assert [path.name for path in tmp_path.iterdir()] == ["report.json"]


@pytest.mark.skipif(os.name == "nt", reason="file modes are those of POSIX")
def test_a_report_may_be_read_by_those_who_may_read_new_files(tmp_path):
    """The mode follows the user's mask, as that of any new file."""
    place, other = tmp_path / "report.json", tmp_path / "other"
    other.touch()
    status(STATION, "--report", f"json={place}")
    assert stat.S_IMODE(place.stat().st_mode) == stat.S_IMODE(other.stat().st_mode)


def test_no_settings_leaves_the_file_beside_it_alone(tmp_path):
    """A railguard.toml that accepts the fault is obeyed, unless it is told not to be."""
    deck = tmp_path / "gauge.cir"
    deck.write_text(DECK)
    (tmp_path / "railguard.toml").write_text('[review]\nhold-at = "critical"\n')
    assert status(deck) == 0
    assert status(deck, "--no-settings") == 1


def test_a_waiver_is_judged_on_the_day_given(tmp_path):
    """The same waiver holds the day before it ends and no longer the day after."""
    deck = tmp_path / "gauge.cir"
    deck.write_text(DECK)
    (tmp_path / "railguard.toml").write_text(
        '[[waivers]]\nrule = "drive-current"\ndesignator = "XU1"\n'
        'reason = "600 ohm only while the line is tested"\nuntil = 2027-06-30\n'
    )
    assert status(deck, "--as-of", "2027-06-29") == 0
    assert status(deck, "--as-of", "2027-07-01") == 1


def test_kind_is_taken_as_told(tmp_path):
    """A deck without any mark is judged as what the user says it is."""
    deck = tmp_path / "gauge.cir"
    deck.write_text(DECK)
    for kind in ("board", "bench"):
        result = CliRunner().invoke(review, [str(deck), "--kind", kind, "--report", "json"])
        assert json.loads(result.stdout)["designs"][0]["kind"] == kind


def test_includes_may_lie_below_the_root(tmp_path):
    """A file beside the deck's folder is read only where --root allows it."""
    (tmp_path / "common").mkdir()
    (tmp_path / "boards").mkdir()
    (tmp_path / "common" / "load.inc").write_text("RL out 0 600\n")
    deck = tmp_path / "boards" / "gauge.cir"
    deck.write_text(DECK.replace("RL out 0 600", ".include ../common/load.inc"))

    def rules(*arguments):
        result = CliRunner().invoke(review, [str(deck), "--report", "json", *arguments])
        return {f["rule"] for f in json.loads(result.stdout)["designs"][0]["findings"]}

    assert "netlist-include" in rules()
    allowed = rules("--root", str(tmp_path))
    assert "netlist-include" not in allowed
    assert "drive-current" in allowed


def test_runs_as_a_module():
    """`python -m railguard` is the same command."""
    done = subprocess.run(
        [sys.executable, "-m", "railguard", "review", str(CLIPPED)],
        capture_output=True,
        cwd=ROOT,
        check=False,
    )
    assert done.returncode == 1
    assert b"Verdict: hold" in done.stdout
    assert done.stderr == b""


@pytest.mark.skipif(sys.platform != "linux", reason="other systems refuse such names")
def test_a_file_name_that_is_no_text_is_reviewed(tmp_path):
    """A byte that is no UTF-8 in the path breaks no report."""
    deck = tmp_path / os.fsdecode(b"gauge\xff.cir")
    deck.write_text(DECK)
    for name in ("json", "terminal"):
        assert status(deck, "--report", name) == 1
