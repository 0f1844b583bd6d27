"""What changed between two audits: findings that are new, gone or worse.

A finding is the same one where its fingerprint is: rule, designators, nets and the deck's path.
"""

import sqlite3
from pathlib import Path
from typing import Literal
from urllib.parse import quote

import msgspec

from railguard.audit.read import Base
from railguard.words import SEVERITIES, Severity

Change = Literal["new", "gone", "worse", "better"]

SMALLEST = 0.01
"""Share of a margin by which it must have moved to count: less is the rounding of a value."""


class Changed(msgspec.Struct, frozen=True, kw_only=True):
    """One finding that changed.

    before, now  severity; None where the finding was not, or is not, there
    design       "new" or "gone" where the whole design is; else ""
    """

    change: Change
    path: str
    rule: str
    designators: list[str]
    before: Severity | None
    now: Severity | None
    margin_before: float | None
    margin_now: float | None
    unit: str
    message: str
    design: Literal["new", "gone", ""]


class Comparison(msgspec.Struct, frozen=True, kw_only=True):
    """Two audits side by side.

    designs_new, designs_gone  paths
    build_before               the railguard of the earlier one
    """

    older: str
    build_before: str
    designs_new: list[str]
    designs_gone: list[str]
    changed: list[Changed]

    def of(self, change: Change) -> list[Changed]:
        """Return the findings that changed in one way."""
        return [one for one in self.changed if one.change == change]


def compare(newer: Path, older: Path) -> Comparison:
    """Compare two audits.

    Raises UsageError: one of them is no audit's file.
    """
    with Base(newer), Base(older) as earlier:
        build = earlier.about("build")
    base = sqlite3.connect(f"file:{quote(str(newer))}?mode=ro", uri=True)
    try:
        base.execute("ATTACH ? AS older", (f"file:{quote(str(older))}?mode=ro",))
        for name in ("main", "older"):
            base.execute(_VIEW.format(name=name))
            base.execute(f"CREATE INDEX temp.{name}_mark ON {name}_live (mark, nth)")
        return Comparison(
            older=older.name,
            build_before=build,
            designs_new=_paths(base, "main", "older"),
            designs_gone=_paths(base, "older", "main"),
            changed=_changed(base),
        )
    finally:
        base.close()


_VIEW = """
CREATE TEMP TABLE {name}_live AS
SELECT fingerprint AS mark, file.path AS path, rule, designators, severity, margin, unit, message,
       ROW_NUMBER() OVER (PARTITION BY fingerprint ORDER BY number) AS nth
FROM {name}.finding JOIN {name}.file ON file.id = finding.file
WHERE state = 'design' AND NOT included AND NOT waived
"""

_BOTH = """
SELECT now.path, now.rule, now.designators, was.severity, now.severity, was.margin, now.margin,
       now.unit, now.message
FROM main_live AS now JOIN older_live AS was USING (mark, nth)
WHERE was.severity <> now.severity OR was.margin IS NOT now.margin
ORDER BY now.path, now.rule, now.designators
"""

_ONE = """
SELECT path, rule, designators, severity, margin, unit, message FROM {here}_live AS here
WHERE NOT EXISTS (SELECT 1 FROM {there}_live AS there
                  WHERE there.mark = here.mark AND there.nth = here.nth)
ORDER BY path, rule, designators
"""


def _paths(base: sqlite3.Connection, here: str, there: str) -> list[str]:
    rows = base.execute(
        f"SELECT path FROM {here}.file WHERE state = 'design' AND NOT included AND path NOT IN"
        f" (SELECT path FROM {there}.file WHERE state = 'design' AND NOT included) ORDER BY path"
    )
    return [str(row[0]) for row in rows]


def _changed(base: sqlite3.Connection) -> list[Changed]:
    found: list[Changed] = []
    for change, here, there in (("new", "main", "older"), ("gone", "older", "main")):
        whole = set(_paths(base, here, there))
        for path, rule, designators, severity, margin, unit, message in base.execute(
            _ONE.format(here=here, there=there)
        ):
            fresh = change == "new"
            found.append(
                Changed(
                    change="new" if fresh else "gone",
                    path=path,
                    rule=rule,
                    designators=msgspec.json.decode(designators),
                    before=None if fresh else severity,
                    now=severity if fresh else None,
                    margin_before=None if fresh else margin,
                    margin_now=margin if fresh else None,
                    unit=unit,
                    message=message,
                    design=("new" if fresh else "gone") if path in whole else "",
                )
            )
    for path, rule, designators, was, now, before, margin, unit, message in base.execute(_BOTH):
        change_ = _direction(was, now, before, margin)
        if change_ is not None:
            found.append(
                Changed(
                    change=change_,
                    path=path,
                    rule=rule,
                    designators=msgspec.json.decode(designators),
                    before=was,
                    now=now,
                    margin_before=before,
                    margin_now=margin,
                    unit=unit,
                    message=message,
                    design="",
                )
            )
    return sorted(found, key=_order)


def _direction(
    was: Severity, now: Severity, before: float | None, margin: float | None
) -> Change | None:
    step = SEVERITIES.index(now) - SEVERITIES.index(was)
    if step:
        return "worse" if step < 0 else "better"
    if before is None or margin is None or abs(margin - before) <= SMALLEST * abs(before):
        return None
    return "worse" if margin < before else "better"


_CHANGES: tuple[Change, ...] = ("new", "worse", "gone", "better")


def _order(one: Changed) -> tuple[object, ...]:
    severity = one.now or one.before or "remark"
    return (_CHANGES.index(one.change), SEVERITIES.index(severity), one.path, one.rule, one.message)
