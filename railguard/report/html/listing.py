"""The netlist with the findings beside their lines."""

from collections.abc import Iterable, Iterator, Mapping
from typing import TYPE_CHECKING

import msgspec

from railguard.deck.lines import physical_lines
from railguard.location import Location
from railguard.reviewing import DesignReview

if TYPE_CHECKING:
    from railguard.report.html.view import FindingView, StageView

WHOLE_LINES = 3000
"""A file of more lines is shown round its findings only."""

NEAR = 4
"""Lines shown before and after a finding of such a file."""

LONGEST_LINE = 500


class Places(msgspec.Struct, frozen=True):
    """Where lines stand on the page: the anchor's beginning by file, of one deck."""

    deck: str
    files: Mapping[str, str]

    def anchor(self, location: Location | None) -> str:
        """Return the anchor of a place, or "" where its line is not shown."""
        if location is None or location.file not in self.files:
            return ""
        return f"{self.files[location.file]}-{location.line}"


class Row(msgspec.Struct, frozen=True, kw_only=True):
    """One line. `number` 0 stands for lines that are left out, and `text` says how many."""

    number: int
    text: str
    anchor: str = ""
    comment: bool = False
    findings: tuple["FindingView", ...] = ()


class Listing(msgspec.Struct, frozen=True):
    """One file."""

    file: str
    rows: tuple[Row, ...]


def listings(
    review: DesignReview, subjects: "Iterable[StageView]", places: Places
) -> tuple[Listing, ...]:
    """Return every file of a deck, the main one first."""
    at: dict[str, list[FindingView]] = {}
    for subject in subjects:
        for finding in _all(subject.findings):
            if finding.anchor:
                at.setdefault(finding.anchor, []).append(finding)
    return tuple(
        Listing(file, tuple(_rows(text, places.files[file], at)))
        for file, text in review.design.circuit.texts.items()
        if file in places.files
    )


def _all(findings: "Iterable[FindingView]") -> "Iterator[FindingView]":
    for finding in findings:
        yield finding
        yield from _all(finding.consequences)


def _rows(text: str, start: str, at: "Mapping[str, list[FindingView]]") -> Iterator[Row]:
    lines = physical_lines(text)
    while lines and not lines[-1].strip():
        lines.pop()
    found = {number: at.get(f"{start}-{number}") for number in range(1, len(lines) + 1)}
    shown = set(found)
    if len(lines) > WHOLE_LINES:
        marked = [number for number, findings in found.items() if findings]
        shown = {n for m in marked for n in range(m - NEAR, m + NEAR + 1)} & shown
    left = 0
    for number, line in enumerate(lines, 1):
        if number not in shown:
            left += 1
            continue
        if left:
            yield _gap(left)
            left = 0
        yield Row(
            number=number,
            text=_cut(line),
            anchor=f"{start}-{number}",
            comment=line.lstrip().startswith("*"),
            findings=tuple(found[number] or ()),
        )
    if left:
        yield _gap(left)


def _gap(count: int) -> Row:
    return Row(number=0, text=f"{count} line{'s' if count > 1 else ''} without a finding")


def _cut(line: str) -> str:
    line = line.replace("\t", "    ")
    if len(line) <= LONGEST_LINE:
        return line
    return f"{line[:LONGEST_LINE]} ... ({len(line)} characters)"
