"""The Markdown report: what a comment shows, and how much of it."""

import re

import msgspec
import pytest
from markdown_it import MarkdownIt

from railguard.report.as_markdown import ROOM, document
from railguard.reviewing import review
from tests.report import designs

TAGS = {"h2", "h3", "p", "ul", "li", "strong", "table", "thead", "tbody", "tr", "th", "td"}
"""All a report is made of."""


def page(data):
    """Return the tokens of a report, as a forge reads it."""
    reader = MarkdownIt("gfm-like")
    reader.linkify.set({"fuzzy_link": False})
    top = reader.parse(data.decode())
    return [inner for token in top for inner in (token, *(token.children or ()))]


def text_of(data):
    """Return the text a reader of the rendered page sees."""
    return "".join(t.content for t in page(data) if t.type == "text").replace("\u2060", "")


@pytest.mark.parametrize("name", designs.KINDS)
def test_a_page_is_made_of_our_own_marks_only(name, report):
    """No link, picture, code or HTML comes of any name, comment or path."""
    tokens = page(report("markdown", name))
    assert {t.tag for t in tokens if t.tag} <= TAGS
    assert {t.type for t in tokens} & {"link_open", "image", "html_block", "html_inline"} == set()


@pytest.mark.parametrize("name", ["faulty", "partly", "waived", "empty"])
def test_every_finding_is_told(name, reviewed, report):
    """Message and remedy stand as they are, waived ones with their reason."""
    shown = text_of(report("markdown", name))
    for finding in reviewed(name)[0].designs[0].findings:
        if finding.waiver is None:
            assert finding.message in shown
            assert finding.remedy in shown
        else:
            assert finding.waiver.reason in shown


@pytest.mark.parametrize("name", ["sound", "faulty", "partly", "empty", "waived", "hostile"])
def test_the_verdict_stands_above(name, reviewed, report):
    """The first lines say what it comes to."""
    found = reviewed(name)[0].designs
    first = report("markdown", name).decode().splitlines()[0]
    wanted = found[0].verdict if len(found) == 1 else f"{len(found)} of {len(found)} netlists"
    assert wanted in first


def test_two_hundred_netlists_fit_one_comment(reviewed, report):
    """A table of all, the worst first, and the worst in full."""
    data = report("markdown", "many")
    assert len(data.decode()) <= ROOM
    rows = re.findall(
        r"^\| (hold|pass|incomplete) \|.*gauge\\_(\d{3})", data.decode(), re.MULTILINE
    )
    assert len({number for _, number in rows}) == len(rows) == designs.MANY
    verdicts = [verdict for verdict, _ in rows]
    assert verdicts == sorted(verdicts, key=("hold", "incomplete", "pass").index)
    held = sum(d.verdict == "hold" for d in reviewed("many")[0].designs)
    assert 12 < held < designs.MANY
    assert f"{held} of {designs.MANY} netlists on hold" in data.decode()
    assert data.decode().count("\n### ") == 12


def test_what_does_not_fit_is_counted():
    """A comment ends before its forge's bound, the worst first, and says what it left out."""
    found = review(designs.GAUGE.format(peak=0.5, load=600))
    design = found.designs[0]
    first = design.findings[0]
    many = tuple(
        msgspec.structs.replace(first, message=f"{first.message} Again {n}.") for n in range(500)
    )
    found = msgspec.structs.replace(
        found, designs=(msgspec.structs.replace(design, findings=many),)
    )
    shown = document(found).decode()
    assert len(shown) <= ROOM
    told = len(re.findall(r"Again \d+\.", shown))
    assert 50 < told < 500
    assert f"Left out for want of room: {500 - told} findings." in shown
    assert shown.rstrip().endswith("review decide.")


def test_a_table_too_long_is_cut():
    """Thousands of netlists do not push the findings out."""
    found = review(designs.GAUGE.format(peak=0.5, load=600))
    found = msgspec.structs.replace(found, designs=found.designs * 3000)
    shown = document(found).decode()
    assert len(shown) <= ROOM
    assert re.search(r"And \d+ netlists more, none of them worse\.", shown)
    assert "drive-current" in shown


def test_no_finding_is_shown_behind_a_worse_one_left_out():
    """Where room ends, nothing milder slips in behind."""
    found = review(designs.GAUGE.format(peak=0.5, load=600))
    design = found.designs[0]
    long = msgspec.structs.replace(design.findings[0], message="x " * ROOM)
    found = msgspec.structs.replace(
        found, designs=(msgspec.structs.replace(design, findings=(long, *design.findings[1:])),)
    )
    shown = document(found).decode()
    assert len(design.findings) > 1
    assert "- **" not in shown
    assert f"Left out for want of room: {len(design.findings)} findings." in shown
