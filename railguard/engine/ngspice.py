"""The ngspice binary: found, and run on decks made from values only.

What can go wrong with a run, and when its result counts, is in `process`.
"""

import os
import re
import shutil
import sys
import tempfile
from pathlib import Path

import msgspec

from railguard.engine.guard import check_deck
from railguard.engine.process import Bounds, Run, execute, judged
from railguard.engine.requests import Request
from railguard.errors import EngineError

VARIABLE = "RAILGUARD_NGSPICE"

START = "optran 1 1 1 1u 20m 0"
"""The stock last resort for an operating point stops after 10 us, long before an op-amp circuit has
settled, and passes what it has reached for one. Twenty milliseconds is what these circuits need."""


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
        return judged(status, log, (data,), requests)

    def _execute(self, arguments: list[str], folder: Path) -> tuple[int, str]:
        (folder / "spinit").write_text(f"{START}\nset noaskquit\n", encoding="ascii")
        bounds = Bounds(self.seconds, self.memory, self.file_size)
        return execute([self.path, *arguments], folder, bounds)


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
