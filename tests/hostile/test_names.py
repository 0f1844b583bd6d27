"""Names and settings no one means well, through the commands themselves."""

import os
import subprocess
import sys
import unicodedata
from pathlib import Path

import pytest

from tests.report import designs

HOUSE = Path(__file__).parents[2]
POSIX = pytest.mark.skipif(sys.platform != "linux", reason="other systems refuse such names")


def said(folder, *arguments):
    """Run railguard in a folder and return all it prints."""
    done = subprocess.run(
        [sys.executable, "-m", "railguard", *map(os.fsencode, arguments)],
        cwd=folder,
        env={**os.environ, "PYTHONPATH": str(HOUSE), "PYTHONUTF8": "1", "COLUMNS": "100"},
        stdin=subprocess.DEVNULL,
        capture_output=True,
        check=False,
    )
    assert b"Traceback" not in done.stderr
    return done.returncode, done.stdout.decode(), done.stderr.decode()


def steering(text):
    """Return the characters of a text that would steer a screen."""
    return {c for c in text if unicodedata.category(c) in ("Cc", "Cf", "Zl", "Zp")} - {"\n"}


@POSIX
@pytest.mark.parametrize(
    "command",
    [["review"], ["review", "--report", "csv"], ["sheet"], ["sheet", "--as", "markdown"],
     ["sheet", "--as", "json"], ["sheet", "--as", "csv"]],
    ids=" ".join,
)  # fmt: skip
def test_commands_steer_no_screen(tmp_path, command):
    """Whatever stands in a netlist and in its path."""
    names = [str(path) for path in designs.paths("hostile", tmp_path)]
    _, out, err = said(tmp_path, *command, *names)
    assert out
    assert steering(out.removeprefix("\ufeff")) == set()
    assert steering(err) == set()


@POSIX
@pytest.mark.parametrize("how", ["screen", "json"])
def test_a_redline_steers_no_screen(tmp_path, how):
    """Nor does what is proposed for such a netlist."""
    for path in designs.paths("hostile", tmp_path):
        _, out, err = said(tmp_path, "redline", "--as", how, str(path))
        assert out
        assert steering(out) == set()
        assert steering(err) == set()


@POSIX
@pytest.mark.parametrize("form", ["terminal", "html", "csv", "json"])
def test_an_archive_of_such_netlists_steers_no_screen(tmp_path, form):
    """Titles, nets and names come back out of the audit's file."""
    (tmp_path / "share").mkdir()
    designs.paths("hostile", tmp_path / "share")
    said(tmp_path, "audit", "share", "--to", "a.sqlite", "--workers", "1")
    status, out, err = said(tmp_path, "audit", "report", "a.sqlite", "--as", form)
    assert status == 0, err
    assert "design" in out
    assert steering(out.removeprefix("\ufeff")) == set()


@POSIX
@pytest.mark.parametrize(
    "text",
    [
        '"\\u001B[31mred" = 1\n',
        '[nets]\n"o\\u202Eut" = { wolts = 1 }\n',
        '[[waivers]]\nrule = "\\u001B]0;t\\u0007"\nreason = "x"\n',
        '[nets]\n"a" = { volts = "\\u009B31m" }\n',
        "\x1b[31m = 1\n",
    ],
    ids=["field", "net", "rule", "value", "no TOML"],
)
def test_a_settings_file_steers_no_screen(tmp_path, text):
    """What it says wrong is quoted, and its hidden characters are written out."""
    (tmp_path / "gauge.cir").write_text(designs.GAUGE.format(peak=0.1, load=10_000))
    (tmp_path / "railguard.toml").write_text(text)
    status, out, err = said(tmp_path, "review", "gauge.cir")
    assert status == 2
    assert out == ""
    assert err.startswith("railguard: ")
    assert steering(err) == set()


@POSIX
def test_a_folder_of_any_name_is_audited(tmp_path):
    """The archive's report takes it too."""
    folder = tmp_path / os.fsdecode(b"boards\xff\x1b[31m")
    folder.mkdir()
    (folder / os.fsdecode(b"a\xffb.cir")).write_text(designs.GAUGE.format(peak=0.5, load=600))
    _, out, err = said(tmp_path, "audit", str(folder))
    assert steering(out + err) == set()


@POSIX
@pytest.mark.parametrize("name", [b"a\nb.cir", b"\x1b[2J.cir", b"\xff.cir", "\u202e.cir".encode()])
def test_a_report_of_a_netlist_of_any_name_is_written(tmp_path, name):
    """Every format takes a name that is no text, or that would steer a screen."""
    from railguard.report.formats import FORMATS

    deck = tmp_path / os.fsdecode(name)
    deck.write_text(designs.GAUGE.format(peak=0.5, load=600))
    reports = [f"--report={form}={form}.out" for form in FORMATS]
    assert said(tmp_path, "review", *reports, os.fsdecode(name)) == (1, "", "")
    for form in FORMATS:
        text = (tmp_path / f"{form}.out").read_bytes().decode().removeprefix("\ufeff")
        assert steering(text) == set()
