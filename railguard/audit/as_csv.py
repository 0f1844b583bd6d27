"""An audit as CSV (RFC 4180): one row a finding, in the ranking's order; the table to pivot on.

A design without findings has one row too. With an earlier audit to hold against, the changes
instead. Cells that a spreadsheet would run as a formula are made text with an apostrophe.
"""

import csv
import io
from collections.abc import Iterable, Iterator
from typing import IO

from railguard.audit.compare import Comparison
from railguard.audit.read import Base
from railguard.report.visible import visible

HEAD = (
    "place", "design", "circuit", "verdict", "severity", "rule", "family", "designators", "device",
    "demand", "limit", "margin", "unit", "message", "remedy", "source", "file", "line", "waived",
    "fingerprint",
)  # fmt: skip
CHANGES_HEAD = (
    "change", "design", "rule", "designators", "severity_before", "severity_now", "margin_before",
    "margin_now", "unit", "message",
)  # fmt: skip

_FORMULA = ("=", "+", "-", "@", "\t", "\r")


def pieces(base: Base, changes: Comparison | None, stream: IO[str] | None) -> Iterator[bytes]:
    """Yield the table, some rows at a time."""
    del stream
    if changes is not None:
        yield _rows([CHANGES_HEAD])
        for one in changes.changed:
            yield _rows(
                [
                    (
                        one.change, one.path, one.rule, " ".join(one.designators), one.before,
                        one.now, one.margin_before, one.margin_now, one.unit, one.message,
                    )
                ]
            )  # fmt: skip
        return
    yield _rows([HEAD])
    for design in base.ranking():
        lead = (design.place, design.path, design.circuit, design.verdict)
        found = base.findings(design.id)
        if not found:
            yield _rows([(*lead, *("",) * (len(HEAD) - len(lead)))])
            continue
        yield _rows(
            (
                *lead, f.severity, f.rule, f.family, " ".join(f.designators), f.device, f.demand,
                f.limit, f.margin, f.unit, f.message, f.remedy, f.source, f.file, f.line,
                "yes" if f.waived else "", f.fingerprint,
            )
            for f in found
        )  # fmt: skip


def _rows(rows: Iterable[tuple[object, ...]]) -> bytes:
    out = io.StringIO()
    csv.writer(out, lineterminator="\n").writerows([_cell(cell) for cell in row] for row in rows)
    return out.getvalue().encode()


def _cell(value: object) -> object:
    if not isinstance(value, str):
        return "" if value is None else value
    text = visible(value)
    return f"'{text}" if text.startswith(_FORMULA) else text
