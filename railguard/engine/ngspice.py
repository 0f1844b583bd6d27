"""Runs ngspice on a deck, as a process of its own that can do no harm.

Each run has a fresh folder that is its working folder, its home and its script folder at once, so
no `.spiceinit` of a netlist's author is ever read; no shell; a wall-clock limit that ends the whole
process group; limits on processor time, memory and file size. A result counts only when the
process ended well, every analysis asked for came back complete, and the log has no sign of trouble.
"""

import contextlib
import os
import re
import shutil
import signal
import subprocess
import sys
import tempfile
from pathlib import Path
from typing import Protocol

import msgspec

from railguard.engine.guard import check_deck
from railguard.engine.rawfile import Plot, read_raw
from railguard.engine.requests import Request
from railguard.errors import EngineError

VARIABLE = "RAILGUARD_NGSPICE"

# The stock last resort stops after 10 us, long before an op-amp circuit has settled, and passes
# what it has reached for an operating point. Twenty milliseconds is what these circuits need.
_START_UP = "optran 1 1 1 1u 20m 0\nset noaskquit\n"

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


class Ngspice(msgspec.Struct, frozen=True):
    """An ngspice binary and the bounds its runs are held to: seconds, bytes, bytes."""

    path: str
    seconds: float = 20.0
    memory: int = 2 << 30
    file_size: int = 256 << 20

    def version(self) -> str:
        """Return what the binary calls itself: `ngspice-39`."""
        with tempfile.TemporaryDirectory(prefix="railguard-") as folder:
            _, log = self._execute(["--version"], Path(folder))
        found = re.search(r"ngspice[- ]?(?:\d[\w.+-]*)", log)
        return found[0] if found else "ngspice, version not stated"

    def run(self, deck: str, *requests: Request) -> Run:
        """Run analyses on a deck that holds no analysis cards of its own.

        Raises:
            EngineError: the deck is not allowed, ngspice failed, ran out of a bound, or its
                result is incomplete; `what` carries the cause ngspice printed.
        """
        text = "\n".join((deck.rstrip("\n"), *(request.card for request in requests), ""))
        check_deck(text)
        with tempfile.TemporaryDirectory(prefix="railguard-", ignore_cleanup_errors=True) as name:
            folder = Path(name)
            (folder / "deck.cir").write_text(text + ".end\n", encoding="ascii")
            status, log = self._execute(["-n", "-b", "-r", "out.raw", "deck.cir"], folder)
            raw = folder / "out.raw"
            data = raw.read_bytes() if raw.exists() else b""
        if status != 0 or _TROUBLE.search(log):
            raise EngineError(f"ngspice could not solve the circuit: {_cause(log, status)}")
        plots = read_raw(data)
        answers = tuple(
            next((plot for plot in plots if request.complete(plot)), None) for request in requests
        )
        complete = tuple(plot for plot in answers if plot is not None)
        if len(complete) != len(requests):
            raise EngineError("ngspice ended without the result that was asked for.")
        return Run(complete, _FALLBACK.search(log) is not None, log)

    def _execute(self, arguments: list[str], folder: Path) -> tuple[int, str]:
        (folder / "spinit").write_text(_START_UP, encoding="ascii")
        log = folder / "log"
        with log.open("wb") as sink:
            process = self._start(arguments, folder, sink.fileno())
            try:
                status = process.wait(self.seconds)
            except subprocess.TimeoutExpired:
                raise EngineError(
                    f"ngspice was ended after {self.seconds:g} s without an answer."
                ) from None
            finally:
                _end(process)
        return status, log.read_text(encoding="utf-8", errors="replace")

    def _start(self, arguments: list[str], folder: Path, sink: int) -> "subprocess.Popen[bytes]":
        limits = (int(self.seconds) + 1, self.memory, self.file_size)
        command = [self.path, *arguments]
        if os.name == "posix" and not _has_prlimit():
            numbers = [str(limit) for limit in limits]
            command = [sys.executable, "-I", "-S", "-c", _LAUNCHER, *numbers, *command]
        try:
            process = subprocess.Popen(
                command,
                cwd=folder,
                env=_environment(folder),
                stdin=subprocess.DEVNULL,
                stdout=sink,
                stderr=subprocess.STDOUT,
                start_new_session=os.name == "posix",
            )
        except OSError as error:
            raise EngineError(f"{self.path} could not be started: {error.strerror}.") from error
        _limit(process.pid, limits)
        return process


def find(setting: str = "") -> Ngspice:
    """Find the binary: what the user set, then RAILGUARD_NGSPICE, then the search path.

    Only absolute folders of the search path count, so that a binary that lies in the folder of
    an untrusted netlist is never started.

    Raises:
        EngineError: there is none; the remedy says how to install it.
    """
    stated = setting or os.environ.get(VARIABLE, "")
    if stated:
        path = Path(stated).expanduser().absolute()
        if not os.access(path, os.X_OK) or path.is_dir():
            raise EngineError(f"{stated} is not a program that can be run.", remedy=_install())
        return Ngspice(str(path))
    for folder in os.environ.get("PATH", os.defpath).split(os.pathsep):
        for name in ("ngspice", "ngspice_con") if Path(folder).is_absolute() else ():
            found = shutil.which(name, path=folder)
            if found and Path(found).is_absolute():
                return Ngspice(found)
    raise EngineError("ngspice is not installed, or not on the search path.", remedy=_install())


def _install() -> str:
    command = {
        "linux": "Install it with `sudo apt install ngspice` (Debian, Ubuntu) or your "
        "distribution's package manager",
        "darwin": "Install it with `brew install ngspice`",
    }.get(sys.platform, "Install it from https://ngspice.sourceforge.io/download.html")
    return f"{command}, or name its path in {VARIABLE}."


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
