"""The SQLite file an audit writes as it goes, so that it can be killed at any moment.

Write-ahead log, a commit at least every 100 files or 2 seconds: at most those are done again. A
run that was not finished is gone on with; the next one after that counts as a new run.
"""

import json
import os
import sqlite3
import time
from collections import Counter
from collections.abc import Iterable
from contextlib import ExitStack, closing
from importlib.resources import files
from pathlib import Path
from types import TracebackType

from railguard.audit.lock import lock
from railguard.audit.wire import Found, Outcome
from railguard.errors import UsageError
from railguard.words import SEVERITIES

FILES_A_COMMIT = 100
SECONDS_A_COMMIT = 2.0
FORMAT = "railguard-audit/1"

_TABLES = ("finding", "unknown", "left_open", "include")


class Store:
    """An audit's results, open for writing by this process alone."""

    def __init__(self, place: Path) -> None:
        """Open or make the file.

        Raises UsageError: it cannot be opened, is no audit, or another audit is writing it.
        """
        self._lock = _locked(place)
        try:
            self._base = _connected(place)
        except UsageError:
            os.close(self._lock)
            raise
        self._uncommitted = 0
        self._last = time.monotonic()
        finished = self.about("finished")
        self.run = int(self.about("run") or 0)
        if finished != "no":
            self.run += 1
        self.resumed = finished == "no"
        self.tell(run=str(self.run), finished="no", format=FORMAT)
        self.commit()

    def __enter__(self) -> "Store":
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None,
        trace: TracebackType | None,
    ) -> None:  # fmt: skip
        self.commit()
        self._base.close()
        os.close(self._lock)

    def about(self, name: str) -> str:
        """Return what is noted of the run under a name, or ""."""
        row = self._base.execute("SELECT value FROM about WHERE name = ?", (name,)).fetchone()
        return str(row[0]) if row else ""

    def tell(self, **values: str) -> None:
        """Note something of the run."""
        self._base.executemany("INSERT OR REPLACE INTO about VALUES (?, ?)", values.items())

    def known(self, path: str) -> str:
        """Return the key of a file's last result, or ""."""
        row = self._base.execute("SELECT key FROM file WHERE path = ?", (path,)).fetchone()
        return str(row[0]) if row else ""

    def take(self, outcome: Outcome, path: str, includes: Iterable[str]) -> None:
        """Keep one file's outcome; commit where it is time.

        path, includes  as they are listed: with the root's label
        """
        if outcome.state == "same":
            self._base.execute("UPDATE file SET run = ? WHERE path = ?", (self.run, path))
        elif outcome.state != "other":
            self._replace(outcome, path, includes)
        self._uncommitted += 1
        self.commit_in_time()

    def saw_settings(self, path: str) -> None:
        """Note a settings file below a root."""
        self._base.execute("INSERT OR REPLACE INTO settings VALUES (?, ?)", (path, self.run))

    def commit_in_time(self) -> None:
        """Commit where a hundred files or two seconds have gathered."""
        late = time.monotonic() - self._last >= SECONDS_A_COMMIT
        if self._uncommitted >= FILES_A_COMMIT or (late and self._uncommitted):
            self.commit()

    def commit(self) -> None:
        """Make everything so far last."""
        self._base.commit()
        self._uncommitted = 0
        self._last = time.monotonic()

    def finish(self) -> None:
        """Close a run that has met every file: forget what is gone, and settle who includes whom.

        A netlist that another deck includes is no design of its own. Where two include each other
        the first by name stands for both.
        """
        run = self._base.execute
        gone = "SELECT id FROM file WHERE run <> ?"
        for table in _TABLES:
            run(f"DELETE FROM {table} WHERE file IN ({gone})", (self.run,))
        run("DELETE FROM file WHERE run <> ?", (self.run,))
        run("DELETE FROM settings WHERE run <> ?", (self.run,))
        run("UPDATE file SET included = 0 WHERE included")
        run(
            """
            UPDATE file SET included = 1 WHERE state = 'design' AND EXISTS (
                SELECT 1 FROM include JOIN file AS by ON by.id = include.file
                WHERE include.path = file.path AND by.id <> file.id AND by.state = 'design'
                AND NOT (file.path < by.path AND EXISTS (
                    SELECT 1 FROM include AS back WHERE back.file = file.id AND back.path = by.path
                ))
            )
            """
        )
        self.tell(finished="yes")
        self.commit()

    def _replace(self, outcome: Outcome, path: str, includes: Iterable[str]) -> None:
        row = self._base.execute("SELECT id FROM file WHERE path = ?", (path,)).fetchone()
        if row is not None:
            for table in _TABLES:
                self._base.execute(f"DELETE FROM {table} WHERE file = ?", row)
            self._base.execute("DELETE FROM file WHERE id = ?", row)
        live = Counter(f.severity for f in outcome.findings if f.parent < 0 and not f.waived)
        values: dict[str, object] = {
            "path": path,
            "state": outcome.state,
            "key": outcome.key,
            "run": self.run,
            "why": outcome.why,
            "sha256": outcome.sha256,
            "title": outcome.title,
            "kind": outcome.kind,
            "verdict": outcome.verdict,
            **{severity: live[severity] for severity in SEVERITIES},
            "judged": outcome.judged,
            "open": sum(outcome.open.values()),
            "stages": outcome.stages,
            "circuit": outcome.circuit,
            "seconds": outcome.seconds,
        }
        marks = ", ".join("?" * len(values))
        made = self._base.execute(
            f"INSERT INTO file ({', '.join(values)}) VALUES ({marks})", tuple(values.values())
        ).lastrowid
        many = self._base.executemany
        many(
            f"INSERT INTO finding VALUES ({', '.join('?' * 21)})",
            [_row(made, number, found) for number, found in enumerate(outcome.findings)],
        )
        many(
            "INSERT INTO unknown VALUES (?, ?, ?, ?, ?)",
            [(made, u.designator, u.name, u.pins, u.nearest) for u in outcome.unknown],
        )
        many("INSERT INTO left_open VALUES (?, ?, ?)", [(made, *o) for o in outcome.open.items()])
        many("INSERT INTO include VALUES (?, ?)", [(made, name) for name in includes])


def _row(made: int | None, number: int, found: Found) -> tuple[object, ...]:
    return (
        made,
        number,
        found.parent,
        found.rule,
        found.family,
        found.severity,
        json.dumps(found.designators, ensure_ascii=False),
        json.dumps(found.nets, ensure_ascii=False),
        found.device,
        found.demand,
        found.limit,
        found.margin,
        found.margin_share,
        found.unit,
        found.message,
        found.remedy,
        found.source,
        found.place,
        found.line,
        found.fingerprint,
        found.waived,
    )


def _locked(place: Path) -> int:
    """Keep every other audit out of the file until this process ends, however it does."""
    try:
        handle = os.open(place, os.O_RDWR | os.O_CREAT, 0o666)
    except OSError as error:
        raise UsageError(f"{place} cannot be written: {error.strerror}.") from error
    try:
        lock(handle)
    except OSError as error:
        os.close(handle)
        raise UsageError(
            f"Another audit is writing {place}.", remedy="Wait for it, or name another file."
        ) from error
    return handle


def _connected(place: Path) -> sqlite3.Connection:
    """Open the file for writing."""
    with ExitStack() as opened:
        try:
            base = opened.enter_context(
                closing(sqlite3.connect(place, isolation_level="DEFERRED", timeout=1.0))
            )
            tables = {row[0] for row in base.execute("SELECT name FROM sqlite_master")}
            if tables and "about" not in tables:
                raise UsageError(f"{place} is no audit's file.", remedy="Name another with --to.")
            if tables:
                _same_format(place, base)
            base.execute("PRAGMA journal_mode = WAL")
            base.execute("PRAGMA synchronous = NORMAL")
            base.executescript(schema())
        except sqlite3.Error as error:
            raise UsageError(
                f"{place} cannot be written: {error}.", remedy="Name another with --to."
            ) from error
        opened.pop_all()  # it stays open
        return base


def _same_format(place: Path, base: sqlite3.Connection) -> None:
    """Refuse a file that another railguard wrote otherwise."""
    for (written,) in base.execute("SELECT value FROM about WHERE name = 'format'"):
        if written != FORMAT:
            raise UsageError(
                f"{place} was written in the format {written}, not {FORMAT}.",
                remedy="Name another with --to.",
            )


def schema() -> str:
    """Return the statements that make an audit's tables."""
    return (files("railguard.audit") / "schema.sql").read_text(encoding="utf-8")
