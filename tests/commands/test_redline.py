"""`railguard redline`: the diff applies, the new file is written, the original never."""

import json
import shutil
import subprocess
from pathlib import Path

import pytest
from click.testing import CliRunner

from railguard.commands.main import railguard
from railguard.reviewing import review

FAULTS = Path(__file__).parents[2] / "fixtures" / "faults"


def run(*arguments):
    """Run the command line as a user does."""
    return CliRunner().invoke(railguard, ["redline", *map(str, arguments)])


@pytest.fixture
def deck(tmp_path):
    """A faulty deck in a folder of its own."""
    place = tmp_path / "shifter.cir"
    shutil.copy(FAULTS / "headroom-output.cir", place)
    return place


def test_screen_names_change_cure_and_outcome(deck):
    """The whole answer stands on one screen."""
    result = run(deck)
    assert result.exit_code == 0
    for words in ("R24 = ", "Cures headroom-output of XU5A (critical)", "+R24", "none new",
                  "@@ headroom-output: R24", "Verdict: pass"):  # fmt: skip
        assert words in result.output


def test_diff_is_taken_by_patch(deck, tmp_path):
    """The bare diff makes the file that --write saves, byte for byte."""
    new = tmp_path / "new.cir"
    assert run(deck, "--write", new).exit_code == 0
    diff = run(deck, "--as", "diff").stdout_bytes
    if shutil.which("patch") is None:
        pytest.skip("patch is not installed")
    done = subprocess.run(
        ["patch", "--binary", "-o", "-", str(deck)], input=diff, capture_output=True, check=True
    )
    assert done.stdout == new.read_bytes()
    assert review(new, plugins=False).designs[0].verdict == "pass"


def test_windows_line_ends_survive_the_diff(tmp_path):
    """A deck of CRLF lines is patched by a diff of CRLF lines."""
    deck, new = tmp_path / "crlf.cir", tmp_path / "new.cir"
    text = (FAULTS / "headroom-output.cir").read_bytes().replace(b"\n", b"\r\n")
    deck.write_bytes(text)
    assert run(deck, "--write", new).exit_code == 0
    assert new.read_bytes().count(b"\r\n") == text.count(b"\r\n")
    assert b"\n" not in new.read_bytes().replace(b"\r\n", b"")


@pytest.mark.parametrize("way", ["same", "link", "dotted"])
def test_the_original_is_never_written_over(deck, tmp_path, way):
    """Neither by its name nor by another way to it."""
    before = deck.read_bytes()
    target = {"same": deck, "dotted": tmp_path / "." / "x" / ".." / deck.name}.get(way)
    (tmp_path / "x").mkdir()
    if way == "link":
        target = tmp_path / "link.cir"
        target.symlink_to(deck)
    result = run(deck, "--write", target)
    assert result.exit_code != 0
    assert "not written over" in str(result.exception)
    assert deck.read_bytes() == before


def test_a_changed_include_needs_another_folder(tmp_path):
    """Beside the original the included file would be written over."""
    folder = tmp_path / "old"
    folder.mkdir()
    deck, inner = folder / "main.cir", folder / "stage.inc"
    body = (FAULTS / "headroom-output.cir").read_text()
    moved = "R24    n6     o6     51k\n"
    deck.write_text(body.replace(moved, ".include stage.inc\n"))
    inner.write_text("* feedback\n" + moved)
    assert "written over" in str(run(deck, "--write", folder / "new.cir").exception)
    new = tmp_path / "new" / "main.cir"
    assert run(deck, "--write", new).exit_code == 0
    assert inner.read_text().endswith(moved)
    assert review(new, plugins=False).designs[0].verdict == "pass"


def test_json_holds_edits_by_place(deck):
    """Everything on the screen, for programs."""
    found = json.loads(run(deck, "--as", "json").stdout_bytes)
    (proposal,) = found["proposals"]
    assert proposal["finding"]["rule"] == "headroom-output"
    assert proposal["edits"][0]["line"] == 74
    assert found["diff"].startswith("--- ")


def test_what_stays_gives_the_status():
    """A finding no card cures still stops a build, and devices are named."""
    result = run(FAULTS / "supply-range.cir")
    assert result.exit_code == 1
    assert "Not by a card" in result.output
    assert "most alike first" in result.output


def test_a_missing_file_is_no_redline(tmp_path):
    """It says so and proposes nothing."""
    result = run(tmp_path / "none.cir")
    assert result.exit_code == 1
    assert "Nothing can be proposed" in result.output
