"""One line of the stage sheet: figures of one quantity, where they came from, and their words."""

import math

import msgspec

from railguard.report.words import USUAL_DIGITS, digits_apart
from railguard.units import si

PARTS = ("demand", "worst", "rss", "sampled", "available", "guaranteed")
"""What is given of a quantity: nominal demand; extreme values; root of squares; Monte Carlo; what
the device does typically; what its data sheet guarantees."""
HEADINGS = {
    "demand": "asked",
    "worst": "worst",
    "rss": "RSS",
    "sampled": "sampled",
    "available": "typical",
    "guaranteed": "guaranteed",
}
BASES = ("demand", "worst", "available", "guaranteed")
NEXT_TO_NOTHING = 1e-9
"""Share of the other end of a range below which a number is rounding of the solution."""


class Row(msgspec.Struct, frozen=True, kw_only=True):
    """One line of the sheet. Numbers in SI units; None: not worked out, and the basis says why.

    *_low, *_high  the two ends; a single figure stands in high
    *_basis        where the figures of that kind came from
    text           what is no number
    """

    file: str
    designator: str
    quantity: str
    unit: str = ""
    demand_low: float | None = None
    demand_high: float | None = None
    worst_low: float | None = None
    worst_high: float | None = None
    rss_low: float | None = None
    rss_high: float | None = None
    sampled_low: float | None = None
    sampled_high: float | None = None
    available_low: float | None = None
    available_high: float | None = None
    guaranteed_low: float | None = None
    guaranteed_high: float | None = None
    text: str = ""
    demand_basis: str = ""
    worst_basis: str = ""
    available_basis: str = ""
    guaranteed_basis: str = ""


def cleaned(row: Row) -> Row:
    """Write what is only rounding of the solution as zero, and no basis where there is no worst."""
    changes: dict[str, float | str] = {}
    if row.worst_low is None and row.worst_high is None:
        changes["worst_basis"] = ""
    for part in PARTS:
        low, high = getattr(row, f"{part}_low"), getattr(row, f"{part}_high")
        for name, value, other in (("low", low, high), ("high", high, low)):
            if value and other and abs(value) < NEXT_TO_NOTHING * abs(other):
                changes[f"{part}_{name}"] = 0.0
    return msgspec.structs.replace(row, **changes) if changes else row


def range_of(row: Row, part: str) -> str:
    """Return one kind of figure of a row in words: `-9 V to 9 V`, or "" where there is none."""
    low, high = getattr(row, f"{part}_low"), getattr(row, f"{part}_high")
    known = [v for v in (low, high) if v is not None and math.isfinite(v)]
    if not known:
        return ""
    ends = [si(value, row.unit, digits_of(row)) for value in known]
    return " to ".join(dict.fromkeys(ends))


def digits_of(row: Row) -> int:
    """Return the digits that tell a figure from its ends; of a range the usual ones."""
    figures = [v for v in (row.demand_high, row.available_high) if v is not None]
    ends = [v for v in (row.worst_low, row.worst_high) if v is not None]
    if row.demand_low is not None or len(ends) < len(("low", "high")) or not figures:
        return USUAL_DIGITS
    # A figure may stand beside another one, as a bandwidth beside the band.
    return max(digits_apart((*ends, figure), row.unit) for figure in figures)


def basis_of(row: Row) -> str:
    """Say where the figures of a row came from, kind by kind; a common basis once."""
    every = {part: str(getattr(row, f"{part}_basis")) for part in BASES}
    told = {part: text for part, text in every.items() if text}
    if len(told) == 1:
        return "".join(told.values())
    return "; ".join(f"{HEADINGS[part]}: {text}" for part, text in told.items())


def cells(row: Row) -> tuple[str, ...]:
    """Return a row as a page shows it: quantity, asked, worst, typical, guaranteed, basis."""
    parts = [range_of(row, part) for part in BASES]
    first = parts[0] or ("" if any(parts) else row.text)
    note = "" if first is row.text else row.text
    return (row.quantity, first, *parts[1:], "; ".join(filter(None, (note, basis_of(row)))))
