"""What belongs together in a report: findings by stage or rail, open points by their reason."""

import re
from collections.abc import Iterable, Sequence
from pathlib import PurePath

import msgspec

from railguard.analysis.stage import Stage
from railguard.notices import NotChecked
from railguard.reviewing import DesignReview
from railguard.rules.finding import Finding
from railguard.words import SEVERITIES

NETLIST = "Netlist"
"""Subject of findings on the reading itself."""

_AND_MORE = re.compile(r" \(and \d+ more\)$")


class OpenGroup(msgspec.Struct, frozen=True):
    """Open points of one reason.

    about  subjects with the rules that stay open for all of them
    add    what to state, without repeats
    """

    why: str
    about: tuple[tuple[tuple[str, ...], tuple[str, ...]], ...]
    add: str


def with_consequences(findings: Iterable[Finding]) -> Iterable[Finding]:
    """Yield findings and all that follows from them."""
    for finding in findings:
        yield finding
        yield from with_consequences(finding.consequences)


def blocks(review: DesignReview) -> list[tuple[str, list[Finding]]]:
    """Group what is not waived by stage, rail and netlist, the worst block first."""
    stages = {stage.designator for stage in review.design.stages}
    rails = {rail.net for rail in review.design.rails}
    grouped: dict[str, list[Finding]] = {}
    for finding in review.findings:
        if finding.waiver is None:
            grouped.setdefault(_subject(finding, stages, rails), []).append(finding)

    def weight(item: tuple[str, list[Finding]]) -> int:
        return min(SEVERITIES.index(f.severity) for f in item[1])

    return sorted(grouped.items(), key=weight)


def _subject(finding: Finding, stages: set[str], rails: set[str]) -> str:
    if finding.family == "netlist":
        return NETLIST
    if finding.family in ("supply", "decoupling") and finding.nets:
        on_rails = [net for net in finding.nets if net in rails]
        if on_rails and (len(on_rails) > 1 or len(finding.designators) != 1):
            return f"Rail{'s' * (len(on_rails) > 1)} {' and '.join(on_rails)}"
    known = [name for name in finding.designators if name in stages]
    if known:
        return known[0]
    if finding.designators:
        return finding.designators[0]
    return f"Rail {finding.nets[0]}" if finding.nets else NETLIST


def open_groups(notes: Sequence[NotChecked], stages: Iterable[Stage]) -> list[OpenGroup]:
    """Say every reason once, with all that stays open for it; subjects as on the schematic."""
    shown = {stage.designator: stage.schematic for stage in stages}
    by_reason: dict[str, list[NotChecked]] = {}
    for note in notes:
        by_reason.setdefault(_AND_MORE.sub("", note.why), []).append(note)
    return [
        OpenGroup(
            f"{why} (and others)" if any(note.why != why for note in same) else why,
            _about(same, shown),
            _joined([note.add for note in same]),
        )
        for why, same in by_reason.items()
    ]


def _about(
    notes: Sequence[NotChecked], shown: dict[str, str]
) -> tuple[tuple[tuple[str, ...], tuple[str, ...]], ...]:
    rules_of: dict[str, list[str]] = {}
    for note in notes:
        rules_of.setdefault(shown.get(note.subject, note.subject), []).append(note.rule)
    subjects_of: dict[tuple[str, ...], list[str]] = {}
    for subject, rules in rules_of.items():
        subjects_of.setdefault(tuple(dict.fromkeys(rules)), []).append(subject)
    return tuple((tuple(subjects), rules) for rules, subjects in subjects_of.items())


def _joined(adds: Sequence[str]) -> str:
    """Join what to state; alternatives that are entries of a settings file are listed once."""
    different = list(dict.fromkeys(adds))
    if len(different) > 1:
        entries = list(dict.fromkeys(e for add in different for e in add.split(" or ")))
        if all(entry.startswith("[") for entry in entries):
            return ", ".join(entries[:-1]) + f" or {entries[-1]}"
    return "; ".join(different)


def common_folder(paths: Sequence[str]) -> tuple[str, list[str]]:
    """Return the folder all paths lie in, "" where there is none, and the paths from there."""
    whole = [PurePath(path) for path in paths]
    shared: list[str] = []
    for parts in zip(*(path.parent.parts for path in whole), strict=False):
        if len(set(parts)) > 1:
            break
        shared.append(parts[0])
    folder = PurePath(*shared)
    below = [path.relative_to(folder).as_posix() for path in whole]
    return folder.as_posix() if shared else "", below
