"""pytest collects netlists as test items: `pytest --railguard`.

pytest loads this module in every run of everybody who has railguard installed, so it imports
nothing of weight but pytest before it is asked for something.
"""

from collections.abc import Iterable, Iterator
from fnmatch import fnmatch
from pathlib import Path
from typing import TYPE_CHECKING

import pytest

from railguard.deck.suffixes import NETLISTS
from railguard.words import SEVERITIES

if TYPE_CHECKING:
    from _pytest._code.code import TerminalRepr, TracebackStyle

    from railguard.reviewing import Review


class OnHold(Exception):  # noqa: N818 - a netlist on hold is no error of the run
    """A netlist has something at or above its hold level; the text says what."""


def pytest_addoption(parser: pytest.Parser) -> None:
    """Add the options; nothing happens without the first."""
    group = parser.getgroup("railguard", "design rules of SPICE netlists")
    group.addoption(
        "--railguard",
        action="store_true",
        help="collect netlists, and review each as a test",
    )
    group.addoption(
        "--railguard-hold-at",
        choices=SEVERITIES,
        metavar="LEVEL",
        help="severity that fails a netlist, over what railguard.toml says [major]",
    )
    parser.addini(
        "railguard_netlists",
        "file names taken for netlists",
        type="args",
        default=[f"*{suffix}" for suffix in NETLISTS],
    )


def pytest_configure(config: pytest.Config) -> None:
    """Make the marker known, to select netlists with `-m railguard`, or to leave them out."""
    config.addinivalue_line("markers", "railguard: a SPICE netlist, reviewed by railguard")


def pytest_collect_file(file_path: Path, parent: pytest.Collector) -> "Netlist | None":
    """Take a file that is called a netlist, where netlists were asked for."""
    if not parent.config.getoption("--railguard"):
        return None
    name = file_path.name.casefold()
    patterns: Iterable[str] = parent.config.getini("railguard_netlists")
    if any(fnmatch(name, pattern.casefold()) for pattern in patterns):
        found: Netlist = Netlist.from_parent(parent, path=file_path)
        return found
    return None


class Netlist(pytest.File):
    """One netlist file."""

    def collect(self) -> Iterator[pytest.Item]:
        """Yield its one item."""
        yield ReviewItem.from_parent(self, name="review")


class ReviewItem(pytest.Item):
    """The review of one netlist, by the settings that lie beside it."""

    def __init__(self, **fields: object) -> None:
        super().__init__(**fields)  # type: ignore[arg-type] # pytest's own names and values
        self.add_marker("railguard")

    def runtest(self) -> None:
        """Review the netlist; fail with what holds it, skip where there is nothing to judge."""
        # in the run that asked for it, and only there
        from railguard.deck.encoding import no_netlist
        from railguard.report.terminal import held
        from railguard.reviewing import review

        with self.path.open("rb") as file:
            foreign = no_netlist(file.read(4096))
        if foreign:
            pytest.skip(f"{self.path.name} is {foreign}, not a SPICE netlist")
        level = self.config.getoption("--railguard-hold-at")
        found = review(self._near(), changes={"hold_at": level} if level else {})
        if found.held:
            raise OnHold(held(found).decode())
        self._tell(found)
        if not found.designs[0].design.stages:
            pytest.skip("no op-amp was recognised, so nothing could be judged")

    def _near(self) -> Path:
        """Return the path as seen from where pytest was started: it is printed."""
        start = self.config.invocation_params.dir
        return self.path.relative_to(start) if _is_cwd_of(self.path, start) else self.path

    def _tell(self, found: "Review") -> None:
        """Keep what stayed open for the summary that `-rP` prints."""
        from railguard.report.words import verdict

        self.add_report_section("call", "railguard", f"{verdict(found.designs[0])}\n")

    def repr_failure(
        self,
        excinfo: pytest.ExceptionInfo[BaseException],
        style: "TracebackStyle | None" = None,
    ) -> "str | TerminalRepr":
        """Print what holds the netlist, or the one sentence of a request that cannot be done."""
        from railguard.errors import RailguardError

        if isinstance(excinfo.value, OnHold | RailguardError):
            return str(excinfo.value)
        return super().repr_failure(excinfo, style)

    def reportinfo(self) -> tuple[Path, None, str]:
        """Say what failed, for the headings of the summary."""
        return self.path, None, f"railguard: {self.path.name}"


def _is_cwd_of(path: Path, start: Path) -> bool:
    return path.is_relative_to(start) and Path.cwd() == start
