"""Files that commands write: whole or not at all."""

import contextlib
import os
import tempfile
from pathlib import Path

from railguard.errors import UsageError

_USUAL_MODE = 0o666
"""What a new file may be to whom, before the user's mask takes its share."""


def write_whole(place: Path, data: bytes) -> None:
    """Write a file beside its place and move it there, so that nobody ever reads a half.

    Raises UsageError: the file cannot be written.
    """
    temporary: str | None = None
    try:
        handle, temporary = tempfile.mkstemp(dir=place.parent, prefix=f".{place.name}.")
        with os.fdopen(handle, "wb") as out:
            out.write(data)
        # A temporary file is its owner's alone; a report is for whoever may read its folder.
        Path(temporary).chmod(_USUAL_MODE & ~_mask())
        Path(temporary).replace(place)
    except OSError as error:
        if temporary is not None:
            with contextlib.suppress(OSError):
                Path(temporary).unlink()
        raise UsageError(f"The report {place} cannot be written: {error.strerror}.") from error


def _mask() -> int:
    """Return the mask of this process, which can only be read by setting it."""
    mask = os.umask(0)
    os.umask(mask)
    return mask
