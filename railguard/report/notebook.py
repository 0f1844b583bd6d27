"""A review shown in a notebook: the page's blocks without its filter, and the terminal's text."""

import hashlib

from railguard.report.html.document import fragment
from railguard.report.terminal import terminal
from railguard.reviewing import Review


def bundle(review: Review) -> dict[str, str]:
    """Return what a notebook may show, by media type."""
    return {"text/plain": terminal(review, None).decode(), "text/html": html(review)}


def html(review: Review) -> str:
    """Return a part of a page: one element that brings its own style and no script."""
    return fragment(review, _prefix(review))


def _prefix(review: Review) -> str:
    """Return what tells the anchors of one shown review from those of another."""
    text = "\n".join(f"{d.path} {d.design.circuit.sha256} {d.verdict}" for d in review.designs)
    return f"rg{hashlib.sha256(text.encode('utf-8', 'replace')).hexdigest()[:8]}-"
