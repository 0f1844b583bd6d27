"""ngspice as a shared library, for systems that have the library and no binary.

PySpice loads it, in a process of its own for each deck: the library stays broken after some
circuits and crashes on others. Folder, bounds and what counts as a result are the binary's.
"""

import ctypes.util
import os
import sys
import tempfile
from pathlib import Path

import msgspec

from railguard.engine import ngspice
from railguard.engine.guard import check_deck
from railguard.engine.process import Bounds, Engine, Run, execute, judged
from railguard.engine.requests import Request
from railguard.errors import EngineError

VARIABLE = "NGSPICE_LIBRARY_PATH"
"""PySpice's own name for where the library is."""

_WORKER = Path(__file__).with_name("shared_worker.py")


class Shared(msgspec.Struct, frozen=True):
    """A shared library of ngspice and the bounds its runs are held to."""

    library: str
    bounds: Bounds = Bounds()

    def run(self, deck: str, *requests: Request) -> Run:
        """Run analyses on a deck that holds no analysis cards of its own.

        Raises:
            EngineError: as the binary's run.
        """
        text = "\n".join((deck.rstrip("\n"), *(request.card for request in requests), ""))
        check_deck(text)
        more = {VARIABLE: self.library, "OPENBLAS_NUM_THREADS": "1"}
        more |= {name: os.environ[name] for name in ("PYTHONPATH",) if name in os.environ}
        with tempfile.TemporaryDirectory(prefix="railguard-", ignore_cleanup_errors=True) as name:
            folder = Path(name)
            (folder / "deck.cir").write_text(text + ".end\n", encoding="ascii")
            # -P: what stands beside the worker must not be found in place of a library's modules.
            command = [sys.executable, "-P", str(_WORKER), ngspice.START]
            status, log = execute(command, folder, self.bounds, more)
            raw = [path.read_bytes() for path in sorted(folder.glob("*.raw"))]
        return judged(status, log, raw, requests)


def find(setting: str = "") -> Engine:
    """Find what runs decks: the binary, else the shared library.

    Raises:
        EngineError: there is neither; the remedy says how to install the binary.
    """
    try:
        return ngspice.find(setting)
    except EngineError:
        if setting or os.environ.get(ngspice.VARIABLE):
            raise  # what the user names is used or refused, never replaced
        library = os.environ.get(VARIABLE) or ctypes.util.find_library("ngspice")
        if not library:
            raise
        return Shared(library)
