"""The CSV report: one table, plain numbers, no formula."""

import csv
import io

import pytest

from railguard.report.as_csv import BYTE_ORDER_MARK, Row, document
from railguard.reviewing import review
from railguard.rules.finding import Finding
from tests.report import designs

NUMBERS = ("demand", "limit", "margin", "margin_share", "line", "column")


def table(data):
    """Return the rows of a report as a strict reader has them."""
    text = data.decode()
    assert text.startswith(BYTE_ORDER_MARK)
    return list(csv.DictReader(io.StringIO(text[1:], newline=""), strict=True))


@pytest.mark.parametrize("name", designs.KINDS)
def test_every_line_has_every_field(name, report):
    """As many as the heading has, on one line each."""
    data = report("csv", name)
    rows = table(data)
    assert data.endswith(b"\n")
    assert data.count(b"\n") == len(rows) + 1
    assert b"\r" not in data
    for row in rows:
        assert list(row) == list(Row.__struct_fields__)
        assert None not in row.values()


@pytest.mark.parametrize("name", designs.KINDS)
def test_states_add_up(name, reviewed, report):
    """A verdict a netlist, and every finding and open point once."""
    found = reviewed(name)[0]
    states = [row["state"] for row in table(report("csv", name))]
    assert states.count("verdict") == len(found.designs)
    assert states.count("not checked") == sum(len(d.not_checked) for d in found.designs)
    live = sum(f.waiver is None for d in found.designs for f in d.findings)
    assert states.count("finding") == live


def test_numbers_are_numbers(reviewed, report):
    """A negative margin stays one, in full precision."""
    (finding,) = reviewed("faulty")[0].designs[0].findings
    (row,) = [r for r in table(report("csv", "faulty")) if r["state"] == "finding"]
    assert float(row["margin"]) == finding.margin < 0
    assert float(row["demand"]) == finding.demand
    assert (row["rule"], row["severity"], row["unit"]) == ("headroom-output", "critical", "V")
    assert row["message"] == finding.message
    assert int(row["line"]) == finding.location.line


def test_what_was_not_worked_out_is_empty():
    """An infinite or missing number is no number."""
    rows = table(document(review(designs.PARTLY)))
    open_rows = [row for row in rows if row["state"] == "not checked"]
    assert open_rows
    assert {row[name] for row in open_rows for name in NUMBERS} == {""}


def test_waived_and_following_findings_say_so(report):
    """They can be filtered out, and they are not lost."""
    (waived,) = [r for r in table(report("csv", "waived")) if r["state"] == "waived"]
    assert waived["waiver"] == "line test only, 10 ms by hardware lead until 2027-06-30"
    assert any(r["state"] == "follows" for r in table(report("csv", "partly")))


@pytest.mark.parametrize("name", designs.KINDS)
def test_no_text_is_a_formula(name, report):
    """Only numbers of our own begin with a sign."""
    for row in table(report("csv", name)):
        for field, value in row.items():
            if field in NUMBERS:
                assert value == "" or float(value) is not None
            else:
                assert not value.lstrip().startswith(("=", "+", "-", "@", "\t", "\r"))


def test_fields_are_the_findings(report):
    """Whatever a finding holds has its column."""
    given = set(Finding.__struct_fields__)
    elsewhere = {"location", "cause", "consequences"}
    assert given - elsewhere <= set(Row.__struct_fields__)
