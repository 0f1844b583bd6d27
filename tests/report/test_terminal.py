"""The report on the terminal."""

import io
import re
from pathlib import Path

import pytest
from rich.cells import cell_len
from rich.console import Console

from railguard.analysis.bound import Range
from railguard.report.scale import limit_words, output_scale
from railguard.report.terminal import print_on, terminal
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


def at_width(source, width, **more):
    """Return the report in so many columns, as a terminal would get it."""
    out = io.StringIO()
    print_on(Console(file=out, width=width, highlight=False, markup=False, emoji=False, **more),
             review(source))  # fmt: skip
    return out.getvalue()


WIDTHS = (60, 72, 80, 100, 120, 160)
CASES = [
    *FAULTS[::4],
    ROOT / "fixtures" / "board" / "gauge_board.cir",
    ROOT / "nowhere.cir",
    "gauge\nXU1 " + "n" * 300 + " b vp 0 c TL072\nR1 c b 1k\nVP vp 0 5\n.end\n",
]


@pytest.mark.parametrize("source", CASES, ids=lambda p: getattr(p, "stem", "long names"))
def test_every_width_is_kept_and_used(source):
    """From 60 to 160 columns no line is wider than the screen; below 60 it is as at 60."""
    lines = {width: at_width(source, width).splitlines() for width in (40, *WIDTHS)}
    for width in WIDTHS:
        assert max(map(cell_len, lines[width])) <= width
    assert lines[40] == lines[60]
    assert len(lines[160]) <= len(lines[60])


@pytest.mark.parametrize("width", WIDTHS)
def test_numbers_stay_beside_their_units_at_every_width(width):
    """No line begins with a unit whose number ended the line before."""
    for path in FAULTS[::3]:
        for line in at_width(path, width).splitlines():
            assert not re.match(r"\s*(?:V|mV|Ω|kΩ|A|mA|Hz|kHz|%|nF|µF)(?:[ ,.;)]|$)", line), line


def test_limits_of_a_scale_are_written_without_their_kind_before_one_is_left_out():
    """At 60 columns both limits of the inputs stand over the line."""
    path = ROOT / "fixtures" / "faults" / "headroom-input.cir"
    (above,) = [line for line in at_width(path, 60).splitlines() if line.strip().startswith("0 V")]
    assert above.split() == ["0", "V", "-400", "mV", "3.1", "V", "5", "V"]


def test_a_supply_too_low_for_any_guaranteed_swing_shows_none():
    """Where the two guaranteed ends have passed each other, only the typical ones are limits."""
    deck = "x\nXU1 in out vp 0 out TL072\nVIN in 0 SIN(2 0 1k)\nVP vp 0 5\n.end\n"
    stage = review(deck).designs[0].design.stages[0]
    assert stage.output.guaranteed.low > stage.output.guaranteed.high
    scale = output_scale(stage, worst=False)
    assert scale.sure == Range()
    assert limit_words(scale, upper=False)[0].endswith("typical")
    assert limit_words(scale, upper=True)[0].endswith("typical")


def test_colour_is_a_second_cue(monkeypatch):
    """Without colour the same text stands there; NO_COLOR is obeyed."""
    colours = {"force_terminal": True, "color_system": "truecolor"}
    monkeypatch.delenv("NO_COLOR", raising=False)
    coloured = at_width(FAULTS[0], 80, **colours)
    assert "\x1b[1;35m" in coloured
    monkeypatch.setenv("NO_COLOR", "1")
    plain = at_width(FAULTS[0], 80, **colours)
    assert not re.search(r"\x1b\[[0-9;]*3[0-9]", plain)
    bare = [re.sub(r"\x1b\[[0-9;]*m", "", text) for text in (coloured, plain)]
    assert bare[0] == bare[1] == at_width(FAULTS[0], 80)


def test_two_hundred_netlists_stay_readable(tmp_path):
    """A row each, the worst first, and only the worst dozen in full."""
    text = (ROOT / "fixtures" / "faults" / "headroom-output.cir").read_text(encoding="utf-8")
    driven = (
        "x\n* railguard: kind bench\nXU1 in out vp 0 out TLV9002\n"
        "VIN in 0 SIN(2 9 1k)\nVP vp 0 5\n.end\n"
    )
    empty = "x\nV1 a 0 1\nR1 a 0 1k\n.end\n"
    paths = []
    for number in range(200):
        path = tmp_path / f"gauge{number:03}.cir"
        path.write_text(text if number == 7 else empty if number % 5 else driven)
        paths.append(path)
    lines = text_of(paths).splitlines()
    assert lines[0].startswith("200 netlists in")
    head = next(i for i, line in enumerate(lines) if line.startswith("verdict"))
    assert lines[head + 201] == ""
    order = [line.split()[0] for line in lines[head + 1 : head + 201]]
    assert order == sorted(order, key=["hold", "incomplete", "pass"].index)
    assert order.count("hold") == 41
    assert len(lines) < 700
    assert "worst 12 are shown in full" in " ".join(lines)
