"""A bar on the error stream while long work goes on; nothing in a pipe, nothing for short work."""

import sys
import time
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from rich.progress import Progress, TaskID

PATIENCE = 0.7
"""Seconds after which work counts as long."""

Step = Callable[[], None]


@contextmanager
def progress(total: int, what: str) -> Iterator[Step]:
    """Yield what is to be called after each of `total` things.

    The bar appears only where the error stream is a terminal, and leaves nothing behind.
    """
    if total < 2 or not sys.stderr.isatty():
        yield lambda: None
        return
    bar = _Bar(total, what)
    try:
        yield bar.step
    finally:
        bar.close()


class _Bar:
    def __init__(self, total: int, what: str) -> None:
        self._total, self._what = total, what
        self._begun = time.monotonic()
        self._done = 0
        self._shown: tuple[Progress, TaskID] | None = None

    def step(self) -> None:
        self._done += 1
        if self._shown is None and time.monotonic() - self._begun > PATIENCE:
            self._shown = self._start()
        if self._shown is not None:
            bar, task = self._shown
            bar.update(task, completed=self._done)

    def _start(self) -> "tuple[Progress, TaskID]":
        from rich.console import Console
        from rich.progress import BarColumn, MofNCompleteColumn, Progress, TextColumn
        from rich.progress import TimeRemainingColumn as TimeLeft

        line = BarColumn(style="dim", complete_style="bold", finished_style="bold")
        columns = (TextColumn("{task.description}"), line, MofNCompleteColumn(), TimeLeft())
        bar = Progress(*columns, console=Console(stderr=True), transient=True)
        bar.start()
        return bar, bar.add_task(self._what, total=self._total)

    def close(self) -> None:
        if self._shown is not None:
            self._shown[0].stop()
