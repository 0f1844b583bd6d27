"""The stage sheet written down: CSV, JSON, Markdown, and the screen.

Text that came from a netlist is shown as it is, and steers neither a terminal nor a spreadsheet.
"""

import csv
import io
import math
from collections.abc import Iterator
from itertools import groupby

import msgspec
from rich.console import Console
from rich.text import Text

from railguard import __version__
from railguard.report.escaping import csv_cell, markdown
from railguard.report.json_text import encoded
from railguard.report.sheet_row import HEADINGS, PARTS, Row, basis_of, digits_of, range_of
from railguard.report.visible import encodable, visible
from railguard.report.wrapping import wrapped
from railguard.units import si

SCHEMA = "railguard-sheet/1"
_LABEL, _CELL = 22, 11
"""Columns on the screen; five cells and a label stay within 80."""


def as_csv(sheet: tuple[Row, ...]) -> bytes:
    """Return the sheet as CSV (RFC 4180); what a spreadsheet takes for a formula is quoted."""
    out = io.StringIO()
    writer = csv.writer(out, lineterminator="\n")
    writer.writerow(Row.__struct_fields__)
    for row in sheet:
        writer.writerow([_plain(getattr(row, name)) for name in Row.__struct_fields__])
    return out.getvalue().encode()


def _plain(value: object) -> object:
    if isinstance(value, str):
        return csv_cell(value)
    if value is None or (isinstance(value, float) and not math.isfinite(value)):
        return ""
    return value


def as_json(sheet: tuple[Row, ...]) -> bytes:
    """Return the sheet as JSON: the schema's name, the tool, and all rows with null for None."""
    document = {
        "schema": SCHEMA,
        "tool": {"name": "railguard", "version": __version__},
        "rows": [msgspec.to_builtins(row) for row in sheet],
    }
    return encoded(document)


def as_markdown(sheet: tuple[Row, ...]) -> bytes:
    """Return the sheet as Markdown: what each deck is, then a table a stage."""
    shown = _shown(sheet)
    lines: list[str] = []
    for (file, designator), rows in groupby(sheet, key=lambda row: (row.file, row.designator)):
        if not designator:
            lines += ["", f"## {markdown(file)}", ""]
            lines += [f"- {row.quantity}: {markdown(row.text)}" for row in rows]
            continue
        lines += ["", f"### {markdown(designator)}", ""]
        headings = ("quantity", *(HEADINGS[part] for part in shown), "note", "basis")
        lines.append(f"| {' | '.join(headings)} |")
        lines.append("|" + " --- |" * len(headings))
        for row in rows:
            cells = (
                row.quantity,
                *(range_of(row, part) for part in shown),
                row.text,
                basis_of(row),
            )
            lines.append(f"| {' | '.join(markdown(cell) for cell in cells)} |")
    return ("\n".join(lines).lstrip("\n") + "\n").encode()


def _shown(sheet: tuple[Row, ...]) -> tuple[str, ...]:
    """Return the kinds of figures some row has; samples are drawn on request only."""
    return tuple(
        part
        for part in PARTS
        if part != "sampled" or any(row.sampled_high is not None for row in sheet)
    )


def screen(sheet: tuple[Row, ...], console: Console) -> None:
    """Print the sheet within 80 columns: both ends of a range in lines of their own."""
    encoding = getattr(console.file, "encoding", None) or "utf-8"
    shown = _shown(sheet)
    width = min(max(console.width, 60), 110)
    first = True
    for (file, designator), rows in groupby(sheet, key=lambda row: (row.file, row.designator)):
        if not first:
            console.print()
        first = False
        kept = tuple(rows)
        lines = _deck(file, kept, width) if not designator else _stage(kept, shown, width)
        for text, style in lines:
            console.print(Text(encodable(visible(text), encoding), style=style), soft_wrap=True)


def _deck(file: str, rows: tuple[Row, ...], width: int) -> Iterator[tuple[str, str]]:
    yield file, "bold"
    for row in rows[1:]:
        yield from _hung(f"  {row.quantity:<12}", row.text, width)
    yield from _hung("  sha256      ", rows[0].text.rpartition(" ")[2], width)


def _stage(rows: tuple[Row, ...], shown: tuple[str, ...], width: int) -> Iterator[tuple[str, str]]:
    yield rows[0].designator, "bold"
    heads = "".join(f"{HEADINGS[part]:>{_CELL}}" for part in shown)
    yield f"{'':{_LABEL}}{heads}", "dim"
    for row in rows:
        numbers = list(_number_lines(row, shown))
        for label, cells in numbers:
            yield f"{label:<{_LABEL}}{''.join(f'{cell:>{_CELL}}' for cell in cells)}", ""
        if not numbers:
            yield from _hung(f"{row.quantity:<{_LABEL}}", row.text or "not worked out", width)
        elif row.text:
            yield from _hung("  ", row.text, width)
        told = basis_of(row)
        if told:
            yield from _hung("  ", told, width, "dim")


def _number_lines(row: Row, shown: tuple[str, ...]) -> Iterator[tuple[str, tuple[str, ...]]]:
    """Yield the high and the low end of a row as cells; one line where they read alike."""
    ends = {
        end: tuple(_cell(getattr(row, f"{part}_{end}"), row.unit, digits_of(row)) for part in shown)
        for end in ("high", "low")
    }
    alike = all(low in ("", high) for low, high in zip(ends["low"], ends["high"], strict=True))
    if alike:
        if any(ends["high"]):
            yield row.quantity, ends["high"]
        return
    yield f"{row.quantity}, high", ends["high"]
    yield f"{row.quantity}, low", ends["low"]


def _cell(value: float | None, unit: str, digits: int) -> str:
    return "" if value is None or not math.isfinite(value) else si(value, unit, digits)


def _hung(head: str, text: str, width: int, style: str = "") -> Iterator[tuple[str, str]]:
    """Yield a text with a head before its first line and blanks before the others."""
    for index, line in enumerate(wrapped(visible(text), width - len(head))):
        yield f"{head if index == 0 else ' ' * len(head)}{line}", style
