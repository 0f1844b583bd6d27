"""A run of ngspice as a process of its own that can do no harm, and whether its result counts.

Each run has a fresh folder that is its working folder, its home and its script folder at once, so
no `.spiceinit` of a netlist's author is ever read; no shell; a wall-clock limit that ends the whole
process group; limits on processor time, memory and file size. A result counts only when the
process ended well, every analysis asked for came back complete, and the log has no sign of trouble.
"""

import contextlib
import os
import re
import signal
import subprocess
import sys
from collections.abc import Iterable, Mapping
from pathlib import Path
from types import MappingProxyType
from typing import Protocol

import msgspec

from railguard.engine.rawfile import Plot, read_raw
from railguard.engine.requests import Request
from railguard.errors import EngineError

_TROUBLE = re.compile(r"aborted|singular|fatal|circuit not parsed|no such vector", re.IGNORECASE)
_FALLBACK = re.compile(r"transient op", re.IGNORECASE)
_CAUSE = re.compile(
    r"^.*\b(?:error|fatal|singular|aborted|unable|unknown|too small)\b.*$",
    re.IGNORECASE | re.MULTILINE,
)

# Sets the limits and becomes ngspice; for systems without prlimit.
_LAUNCHER = """
import os, resource, sys
for name, most in zip(("CPU", "AS", "FSIZE"), sys.argv[1:4]):
    try:
        resource.setrlimit(getattr(resource, "RLIMIT_" + name), (int(most), int(most)))
    except (OSError, ValueError):
        pass
os.execv(sys.argv[4], sys.argv[4:])
"""


class Run(msgspec.Struct, frozen=True):
    """What one run gave.

    plots     one per request, in the order of the requests
    fallback  True where an operating point came from ngspice's transient last resort: such a
              point is a guess and is never to be reported as one
    log       what ngspice printed
    """

    plots: tuple[Plot, ...]
    fallback: bool
    log: str


class Engine(Protocol):
    """What runs decks: the binary, or the shared library in a process of its own."""

    def run(self, deck: str, *requests: Request) -> Run:
        """Run analyses on a deck that holds none; raises EngineError."""
        ...


class Bounds(msgspec.Struct, frozen=True):
    """What a run may use at most: seconds, bytes of memory, bytes of a file."""

    seconds: float = 20.0
    memory: int = 2 << 30
    file_size: int = 256 << 20


def execute(
    command: list[str],
    folder: Path,
    bounds: Bounds,
    more: Mapping[str, str] = MappingProxyType({}),
) -> tuple[int, str]:
    """Run a command in a folder; return its status and what it printed.

    more  environment variables beside those a run needs

    Raises:
        EngineError: it could not be started, or did not end in time.
    """
    log = folder / "log"
    with log.open("wb") as sink:
        process = _start(command, folder, sink.fileno(), bounds, more)
        try:
            status = process.wait(bounds.seconds)
        except subprocess.TimeoutExpired:
            raise EngineError(
                f"ngspice was ended after {bounds.seconds:g} s without an answer."
            ) from None
        finally:
            _end(process)
    return status, log.read_text(encoding="utf-8", errors="replace")


def judged(status: int, log: str, raw: Iterable[bytes], requests: tuple[Request, ...]) -> Run:
    """Return a run's result where it counts.

    Raises:
        EngineError: it does not; `what` carries the cause ngspice printed.
    """
    if status != 0 or _TROUBLE.search(log):
        raise EngineError(f"ngspice could not solve the circuit: {_cause(log, status)}")
    plots = tuple(plot for data in raw for plot in read_raw(data))
    answers = tuple(
        next((plot for plot in plots if request.complete(plot)), None) for request in requests
    )
    complete = tuple(plot for plot in answers if plot is not None)
    if len(complete) != len(requests):
        raise EngineError("ngspice ended without the result that was asked for.")
    return Run(complete, _FALLBACK.search(log) is not None, log)


def _start(
    command: list[str], folder: Path, sink: int, bounds: Bounds, more: Mapping[str, str]
) -> "subprocess.Popen[bytes]":
    program = command[0]
    limits = (int(bounds.seconds) + 1, bounds.memory, bounds.file_size)
    if os.name == "posix" and not _has_prlimit():
        numbers = [str(limit) for limit in limits]
        command = [sys.executable, "-I", "-S", "-c", _LAUNCHER, *numbers, *command]
    try:
        process = subprocess.Popen(
            command,
            cwd=folder,
            env={**_environment(folder), **more},
            stdin=subprocess.DEVNULL,
            stdout=sink,
            stderr=subprocess.STDOUT,
            start_new_session=os.name == "posix",
        )
    except OSError as error:
        raise EngineError(f"{program} could not be started: {error.strerror}.") from error
    _limit(process.pid, limits)
    return process


def _environment(folder: Path) -> dict[str, str]:
    ours = {name: str(folder) for name in ("HOME", "SPICE_SCRIPTS", "TMPDIR", "TEMP", "TMP")}
    # What a system needs to load a program's shared libraries; nothing else is handed on.
    loader = ("LD_LIBRARY_PATH", "DYLD_LIBRARY_PATH", "SYSTEMROOT")
    return ours | {"LC_ALL": "C"} | {n: os.environ[n] for n in loader if n in os.environ}


def _has_prlimit() -> bool:
    # The resource module exists on POSIX only, its prlimit on Linux only.
    import resource

    return hasattr(resource, "prlimit")


def _limit(pid: int, limits: tuple[int, int, int]) -> None:
    if os.name != "posix" or not _has_prlimit():
        return
    import resource

    kinds = (resource.RLIMIT_CPU, resource.RLIMIT_AS, resource.RLIMIT_FSIZE)
    # A run that has already ended has no limits to set.
    with contextlib.suppress(ProcessLookupError):
        for kind, most in zip(kinds, limits, strict=True):
            resource.prlimit(pid, kind, (most, most))


def _end(process: "subprocess.Popen[bytes]") -> None:
    """End what is left of a run: the group where there are groups, else the process."""
    if process.poll() is not None:
        return
    if os.name == "posix":
        with contextlib.suppress(ProcessLookupError):
            os.killpg(process.pid, signal.SIGKILL)
    else:
        process.kill()
    process.wait()


def _cause(log: str, status: int) -> str:
    found = _CAUSE.search(log)
    if found:
        return found[0].strip()
    return f"it ended by signal {-status}." if status < 0 else f"it ended with status {status}."
