"""What must hold of a review whatever the deck was."""

import json
import time
from pathlib import Path

from railguard.report.formats import FORMATS, render
from railguard.reviewing import Review, review
from railguard.words import SEVERITIES

SECONDS = 10.0
"""Processor time one small deck may take; none comes near."""

FORBIDDEN = frozenset(map(chr, (*range(0x0A), *range(0x0B, 0x20), 0x7F, *range(0x80, 0xA0)))) | set(
    "\u2028\u2029\u202a\u202b\u202c\u202d\u202e\u2066\u2067\u2068\u2069"
)


def hold(data: bytes, folder: Path) -> Review:
    """Review one deck and check what holds of every review; return it."""
    path = folder / "gauge.cir"
    path.write_bytes(data)
    begun = time.process_time()
    found = review(path, plugins=False)
    (design,) = found.designs
    assert design.verdict in ("pass", "hold", "incomplete")
    assert design.verdict != "pass" or design.judged
    for finding in design.findings:
        assert finding.severity in SEVERITIES
        assert finding.message
        if finding.location is not None:
            assert finding.location.line >= 1
    json.loads(render("json", found))
    for name in FORMATS:
        assert not FORBIDDEN & set(render(name, found).decode("utf-8")), name
    assert time.process_time() - begun < SECONDS
    return found
