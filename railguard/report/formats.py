"""Which report formats there are. One function a format, imported when it is asked for."""

import importlib
from pathlib import Path
from typing import IO

from railguard.reviewing import Review

_MODULES = {
    "terminal": "railguard.report.terminal",
    "json": "railguard.report.as_json",
    "html": "railguard.report.html.document",
    "svg": "railguard.report.as_svg",
    "sarif": "railguard.report.as_sarif",
    "junit": "railguard.report.as_junit",
    "markdown": "railguard.report.as_markdown",
    "csv": "railguard.report.as_csv",
}
FORMATS = tuple(_MODULES)


def render(
    name: str, review: Review, stream: IO[str] | None = None, root: Path | None = None
) -> bytes:
    """Return a report's bytes.

    stream  for "terminal": where it is printed, in that stream's width and colours; None: as plain
            text of 80 columns
    root    the run's root, from which fingerprints name a deck; None: the current folder
    """
    module = importlib.import_module(_MODULES[name])
    if name == "terminal":
        return bytes(module.terminal(review, stream))
    return bytes(module.document(review, root))
