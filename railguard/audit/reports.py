"""Which reports of an audit there are. One function a format, imported when it is asked for."""

import importlib
from collections.abc import Iterator
from pathlib import Path
from typing import IO

from railguard.audit.compare import Comparison, compare
from railguard.audit.read import Base

_MODULES = {
    "terminal": "railguard.audit.as_terminal",
    "html": "railguard.audit.as_html",
    "csv": "railguard.audit.as_csv",
    "json": "railguard.audit.as_json",
}


def render(
    form: str, place: Path, against: Path | None, stream: IO[str] | None = None
) -> Iterator[bytes]:
    """Yield a report, piece by piece.

    place    the audit's file
    against  an earlier one, for what is new, gone and worse
    stream   for "terminal": where it is printed, in that stream's width and colours

    Raises UsageError: one of the files is no audit's.
    """
    changes: Comparison | None = compare(place, against) if against is not None else None
    module = importlib.import_module(_MODULES[form])
    with Base(place) as base:
        yield from module.pieces(base, changes, stream)
