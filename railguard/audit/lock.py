"""One audit at a time writes a file: a lock that ends with the process, however that ends."""

import importlib
import os
from typing import Any

_FAR = 1 << 40
"""The byte that is locked where locks keep others from reading too: far behind any database."""


def lock(handle: int) -> None:
    """Lock an open file for this process.

    Raises OSError: another process holds it.
    """
    try:
        import fcntl
    except ImportError:
        _lock_far_byte(handle)
        return
    fcntl.flock(handle, fcntl.LOCK_EX | fcntl.LOCK_NB)


def _lock_far_byte(handle: int) -> None:
    # Windows has no fcntl, and its module is unknown to type checkers elsewhere.
    msvcrt: Any = importlib.import_module("msvcrt")
    os.lseek(handle, _FAR, os.SEEK_SET)
    msvcrt.locking(handle, msvcrt.LK_NBLCK, 1)
