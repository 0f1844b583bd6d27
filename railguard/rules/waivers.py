"""Waivers: agreed, reasoned, dated acceptances of findings.

A waiver accepts the finding it names and nothing else: what follows from an accepted finding and
is not accepted itself stands on its own. A waiver that has expired, or whose accepted margin no
longer holds, accepts nothing, and the finding says so.
"""

import datetime as dt
import os
from collections.abc import Iterable, Sequence
from fnmatch import fnmatchcase
from pathlib import Path

import msgspec

from railguard.devices.names import schematic_name
from railguard.location import Location
from railguard.rules.causes import order
from railguard.rules.finding import Finding, WaiverNote
from railguard.settings.model import Settings, Waiver
from railguard.units import si

STALE = "netlist-waiver-stale"

_SAME_MARGIN = 1e-6
"""Share by which a margin may differ from the accepted one and still be the same number."""


def apply(
    findings: Iterable[Finding], settings: Settings, deck_path: str, as_of: dt.date
) -> tuple[tuple[Finding, ...], frozenset[int]]:
    """Mark the findings that are waived.

    deck_path  as the user gave it
    as_of      the day waivers are judged on; the last day of a waiver counts

    Returns the findings, worst first, and the indexes in `settings.waivers` of those that match a
    finding, expired ones included.
    """
    live = [
        (index, waiver)
        for index, waiver in enumerate(settings.waivers)
        if _takes_in(waiver, deck_path, settings.file)
    ]
    if not live:
        return tuple(findings), frozenset()
    judged: list[Finding] = []
    matched: set[int] = set()
    for finding in findings:
        made, hits = _judge(finding, live, as_of)
        matched |= hits
        free: list[Finding] = []
        kept: list[Finding] = []
        for consequence in finding.consequences:
            inner, hits = _judge(consequence, live, as_of)
            matched |= hits
            accepted_alone = made.waiver is not None and inner.waiver is None
            (free if accepted_alone else kept).append(inner)
        judged += [msgspec.structs.replace(made, consequences=tuple(kept)), *free]
    return tuple(sorted(judged, key=order)), frozenset(matched)


def stale(
    settings: Settings, matched: Iterable[int], decks: Sequence[str] = ()
) -> tuple[Finding, ...]:
    """Return a remark for each waiver that matched nothing over a whole run.

    matched  indexes that matched in any deck
    decks    paths of all decks of the run; a waiver for files none of them is among is left out,
             as nothing was seen that it could match. Without decks every waiver is judged.
    """
    if STALE in settings.rules_off:
        return ()
    hit = frozenset(matched)
    return tuple(
        _remark(waiver, settings)
        for index, waiver in enumerate(settings.waivers)
        if index not in hit
        and (not decks or any(_takes_in(waiver, deck, settings.file) for deck in decks))
    )


def same_designator(stated: str, written: str) -> bool:
    """Tell whether two designators are one, in the netlist's or the schematic's spelling."""
    first, second = stated.casefold(), written.casefold()
    return first == second or schematic_name(first) == schematic_name(second)


def _judge(
    finding: Finding, waivers: Sequence[tuple[int, Waiver]], as_of: dt.date
) -> tuple[Finding, set[int]]:
    """Mark one finding, or say in its message why a waiver that names it does not hold."""
    hits = [(index, waiver) for index, waiver in waivers if _names(waiver, finding)]
    reasons = [(waiver, _fails(waiver, finding, as_of)) for _, waiver in hits]
    matched = {index for index, _ in hits}
    holding = next((waiver for waiver, reason in reasons if not reason), None)
    if holding is not None:
        note = WaiverNote(
            reason=holding.reason,
            by=holding.by,
            until=holding.until.isoformat() if holding.until else "",
            location=holding.location,
        )
        return msgspec.structs.replace(finding, waiver=note), matched
    if reasons:
        message = f"{finding.message} {reasons[0][1]}"
        return msgspec.structs.replace(finding, message=message), matched
    return finding, matched


def _names(waiver: Waiver, finding: Finding) -> bool:
    if waiver.rule != finding.rule:
        return False
    by_name = not waiver.designator or any(
        same_designator(waiver.designator, written) for written in finding.designators
    )
    net = waiver.net.casefold()
    return by_name and (not net or any(net == written.casefold() for written in finding.nets))


def _fails(waiver: Waiver, finding: Finding, as_of: dt.date) -> str:
    """Say why a waiver that names a finding does not hold, or "" where it does."""
    about = f"The waiver{_at(waiver.location)} ({waiver.reason})"
    if waiver.until is not None and as_of > waiver.until:
        return f"{about} expired on {waiver.until.isoformat()}."
    if waiver.accepted is None:
        return ""
    accepted = si(waiver.accepted, finding.unit)
    if finding.margin is None:
        return f"{about} accepts a margin of {accepted}, and this finding has none to compare."
    if finding.margin < waiver.accepted - _SAME_MARGIN * abs(waiver.accepted):
        now = si(finding.margin, finding.unit)
        return f"{about} accepts a margin of {accepted}, and it is {now} now."
    return ""


def _remark(waiver: Waiver, settings: Settings) -> Finding:
    subject = " and ".join(filter(None, (waiver.designator, waiver.net and f"net {waiver.net}")))
    on = f" on {subject}" if subject else ""
    files = f" in {waiver.file}" if waiver.file else ""
    off = waiver.rule in settings.rules_off
    return Finding(
        rule=STALE,
        family="netlist",
        severity=settings.severities.get(STALE, "remark"),
        designators=(waiver.designator,) if waiver.designator else (),
        nets=(waiver.net,) if waiver.net else (),
        basis=("user",),
        message=(
            f"The waiver of {waiver.rule}{on}{files} ({waiver.reason}) matches no finding of this "
            f"run{', as the rule is switched off' if off else ''}."
        ),
        remedy="Remove it, or correct its rule, designator, net or file.",
        source="common practice, no source",
        location=waiver.location,
    )


def _at(place: Location | None) -> str:
    return f" of {place}" if place else ""


def _takes_in(waiver: Waiver, deck_path: str, settings_file: str) -> bool:
    """Tell whether a deck is among the files a waiver is for."""
    if not waiver.file:
        return True
    try:
        relative = os.path.relpath(deck_path, Path(settings_file).parent)
    except ValueError:
        # on Windows there is no way from one drive to another
        return False
    pattern = waiver.file.replace("\\", "/").split("/")
    return _path_matches(relative.replace(os.sep, "/").split("/"), pattern)


def _path_matches(path: Sequence[str], pattern: Sequence[str]) -> bool:
    """Match step by step: `*` stays within a folder, `**` stands for any number of folders."""
    reached = {0}
    for step in pattern:
        if step == "**":
            reached = set(range(min(reached, default=len(path) + 1), len(path) + 1))
        else:
            reached = {at + 1 for at in reached if at < len(path) and fnmatchcase(path[at], step)}
    return len(path) in reached
