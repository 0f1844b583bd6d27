"""What an audit's file says, query by query; nothing here changes it.

Designs come one by one, so that a report on millions of them needs no more memory than on one.
"""

import json
import sqlite3
from collections.abc import Iterator
from pathlib import Path
from types import TracebackType
from urllib.parse import quote

import msgspec

from railguard.audit.store import FORMAT
from railguard.errors import UsageError
from railguard.words import Family, Severity, Verdict

RANKING = """
    CASE verdict WHEN 'hold' THEN 0 WHEN 'incomplete' THEN 1 ELSE 2 END,
    critical DESC, major DESC, minor DESC, remark DESC, open DESC, path
"""
"""Worst first. The counts themselves, severity by severity: no score is made up from them."""

DESIGNS = "state = 'design' AND NOT included"


class Kept(msgspec.Struct, frozen=True, kw_only=True):
    """A finding as it was kept; the fields are those of `rules.finding.Finding`.

    follows  number of the finding of the same design it follows from, or None
    """

    number: int
    follows: int | None
    rule: str
    family: Family
    severity: Severity
    designators: list[str]
    nets: list[str]
    device: str
    demand: float | None
    limit: float | None
    margin: float | None
    margin_share: float | None
    unit: str
    message: str
    remedy: str
    source: str
    file: str
    line: int | None
    fingerprint: str
    waived: bool


class Ranked(msgspec.Struct, frozen=True, kw_only=True):
    """A design in its place.

    path      its deck
    circuit   the netlist the deck includes and runs analyses on, or ""
    copies    decks with the same content
    """

    id: int
    place: int
    path: str
    circuit: str
    title: str
    kind: str
    verdict: Verdict
    critical: int
    major: int
    minor: int
    remark: int
    judged: int
    open: int
    stages: int
    sha256: str


class Row(msgspec.Struct, frozen=True):
    """One line of a table of counts."""

    name: str
    designs: int
    findings: int
    detail: str = ""


def _no_audit(place: Path) -> UsageError:
    return UsageError(
        f"{place} is no audit's file.", remedy="Make one: railguard audit ROOT --to FILE."
    )


class Base:
    """An audit's file, opened for reading."""

    def __init__(self, place: Path) -> None:
        """Open it.

        Raises UsageError: it is no audit's file, or one of another format.
        """
        self._place = place
        try:
            self._base = sqlite3.connect(f"file:{quote(str(place))}?mode=ro", uri=True)
        except sqlite3.Error as error:
            raise _no_audit(place) from error
        try:
            format_ = self.about("format")
        except sqlite3.Error as error:
            self._base.close()
            raise _no_audit(place) from error
        if format_ != FORMAT:
            self._base.close()
            raise UsageError(
                f"{place} was written in the format {format_ or '(none)'}, not {FORMAT}.",
                remedy="Audit again with this railguard.",
            )

    def __enter__(self) -> "Base":
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None,
        trace: TracebackType | None,
    ) -> None:  # fmt: skip
        self._base.close()

    def about(self, name: str) -> str:
        """Return what is noted of the run under a name, or ""."""
        row = self._base.execute("SELECT value FROM about WHERE name = ?", (name,)).fetchone()
        return str(row[0]) if row else ""

    @property
    def finished(self) -> bool:
        """Tell whether the last run met every file."""
        return self.about("finished") == "yes"

    def count(self, where: str = DESIGNS) -> int:
        """Count files; `where` is one of this module's own conditions."""
        return int(self._one(f"SELECT COUNT(*) FROM file WHERE {where}"))

    def verdicts(self) -> dict[str, int]:
        """Count designs by verdict."""
        rows = self._base.execute(
            f"SELECT verdict, COUNT(*) FROM file WHERE {DESIGNS} GROUP BY verdict ORDER BY verdict"
        )
        return {str(verdict): int(count) for verdict, count in rows}

    def ranking(self, most: int = -1) -> Iterator[Ranked]:
        """Yield designs, worst first."""
        rows = self._base.execute(
            "SELECT id, path, circuit, title, kind, verdict, critical, major, minor, remark,"
            f" judged, open, stages, sha256 FROM file WHERE {DESIGNS} ORDER BY {RANKING} LIMIT ?",
            (most,),
        )
        names = [name for name in Ranked.__struct_fields__ if name != "place"]
        for place, row in enumerate(rows, start=1):
            yield Ranked(place=place, **dict(zip(names, row, strict=True)))

    def findings(self, design: int) -> list[Kept]:
        """Return a design's findings, worst first, what follows behind each."""
        rows = self._base.execute(
            "SELECT number, parent, rule, family, severity, designators, nets, device, demand,"
            " bound, margin, margin_share, unit, message, remedy, source, place, line, fingerprint,"
            " waived FROM finding WHERE file = ? ORDER BY number",
            (design,),
        )
        return [
            Kept(
                number=row[0],
                follows=None if row[1] < 0 else row[1],
                designators=json.loads(row[5]),
                nets=json.loads(row[6]),
                waived=bool(row[19]),
                **dict(zip(_PLAIN, (*row[2:5], *row[7:19]), strict=True)),
            )
            for row in rows
        ]

    def left_open(self, design: int) -> dict[str, int]:
        """Return by rule how many subjects of a design stayed open."""
        rows = self._base.execute(
            "SELECT rule, count FROM left_open WHERE file = ? ORDER BY rule", (design,)
        )
        return {str(rule): int(count) for rule, count in rows}

    def by_family(self) -> list[Row]:
        """Count live findings by family and device: which kinds of mistake with which op-amp."""
        return self._rows(
            "SELECT family, COUNT(DISTINCT file), COUNT(*), device FROM finding JOIN file"
            f" ON file.id = finding.file WHERE {DESIGNS} AND parent < 0 AND NOT waived"
            " AND severity <> 'remark' GROUP BY family, device ORDER BY 3 DESC, family, device"
        )

    def unknown(self) -> list[Row]:
        """Return devices nobody knows, the one most designs name first."""
        return self._rows(
            "SELECT name, COUNT(DISTINCT file), COUNT(*),"
            " CASE MAX(pins) WHEN 0 THEN 'wired as an op-amp' ELSE MAX(pins) || ' pins' END"
            " || CASE MAX(nearest) WHEN '' THEN ''"
            " ELSE ', nearest ' || MAX(nearest) END"
            f" FROM unknown JOIN file ON file.id = unknown.file WHERE {DESIGNS}"
            " GROUP BY name ORDER BY 2 DESC, 3 DESC, name"
        )

    def not_read(self) -> Iterator[tuple[str, str, str]]:
        """Yield (path, state, reason) of files that gave no review, by path."""
        yield from self._base.execute(
            "SELECT path, state, why FROM file WHERE state IN ('unreadable', 'stopped', 'passed')"
            " OR (state = 'archive' AND why <> '') ORDER BY path"
        )

    def reasons(self) -> list[Row]:
        """Count files that gave no review by reason, most frequent first."""
        return self._rows(
            "SELECT why, COUNT(*), 0, MIN(path) FROM file WHERE state IN"
            " ('unreadable', 'stopped', 'passed') GROUP BY why ORDER BY 2 DESC, why"
        )

    def settings_seen(self) -> list[str]:
        """Return the settings files below the roots."""
        return [
            str(row[0]) for row in self._base.execute("SELECT path FROM settings ORDER BY path")
        ]

    def copies(self) -> list[Row]:
        """Return contents that stand in several designs: (first path, designs, 0, others)."""
        return self._rows(
            f"SELECT MIN(path), COUNT(*), 0, '' FROM file WHERE {DESIGNS} AND sha256 <> ''"
            " GROUP BY sha256 HAVING COUNT(*) > 1 ORDER BY 2 DESC, 1"
        )

    def _rows(self, query: str) -> list[Row]:
        return [Row(str(r[0]), int(r[1]), int(r[2]), str(r[3])) for r in self._base.execute(query)]

    def _one(self, query: str) -> int:
        return int(self._base.execute(query).fetchone()[0])


_PLAIN = (
    "rule", "family", "severity", "device", "demand", "limit", "margin", "margin_share", "unit",
    "message", "remedy", "source", "file", "line", "fingerprint",
)  # fmt: skip
