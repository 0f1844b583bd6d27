"""What is new or worse beside the committed version: findings matched by fingerprint and margin."""

from collections.abc import Iterable, Sequence

import msgspec

from railguard.reviewing import DesignReview, verdict
from railguard.rules.finding import Finding
from railguard.words import SEVERITIES

_SAME_MARGIN = 1e-6
"""Share by which a margin may differ and still be the same number."""


def only_new(design: DesignReview, before: Sequence[DesignReview]) -> DesignReview:
    """Return the review with what is new or worse, its verdict worked out anew.

    before  the committed versions of the same netlist; several where the commit is a merge. What
            one of them already had is not new. Waived findings count on neither side: a waiver
            that is taken out brings its finding back.
    """
    if not before:
        return design
    known = [_by_name(old.findings) for old in before]
    new: list[Finding] = []
    for name, found in _by_name(design.findings).items():
        rest = [_unmatched(found, old.get(name, [])) for old in known]
        new += next(left for left in rest if len(left) == min(map(len, rest)))
    waived = [f for f in design.findings if f.waiver is not None]
    top = {id(f) for f in design.findings}
    still_open = [set(old.not_checked) for old in before]
    left = msgspec.structs.replace(
        design,
        findings=(*(f for f in new if id(f) in top), *waived),
        not_checked=tuple(n for n in design.not_checked if not any(n in o for o in still_open)),
    )
    return msgspec.structs.replace(left, verdict=verdict(left))


def _by_name(findings: Iterable[Finding]) -> dict[str, list[Finding]]:
    """Sort findings that are not waived by fingerprint, what follows from them as well.

    The deck has one name in all of them: a netlist that was renamed has no new findings.
    """
    sorted_: dict[str, list[Finding]] = {}
    for finding in findings:
        if finding.waiver is None:
            sorted_.setdefault(finding.fingerprint(""), []).append(finding)
            for name, inner in _by_name(finding.consequences).items():
                sorted_.setdefault(name, []).extend(inner)
    return sorted_


def _unmatched(found: list[Finding], old: list[Finding]) -> list[Finding]:
    """Pair findings of one fingerprint, worst with worst; return those without an equal."""
    ranked, partners = sorted(found, key=_badness), sorted(old, key=_badness)
    return [f for at, f in enumerate(ranked) if at >= len(partners) or _worse(f, partners[at])]


def _badness(finding: Finding) -> tuple[int, float]:
    margin = finding.margin if finding.margin is not None else 0.0
    return SEVERITIES.index(finding.severity), margin


def _worse(new: Finding, old: Finding) -> bool:
    if new.severity != old.severity:
        return SEVERITIES.index(new.severity) < SEVERITIES.index(old.severity)
    if new.margin is None or old.margin is None or new.unit != old.unit:
        return False
    return new.margin < old.margin - _SAME_MARGIN * abs(old.margin)
