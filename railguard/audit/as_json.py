"""An audit as JSON: designs in their ranking with every finding, and all counts.

It holds nothing that depends on when, where or how fast the audit ran: two audits of the same
files give the same bytes. A number that was not worked out is null.
"""

from collections.abc import Iterator
from typing import IO

import msgspec

from railguard.audit.compare import Comparison
from railguard.audit.read import Base, Row
from railguard.audit.store import FORMAT
from railguard.report.json_text import one_line


def pieces(base: Base, changes: Comparison | None, stream: IO[str] | None) -> Iterator[bytes]:
    """Yield the document, one design a line, so that millions of them need no memory."""
    del stream
    head = {
        "schema": FORMAT,
        "tool": {"name": "railguard", "version": base.about("build")},
        "complete": base.finished,
        "designs_by_verdict": base.verdicts(),
        "libraries": base.count("state = 'library'"),
        "included": base.count("state = 'design' AND included"),
        "other_files": int(base.about("others") or 0),
        "settings_files": base.settings_seen(),
        "settings_obeyed": base.about("trusted") == "yes",
    }
    yield one_line(head)[:-1] + b',\n"designs": ['
    first = True
    for design in base.ranking():
        out = {
            **msgspec.structs.asdict(design),
            "left_open": base.left_open(design.id),
            "findings": [msgspec.structs.asdict(f) for f in base.findings(design.id)],
        }
        del out["id"]
        yield (b"\n" if first else b",\n") + one_line(out)
        first = False
    tail: dict[str, object] = {
        "findings_by_family_and_device": [
            {"family": r.name, "device": r.detail, "designs": r.designs, "findings": r.findings}
            for r in base.by_family()
        ],
        "unknown_devices": [_counted(r) for r in base.unknown()],
        "not_read": [{"path": p, "state": s, "why": why} for p, s, why in base.not_read()],
        "copies": [{"path": r.name, "designs": r.designs} for r in base.copies()],
        "changes": changes,
    }
    yield b"\n],\n" + one_line(tail)[1:] + b"\n"


def _counted(row: Row) -> dict[str, object]:
    return {
        "name": row.name,
        "designs": row.designs,
        "instances": row.findings,
        "about": row.detail,
    }
