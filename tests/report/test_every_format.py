"""What every report format must do, on every kind of design."""

import unicodedata
from pathlib import Path
from xml.etree import ElementTree as Xml

import pytest

from railguard.report.formats import FORMATS, render
from railguard.reviewing import review
from tests.report import designs

HOUSE = Path(__file__).parents[2]


def words_of(form, data):
    """Return a report's text in one line, as its reader sees it."""
    text = data.decode()
    if form == "svg":
        text = " ".join(Xml.fromstring(data).itertext()).replace("\u00a0", " ")
    return " ".join(text.replace("\\", "").split())


@pytest.mark.parametrize("form", FORMATS)
@pytest.mark.parametrize("name", designs.KINDS)
def test_a_report_is_whole_text(form, name, report):
    """UTF-8 that ends in a newline."""
    text = report(form, name).decode()
    assert text.strip()
    assert text.endswith("\n")


@pytest.mark.parametrize("form", FORMATS)
@pytest.mark.parametrize("name", ["faulty", "partly", "empty", "missing"])
def test_the_worst_finding_is_in_it(form, name, reviewed, report):
    """By the name of its rule, the first words of its message, and the netlist's name."""
    found, root = reviewed(name)
    text = words_of(form, report(form, name))
    worst = found.designs[0].findings[0]
    assert worst.rule in text
    assert " ".join(worst.message.split()[:3]).replace(str(root), "")[-20:] in text
    assert Path(found.designs[0].path).stem in text


@pytest.mark.parametrize("form", FORMATS)
def test_all_of_two_hundred_netlists_are_in_it(form, report):
    """None is lost, whatever is left to a table."""
    text = words_of(form, report(form, "many"))
    assert all(f"gauge_{number:03}" in text for number in range(designs.MANY))


@pytest.mark.parametrize("form", FORMATS)
@pytest.mark.parametrize("name", ["hostile", "partly"])
def test_nothing_steers_a_screen(form, name, report):
    """No control, format or bidirectional character leaves a netlist or a path for a report."""
    text = report(form, name).decode().removeprefix("\ufeff")
    assert {c for c in text if unicodedata.category(c)[0] == "C"} <= {"\n"}
    assert "\u2028" not in text


@pytest.mark.parametrize("form", FORMATS)
@pytest.mark.parametrize("name", ["faulty", "partly", "waived", "hostile"])
def test_a_second_review_gives_the_same_bytes(form, name, reviewed, report):
    """Nothing of the hour, of memory addresses or of the first run is in it."""
    found, root = reviewed(name)
    again = review([Path(design.path) for design in found.designs], as_of=designs.DAY)
    assert render(form, again, root=root) == report(form, name)
