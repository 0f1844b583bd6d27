"""The CSV report (RFC 4180, lines ending in LF): a line for each verdict, finding and open point.

One table, so that a spreadsheet filters it; `state` says what a line is. Numbers are plain SI
numbers, texts are never formulas. A byte order mark lets spreadsheets read the letters as UTF-8.
"""

import csv
import io
import math
from collections.abc import Iterable
from pathlib import Path

import msgspec

from railguard.report import words
from railguard.report.cases import Told, flat
from railguard.report.escaping import csv_cell
from railguard.report.places import from_root
from railguard.reviewing import DesignReview, Review

BYTE_ORDER_MARK = "\ufeff"


class Row(msgspec.Struct, frozen=True, kw_only=True):
    """One line. `state`: verdict, finding, follows, waived, or not checked."""

    netlist: str
    state: str
    rule: str = ""
    family: str = ""
    severity: str = ""
    designators: str = ""
    nets: str = ""
    demand: float | None = None
    limit: float | None = None
    margin: float | None = None
    margin_share: float | None = None
    unit: str = ""
    corner: str = ""
    basis: str = ""
    message: str = ""
    remedy: str = ""
    source: str = ""
    waiver: str = ""
    file: str = ""
    line: int | None = None
    column: int | None = None
    fingerprint: str = ""


def document(review: Review, root: Path | None = None) -> bytes:
    """Return the report as UTF-8 with a byte order mark.

    root  the run's root, from which netlists are named; None: the current folder
    """
    base = root or Path.cwd()
    out = io.StringIO()
    writer = csv.writer(out, lineterminator="\n")
    writer.writerow(Row.__struct_fields__)
    for row in _rows(review, base):
        writer.writerow([_field(getattr(row, name)) for name in Row.__struct_fields__])
    return f"{BYTE_ORDER_MARK}{out.getvalue()}".encode()


def _field(value: object) -> object:
    if isinstance(value, str):
        return csv_cell(value)
    if value is None or (isinstance(value, float) and not math.isfinite(value)):
        return ""
    return value


def _rows(review: Review, root: Path) -> Iterable[Row]:
    for design in review.designs:
        name = from_root(design.path, root)
        yield Row(netlist=name, state="verdict", message=words.verdict(design))
        for told in flat(design.findings):
            yield _finding(told, name, root)
        yield from _open(design, name)
    for told in flat(review.findings):
        yield _finding(told, "", root)


def _open(design: DesignReview, name: str) -> Iterable[Row]:
    for note in design.not_checked:
        family = note.rule.split("-", 1)[0] if "-" in note.rule else ""
        yield Row(
            netlist=name,
            state="not checked",
            rule=note.rule,
            family=family,
            designators=note.subject,
            message=note.why,
            remedy=note.add,
        )


def _finding(told: Told, name: str, root: Path) -> Row:
    finding = told.finding
    state = "waived" if finding.waiver else "follows" if told.cause else "finding"
    place = finding.location
    return Row(
        netlist=name,
        state=state,
        rule=finding.rule,
        family=finding.family,
        severity=finding.severity,
        designators=", ".join(finding.designators),
        nets=", ".join(finding.nets),
        demand=finding.demand,
        limit=finding.limit,
        margin=finding.margin,
        margin_share=finding.margin_share,
        unit=finding.unit,
        corner=finding.corner,
        basis=", ".join(finding.basis),
        message=finding.message,
        remedy=finding.remedy,
        source=finding.source,
        waiver=words.waiver(finding.waiver) if finding.waiver else "",
        file=from_root(place.file, root) if place else "",
        line=place.line if place else None,
        column=place.column if place else None,
        fingerprint=finding.fingerprint(name.encode("utf-8", "replace").decode("utf-8")),
    )
