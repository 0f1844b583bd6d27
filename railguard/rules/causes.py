"""One cause is one finding: what follows from another finding hangs under it.

A finding that follows from one that itself follows from a third hangs under the third. A cause is
never milder than what follows from it.
"""

from collections.abc import Sequence

import msgspec

from railguard.analysis.stage import Design
from railguard.rules.finding import Finding
from railguard.rules.links import LINKS
from railguard.words import SEVERITIES, worst


def merge(findings: Sequence[Finding], design: Design) -> tuple[Finding, ...]:
    """Hang consequences under their causes and sort what remains, worst first."""
    parents = [_parent(index, findings, design) for index in range(len(findings))]
    hanging: dict[int, list[Finding]] = {}
    for index, (finding, parent) in enumerate(zip(findings, parents, strict=True)):
        if parent is None:
            continue
        root = _root(index, parents)
        if root != index:
            word = parent[1]
            hanging.setdefault(root, []).append(msgspec.structs.replace(finding, cause=word))
    roots = [i for i in range(len(findings)) if _root(i, parents) == i]
    return tuple(sorted((_with(findings[i], hanging.get(i, [])) for i in roots), key=order))


def _parent(index: int, findings: Sequence[Finding], design: Design) -> tuple[int, str] | None:
    """Return the finding another follows from, with what they have in common; None: itself."""
    finding = findings[index]
    for link in LINKS:
        if finding.rule not in link.follows and finding.family not in link.follows:
            continue
        for other, cause in enumerate(findings):
            if other == index or cause.rule not in link.causes:
                continue
            word = link.related(cause, finding, design)
            if word:
                return other, word
    return None


def _root(index: int, parents: Sequence[tuple[int, str] | None]) -> int:
    """Follow causes up to the first; in a ring of causes the smallest index is the first."""
    seen: list[int] = []
    at = index
    while (parent := parents[at]) is not None:
        if at in seen:
            return min(seen[seen.index(at) :])
        seen.append(at)
        at = parent[0]
    return at


def _with(root: Finding, consequences: list[Finding]) -> Finding:
    if not consequences:
        return root
    severity = worst([root.severity, *(c.severity for c in consequences)]) or root.severity
    return msgspec.structs.replace(
        root, severity=severity, consequences=tuple(sorted(consequences, key=order))
    )


def order(finding: Finding) -> tuple[int, str, int, str, tuple[str, ...]]:
    """Sort key: worst first, then by place; what has no place comes last."""
    place = finding.location
    return (
        SEVERITIES.index(finding.severity),
        place.file if place else "\uffff",
        place.line if place else 0,
        finding.rule,
        finding.designators,
    )
