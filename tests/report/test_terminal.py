"""The report on the terminal."""

import io
import re
from pathlib import Path

import pytest

from railguard.report.terminal import terminal
from railguard.reviewing import review

ROOT = Path(__file__).parents[2]
FAULTS = sorted((ROOT / "fixtures" / "faults").glob("*.cir"))


def text_of(source):
    """Return the plain text report of 80 columns."""
    return terminal(review(source), None).decode()


@pytest.mark.parametrize("path", FAULTS, ids=lambda p: p.stem)
def test_worst_finding_stands_at_the_top(path):
    """The first 24 lines hold the worst finding, a number and its remedy."""
    top = [line for line in text_of(path).splitlines() if line.strip()][:24]
    worst = review(path).designs[0].findings[0]
    shown = " ".join(" ".join(top).split())
    assert f"{worst.severity} {worst.rule}" in shown
    assert " ".join(worst.message.split()[:6]) in shown
    assert re.search(r"\d", shown)
    assert " ".join(worst.remedy.split()[:4]) in shown


@pytest.mark.parametrize("path", FAULTS, ids=lambda p: p.stem)
def test_no_line_is_wider_than_the_screen(path):
    """Everything is wrapped at 80 columns."""
    assert max(len(line) for line in text_of(path).splitlines()) <= 80


def test_plain_text_has_no_escapes():
    """In a pipe there is no colour."""
    assert "\x1b" not in text_of(FAULTS[0])


def test_verdict_and_caution_close_the_report():
    """The last words are the verdict and what the report is not."""
    text = text_of(ROOT / "fixtures" / "station" / "station.cir")
    assert "Verdict: pass." in text
    assert text.rstrip().endswith("review decide.")


def test_names_from_a_netlist_steer_nothing():
    """Control and bidirectional characters are shown, markup is text."""
    deck = (
        "station\nVIN [red]in 0 SIN(0 9 1k)\nXU1 [red]in o\u202eut vp 0 o\u202eut TL072\n"
        "RL o\u202eut 0 100\nVP vp 0 12\n.end\n"
    )
    text = text_of(deck)
    assert "\u202e" not in text
    assert "<U+202E>" in text


def test_several_files_begin_with_a_table():
    """One row a file, the held ones first."""
    names = [ROOT / "fixtures" / "station" / "station.cir", FAULTS[0]]
    lines = terminal(review(names), None).decode().splitlines()
    assert lines[0].split()[:2] == ["2", "netlists"]
    assert lines[1].split()[0] == "verdict"
    assert lines[2].split()[0] == "hold"
    assert lines[2].endswith(f"faults/{FAULTS[0].name}")
    assert lines[3].split()[0] == "pass"


def test_ascii_terminal_gets_ascii():
    """An encoding without line drawing gets other marks and spelled units."""
    out = io.TextIOWrapper(io.BytesIO(), encoding="ascii")
    terminal(review(FAULTS[0]), out)
    out.flush()
    out.buffer.seek(0)
    assert out.buffer.read().decode("ascii")
