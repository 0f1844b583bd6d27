"""An audit as one HTML page: sorted tables, findings folded under each design. No script in it."""

from collections.abc import Iterator
from importlib.resources import files
from typing import IO, TYPE_CHECKING

from railguard.audit.compare import Comparison
from railguard.audit.read import Base
from railguard.report.visible import shortened, visible
from railguard.report.words import CAUTION

if TYPE_CHECKING:
    from jinja2 import Template

MOST = 2_000
"""Designs shown with their findings; a page with more is slow to open. CSV and JSON have all."""


def pieces(base: Base, changes: Comparison | None, stream: IO[str] | None) -> Iterator[bytes]:
    """Yield the page, piece by piece."""
    del stream
    shown = ((design, base.findings(design.id)) for design in base.ranking(MOST))
    verdicts = base.verdicts()
    page = _template().generate(
        base=base,
        shown=shown,
        changes=changes,
        verdicts=verdicts,
        total=sum(verdicts.values()),
        most=MOST,
        caution=CAUTION,
    )
    for piece in page:
        yield piece.encode()


def _template() -> "Template":
    from jinja2 import Environment  # 60 ms to import

    environment = Environment(autoescape=True, trim_blocks=True, lstrip_blocks=True)
    environment.filters["clean"] = lambda text: shortened(visible(str(text)))
    source = (files("railguard.audit") / "audit.html.jinja").read_text(encoding="utf-8")
    return environment.from_string(source)
