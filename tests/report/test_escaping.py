"""Texts no one means well, in the escape of each format."""

import csv
import io
import json
import unicodedata
from xml.etree import ElementTree as Xml

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from markdown_it import MarkdownIt

from railguard.report import escaping
from railguard.report.json_text import encoded

PLAIN = ["out", "V+ rail", "10 kΩ ±1 %", "é中", ""]
HOSTILE = [
    "![x](http://gauge.example/x.png)",
    "[a](javascript:alert(1))",
    "<script>alert(1)</script>",
    "<!-- -->",
    "&lt;b&gt;",
    "`code`",
    "**bold** __bold__ *i* _i_ ~~s~~",
    "| a | b |",
    "http://gauge.example/x https://gauge.example ftp://gauge.example",
    "www.gauge.example",
    "reader@gauge.example mailto:reader@gauge.example",
    "\\[a](b) \\\\[a](b)",
    "line\nbreak\r\n# heading\n- item\n\n    code",
    "$$x$$ $`x`$",
    ":warning:",
    "[^1] [x]: http://gauge.example",
    "]]> <![CDATA[",
    "=1+1",
    "\t=1",
    "\x1b[31m\x9b31m\x07\x00\x7f",
    "\u202eabc\u2066\u200b\ufeff\ufffe\u2028",
    "\ud800",
    "{0} {{1}}",
]

texts = st.one_of(
    st.sampled_from(HOSTILE),
    st.text(max_size=40),
    st.text(alphabet="[]()<>!@#`*_~|&:/.w\\ \nhtps=+-", max_size=40),
)


unhurried = settings(deadline=None, suppress_health_check=[HealthCheck.too_slow])
"""A loaded machine is no fault of an escape."""


def tokens(text):
    """Return what a forge reads in one line of Markdown."""
    reader = MarkdownIt("gfm-like")
    reader.linkify.set({"fuzzy_link": False})
    return [i for t in reader.parse(f"- **major** {text}") for i in (t, *(t.children or ()))]


@unhurried
@given(texts)
def test_markdown_shows_the_text_and_nothing_else(text):
    """One item of one list, one emphasis of our own, and the text as it is."""
    found = tokens(escaping.markdown(text))
    kinds = [t.type for t in found if t.type not in ("text", "text_special", "inline")]
    assert kinds == [
        "bullet_list_open", "list_item_open", "paragraph_open", "strong_open", "strong_close",
        "paragraph_close", "list_item_close", "bullet_list_close",
    ]  # fmt: skip
    shown = "".join(t.content for t in found if t.type in ("text", "text_special"))
    wanted = escaping.xml(text)
    assert shown.replace("\u2060", "").split() == f"major {wanted}".split()


@unhurried
@given(texts)
def test_markdown_leaves_nothing_to_link_to(text):
    """No name, number or address stands directly behind the sign a forge looks for."""
    escaped = escaping.markdown(text)
    for sign in ("@", "#", "!"):
        behind = escaped.split(sign)[1:]
        assert not any(
            part[:1].isalnum() or part[:1] == "_"
            for part in (p.replace("&#8288;", "\u2060") for p in behind)
            if not part.startswith("8288;")
        )
    assert "://" not in escaped


@pytest.mark.parametrize("text", PLAIN)
def test_plain_text_stays_readable_in_markdown(text):
    """What means nothing to Markdown is not touched."""
    assert escaping.markdown(text) == text


@unhurried
@given(texts)
def test_markdown_in_a_table_stays_in_its_cell(text):
    """A row has as many cells as its heading, whatever stands in one."""
    row = f"| a | b |\n| --- | --- |\n| hold | {escaping.markdown(text)} |\n"
    found = MarkdownIt("gfm-like").parse(row)
    assert sum(t.type == "td_open" for t in found) == 2
    assert sum(t.type == "tr_open" for t in found) == 2


@unhurried
@given(texts)
def test_xml_is_well_formed_and_reads_back(text):
    """As an attribute and as a text, of characters that XML 1.0 has."""
    safe = escaping.xml(text)
    element = Xml.Element("testcase", name=safe)
    element.text = safe
    again = Xml.fromstring(Xml.tostring(element, encoding="utf-8"))
    assert again.get("name") == safe
    assert (again.text or "") == safe


@unhurried
@given(texts)
def test_csv_reads_back_and_is_no_formula(text):
    """One field on one line; behind the apostrophe the text is as it was."""
    out = io.StringIO()
    csv.writer(out, lineterminator="\r\n").writerow([escaping.csv_cell(text), "x"])
    assert out.getvalue().count("\n") == 1
    ((field, _),) = csv.reader(io.StringIO(out.getvalue(), newline=""), strict=True)
    assert not field.lstrip().startswith(("=", "+", "-", "@", "\uff1d"))
    assert field.removeprefix("'") == escaping.xml(text).removeprefix("'")


@unhurried
@given(texts)
def test_sarif_messages_hold_no_link_and_no_placeholder(text):
    """Brackets are no link, and braces come in pairs that a viewer shows as one."""
    safe = escaping.sarif(text)
    assert "](" not in safe
    left = safe.replace("{{", "").replace("}}", "")
    assert "{" not in left
    assert "}" not in left


@unhurried
@given(texts)
def test_no_escape_lets_a_hidden_character_through(text):
    """Nothing steers a terminal, breaks a line or turns the direction of writing."""
    for escape in (escaping.markdown, escaping.csv_cell, escaping.sarif, escaping.xml):
        assert not hidden(escape(text))


def hidden(text):
    """Return the characters of a text that have no glyph."""
    return [c for c in text if unicodedata.category(c)[0] in "CZ" and c != " "]


@unhurried
@given(texts)
def test_json_reads_back_and_steers_no_screen(text):
    """The value is the text itself; on a screen its hidden characters are escapes."""
    data = encoded({"name": text}).decode()
    assert not [c for c in hidden(data) if c != "\n"]
    wanted = text.encode("utf-8", "replace").decode()
    assert json.loads(data) == {"name": wanted}
