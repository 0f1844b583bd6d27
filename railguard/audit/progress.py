"""How an audit goes on, on stderr: how many, how fast, how long still, and the worst so far."""

import time

from rich.console import Console
from rich.progress import BarColumn, MofNCompleteColumn, Progress, TextColumn, TimeRemainingColumn
from rich.text import Text

from railguard.audit.wire import Outcome
from railguard.report.visible import shortened, visible
from railguard.words import SEVERITIES

_WIDEST = 48
_LOG_SECONDS = 30.0
"""Seconds between two lines where stderr is no terminal."""


class Display:
    """Shows an audit's progress; a context manager, and the watcher of `run.audit`."""

    def __init__(self, console: Console) -> None:
        self._console = console
        self._progress = Progress(
            BarColumn(24),
            MofNCompleteColumn(),
            TextColumn("{task.fields[rate]}"),
            TimeRemainingColumn(),
            TextColumn("{task.fields[worst]}", markup=False),
            console=console,
            transient=True,
            disable=not console.is_terminal,
        )
        self._task = self._progress.add_task("", total=None, rate="", worst="")
        self._start = time.monotonic()
        self._told = self._start
        self._worst: tuple[int, ...] = ()
        self._worst_text = ""
        self.done = 0
        self.reviewed = 0
        self.same = 0

    def __enter__(self) -> "Display":
        self._progress.start()
        return self

    def __exit__(self, *ending: object) -> None:
        self._progress.stop()

    def expects(self, files: int, *, final: bool) -> None:
        """Take the number of files found so far; before it is final no time can be told."""
        self._progress.update(self._task, total=files if final else None)

    def did(self, outcome: Outcome, path: str) -> None:
        """Take one file's outcome."""
        self.done += 1
        self.reviewed += outcome.state == "design"
        self.same += outcome.state == "same"
        seconds = max(time.monotonic() - self._start, 1e-3)
        rate = f"{self.done / seconds:.0f} files/s"
        rank = _rank(outcome)
        if any(rank) and rank > self._worst:
            self._worst = rank
            self._worst_text = f"worst so far {_cut(path)} ({_counts(rank)})"
        self._progress.update(self._task, advance=1, rate=rate, worst=self._worst_text)
        if self._progress.disable and time.monotonic() - self._told > _LOG_SECONDS:
            self._told = time.monotonic()
            self._console.print(Text(f"{self.done} files, {rate}"))


def _rank(outcome: Outcome) -> tuple[int, ...]:
    live = [f.severity for f in outcome.findings if f.parent < 0 and not f.waived]
    return tuple(live.count(severity) for severity in SEVERITIES[:2])


def _counts(rank: tuple[int, ...]) -> str:
    return ", ".join(f"{n} {word}" for n, word in zip(rank, SEVERITIES, strict=False) if n)


def _cut(path: str) -> str:
    text = shortened(visible(path))
    return text if len(text) <= _WIDEST else f"...{text[-_WIDEST:]}"
