"""Which report formats there are. One function a format, imported when it is asked for."""

import importlib
from typing import IO

from railguard.review import Review

_MODULES = {
    "terminal": "railguard.report.terminal",
    "json": "railguard.report.as_json",
}
FORMATS = tuple(_MODULES)


def render(name: str, review: Review, stream: IO[str] | None) -> bytes:
    """Return a report's bytes.

    stream  for "terminal": where it is printed, in that stream's width and colours; None: as plain
            text of 80 columns
    """
    module = importlib.import_module(_MODULES[name])
    if name == "terminal":
        return bytes(module.terminal(review, stream))
    return bytes(module.document(review))
