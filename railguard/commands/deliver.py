"""Files that commands write: whole or not at all."""

import contextlib
import os
import stat
import tempfile
from collections.abc import Iterable
from pathlib import Path

from railguard.errors import UsageError

_USUAL_MODE = 0o666
"""What a new file may be to whom, before the user's mask takes its share."""


def check_places(places: Iterable[Path], inputs: Iterable[Path]) -> None:
    """Refuse, before any work is done, places that no report can be written to.

    inputs  files that are read; a report must not replace one

    Raises UsageError.
    """
    read = {_real(file) for file in inputs}
    for place in places:
        if place.is_dir():
            raise UsageError(
                f"The report {place} cannot be written: it is a folder.",
                remedy="Name a file in it.",
            )
        if not place.parent.is_dir():
            raise UsageError(
                f"The report {place} cannot be written: its folder does not exist.",
                remedy="Make the folder, or name another one.",
            )
        if _real(place) in read:
            raise UsageError(
                f"The report would replace {place}, which is to be reviewed.",
                remedy="Name another file behind --report FORMAT=.",
            )


def write_whole(place: Path, data: bytes) -> None:
    """Write a file beside its place and move it there, so that nobody ever reads a half.

    A link stays, and what it leads to is replaced; a device or a pipe is written to as it is.

    Raises UsageError: the file cannot be written; what stood there before stands there still.
    """
    try:
        mode = _mode(place)
        if mode is not None and not stat.S_ISREG(mode):
            place.write_bytes(data)
        else:
            _replace(_real(place), data, stat.S_IMODE(mode) if mode else _USUAL_MODE & ~_mask())
    except OSError as error:
        why = error.strerror or str(error)
        raise UsageError(f"The report {place} cannot be written: {why}.") from error


def _replace(target: Path, data: bytes, mode: int) -> None:
    handle, temporary = tempfile.mkstemp(dir=target.parent, prefix=".railguard-")
    try:
        with os.fdopen(handle, "wb") as out:
            out.write(data)
        # A temporary file is its owner's alone; a report is for whoever may read its folder.
        Path(temporary).chmod(mode)
        Path(temporary).replace(target)
    except BaseException:
        # An interrupted run leaves nothing behind either.
        with contextlib.suppress(OSError):
            Path(temporary).unlink()
        raise


def _real(path: Path) -> Path:
    """Follow a path's links; a ring of links is left for the writing to stumble over."""
    return Path(os.path.realpath(path))


def _mode(target: Path) -> int | None:
    try:
        return target.stat().st_mode
    except FileNotFoundError:
        return None


def _mask() -> int:
    """Return the mask of this process, which can only be read by setting it."""
    mask = os.umask(0)
    os.umask(mask)
    return mask
