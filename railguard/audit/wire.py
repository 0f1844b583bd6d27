"""What an audit's parent and its workers say to each other. All of it travels as MessagePack.

Paths are relative to the audit's root they lie below, with forward slashes; an archive counts as
a folder: `old/boards.zip/filter.cir`.
"""

from collections.abc import Mapping
from typing import Literal

import msgspec

from railguard.words import Family, Kind, Severity, Verdict

State = Literal["design", "library", "archive", "unreadable", "stopped", "passed", "other", "same"]
"""What became of a file.

design      a netlist with elements of its own; it was reviewed
library     subcircuits and models only
archive     opened; `members` says what is inside
unreadable  the reason is in `why`
stopped     its review ran out of its budget, or ended its worker; the reason is in `why`
passed      a link, a pipe or the like, which is not opened; the reason is in `why`
other       no netlist; counted only
same        content, settings and version are those of the last run
"""


class Budget(msgspec.Struct, frozen=True, kw_only=True):
    """What one file may cost.

    seconds    of processor time
    megabytes  beyond what a worker needs before its first file
    netlist    bytes of one netlist
    unpacked   bytes one archive may unpack to
    members    files in one archive
    nested     archives in archives
    """

    seconds: int = 30
    megabytes: int = 1024
    netlist: int = 32_000_000
    unpacked: int = 1_000_000_000
    members: int = 20_000
    nested: int = 3


class Plan(msgspec.Struct, frozen=True, kw_only=True):
    """What holds for every file of a run; a worker is told once.

    roots      what was named: folders, files, or fsspec URLs
    labels     the name each root's files are listed under; "" where there is one root
    settings   the text of the user's file, or ""
    hold_at    the level that puts a design on hold, where the user stated one
    trust      obey settings files that lie below a root
    day        the day waivers are judged on
    build      `build.identity` of the parent; a worker of another one refuses
    """

    roots: tuple[str, ...]
    labels: tuple[str, ...]
    settings: str = ""
    hold_at: Severity | None = None
    trust: bool = False
    day: str
    build: str
    budget: Budget = Budget()


class Task(msgspec.Struct, frozen=True, array_like=True):
    """One file to look at.

    root      index in `Plan.roots`
    path      below that root
    archives  the prefixes of `path` that are archives, outermost first
    known     the key of the last run's result, or ""
    opens     True for an archive that is to be opened, not read
    """

    root: int
    path: str
    archives: tuple[str, ...] = ()
    known: str = ""
    opens: bool = False


class Found(msgspec.Struct, frozen=True, array_like=True):
    """A finding as it is kept. `parent` is the number of the finding it follows from, or -1."""

    parent: int
    rule: str
    family: Family
    severity: Severity
    designators: tuple[str, ...]
    nets: tuple[str, ...]
    device: str
    demand: float | None
    limit: float | None
    margin: float | None
    margin_share: float | None
    unit: str
    message: str
    remedy: str
    source: str
    place: str
    line: int | None
    fingerprint: str
    waived: bool


class Unknown(msgspec.Struct, frozen=True, array_like=True):
    """A device that may be an op-amp and that nobody knows."""

    designator: str
    name: str
    pins: int
    nearest: str


class Outcome(msgspec.Struct, frozen=True, kw_only=True, tag=True):
    """What became of one file.

    key       of content, settings and version; "" where the content was not got
    includes  files read besides the deck itself
    circuit   the included file that holds the circuit, for a deck of analyses; else ""
    open      by rule: how many subjects were left not checked
    members   of an archive: tasks for what is inside
    settings  settings files seen inside an archive
    seconds   processor time
    """

    root: int
    path: str
    state: State
    key: str = ""
    why: str = ""
    sha256: str = ""
    title: str = ""
    kind: Kind | None = None
    verdict: Verdict | None = None
    judged: int = 0
    open: Mapping[str, int] = {}
    stages: int = 0
    findings: tuple[Found, ...] = ()
    unknown: tuple[Unknown, ...] = ()
    includes: tuple[str, ...] = ()
    circuit: str = ""
    members: tuple[Task, ...] = ()
    settings: tuple[str, ...] = ()
    seconds: float = 0.0


class Began(msgspec.Struct, frozen=True, tag=True):
    """A worker has read its file and begins to review it; should it die, this was its key."""

    key: str


class Ready(msgspec.Struct, frozen=True, tag=True):
    """A worker has started, and of which build it is."""

    build: str


Message = Ready | Began | Outcome
