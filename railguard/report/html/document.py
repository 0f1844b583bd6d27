"""From a review to the page's bytes: templates filled, style and script inside, nothing fetched."""

import base64
import hashlib
from functools import cache
from pathlib import Path
from typing import TYPE_CHECKING

from markupsafe import Markup

from railguard import __version__
from railguard.report import words
from railguard.report.html.view import PageView, page
from railguard.report.visible import visible
from railguard.report.wrapping import with_unit
from railguard.reviewing import Review

if TYPE_CHECKING:
    from jinja2 import Environment

TEMPLATES = Path(__file__).parent / "templates"


def document(review: Review, root: Path | None = None) -> bytes:
    """Return the whole page.

    root  the run's root; the page names no fingerprints, so it is not used
    """
    del root
    style, script = _text("page.css"), _text("page.js")
    text = _filled(
        "page.html",
        page(review),
        script=Markup(script),
        style_hash=_hash(style),
        script_hash=_hash(script),
    )
    return f"{text}\n".encode("utf-8", "replace")


def fragment(review: Review, prefix: str) -> str:
    """Return the part of a page that a notebook shows: no script, no netlist.

    prefix  what every id begins with, so that several may stand on one page
    """
    return _filled("fragment.html", page(review, prefix, netlists=False))


def _filled(template: str, view: PageView, **more: str) -> str:
    return (
        _environment()
        .get_template(template)
        .render(
            page=view,
            style=Markup(_text("page.css")),
            version=__version__,
            caution=words.CAUTION,
            labels=words,
            **more,
        )
    )


@cache
def _environment() -> "Environment":
    from jinja2 import Environment, FileSystemLoader, StrictUndefined

    return Environment(
        loader=FileSystemLoader(TEMPLATES),
        autoescape=True,
        undefined=StrictUndefined,
        finalize=_shown,
        trim_blocks=True,
        lstrip_blocks=True,
    )


def _shown(value: object) -> object:
    """Make hidden and steering characters visible in every text before it is escaped.

    The environment calls it with whatever a template prints; what is markup already stays.
    """
    return with_unit(visible(value)) if type(value) is str else value


def _text(name: str) -> str:
    return (TEMPLATES / name).read_text(encoding="utf-8")


def _hash(text: str) -> str:
    """Return the digest by which the page's policy lets a style or script of its own through."""
    return base64.b64encode(hashlib.sha256(text.encode()).digest()).decode()
