"""The terminal's report as a picture."""

import re
from xml.etree import ElementTree as ET

import pytest

from railguard.report.formats import render
from railguard.report.terminal import terminal
from railguard.reviewing import review
from tests.report.html.test_document import FAULTY, HOSTILE, PARTLY, STATION

NAMESPACE = "{http://www.w3.org/2000/svg}"


def lines_of(picture):
    """Return the picture's text line by line, blanks left out."""
    rows = {}
    for node in ET.fromstring(picture).iter(f"{NAMESPACE}text"):
        rows.setdefault(float(node.get("y")), []).append((float(node.get("x")), node.text))
    whole = ["".join("".join(t for _, t in sorted(rows[y])).split()) for y in sorted(rows)]
    return [line for line in whole if line]


@pytest.mark.parametrize(
    "source", [STATION, FAULTY, PARTLY, "\n", HOSTILE],
    ids=["sound", "faulty", "partly", "empty", "hostile"],
)  # fmt: skip
def test_picture_says_what_the_terminal_says(source):
    """Line by line the same text, in well-formed XML."""
    found = review(source)
    text = terminal(found, None).decode()
    assert lines_of(render("svg", found)) == ["".join(x.split()) for x in text.split("\n") if x]


def test_picture_fetches_nothing_and_runs_nothing():
    """No font, no link, no script; a title for those who do not see it."""
    picture = render("svg", review(HOSTILE)).decode()
    tags = {node.tag.removeprefix(NAMESPACE) for node in ET.fromstring(picture).iter()}
    assert tags <= {"svg", "title", "style", "defs", "clipPath", "rect", "g", "text"}
    assert "title" in tags
    assert "@font-face" not in picture
    assert re.findall(r"https?://[^\"]*", picture) == ["http://www.w3.org/2000/svg"]
    assert "\u202e" not in picture


def test_picture_keeps_its_colours_where_none_are_wanted_on_screen(monkeypatch):
    """NO_COLOR speaks of terminals; a picture made by a script is the same everywhere."""
    found = review(FAULTY)
    coloured = render("svg", found)
    monkeypatch.setenv("NO_COLOR", "1")
    assert render("svg", found) == coloured
    assert b"#94195a" in coloured
