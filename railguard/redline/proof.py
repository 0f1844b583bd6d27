"""The proof of a change: the changed deck is reviewed with the full rule set and held to the old.

A change counts as a cure where its finding is gone, no finding is there that was not there before
or is worse than it was, nothing that was judged is left open, and every stage still does what it
did (its gains), unless gain is what is to be changed.

What could not be seen before is not new, and is named beside the change: what is to be said of a
stage that works for the first time, where that is milder than what kept it from working; and what a
review of the old deck says too once it is taken for what the new one is, a board or a bench.
"""

from collections.abc import Iterator

import msgspec

from railguard.analysis.stage import Design
from railguard.redline.model import Edit
from railguard.redline.scene import Candidate
from railguard.redline.source import Source
from railguard.reviewing import DesignReview, review_deck
from railguard.rules import third_party
from railguard.rules.finding import Finding
from railguard.rules.protocol import Rule
from railguard.rules.registry import RULES
from railguard.words import SEVERITIES

GAIN_KEPT = 0.05
"""Share a gain may move by where it is to stay: the step of a 5 % series, half of it either way."""
SMALL_GAIN = 1e-3
"""V/V; below it a path is leakage and may change."""


class Proved(msgspec.Struct, frozen=True):
    """A change that cures: the deck with it, its review, and the findings that are gone.

    left       what is left of the finding, milder; none where it is gone
    uncovered  what is seen only now
    """

    source: Source
    review: DesignReview
    cures: tuple[Finding, ...]
    left: tuple[Finding, ...] = ()
    uncovered: tuple[Finding, ...] = ()


def every(findings: tuple[Finding, ...]) -> Iterator[Finding]:
    """Yield findings that are not waived, and all that hang under them."""
    for finding in findings:
        if finding.waiver is None:
            yield finding
        yield from every(finding.consequences)


def same(one: Finding, other: Finding, rules: dict[str, Rule]) -> bool:
    """Tell whether two findings of two reviews are one: a stage's is known by its designator."""
    if one.rule != other.rule:
        return False
    rule = rules.get(one.rule)
    if rule is not None and rule.looks_at == "stage" and one.designators and other.designators:
        return one.designators == other.designators
    if rule is not None and rule.looks_at == "design":
        # One finding may name all elements concerned; fewer of them is the same finding.
        return set(other.designators) <= set(one.designators) and (
            bool(other.designators) or one.nets == other.nets
        )
    return one.designators == other.designators and one.nets == other.nets


def installed(review: DesignReview) -> third_party.Installed:
    """Return the rules of other packages, where the review had any."""
    own = {r.name for r in RULES}
    if all(name in own for name in review.rules):
        return third_party.Installed()
    return third_party.installed()


def changed(
    review: DesignReview, source: Source, edits: tuple[Edit, ...]
) -> tuple[Source, DesignReview] | None:
    """Make edits and review the deck; None where they cannot be made."""
    try:
        after = source.patched(edits)
    except ValueError:
        return None
    found, _ = review_deck(after.deck(), review.design.settings, installed(review))
    return after, found


def prove(
    review: DesignReview, source: Source, finding: Finding, candidate: Candidate
) -> Proved | None:
    """Review a deck with a candidate's edits; None where it is no cure.

    A range that cannot work and then can, but for a little at one end, is eased.
    """
    made = changed(review, source, candidate.edits)
    if made is None:
        return None
    after, found = made
    rules = {r.name: r for r in (*RULES, *installed(review).rules)}
    now = tuple(every(found.findings))
    left = tuple(f for f in now if same(finding, f, rules))
    if not all(_eased(finding, f) for f in left):
        return None
    if any(_fewer(finding, f) for f in now if f not in left):
        return None
    before = tuple(every(review.findings))
    woken = finding.designators if candidate.wakes else ()
    new = tuple(f for f in now if not _known(f, before, rules))
    if any(not _wakes_to(finding, f, woken) for f in new):
        alike = tuple(every(_taken_as(review, source, found).findings))
        if any(not _wakes_to(finding, f, woken) and not _known(f, alike, rules) for f in new):
            return None
    if _left_open(review, found, woken):
        return None
    if not candidate.regains and not _gains_kept(review.design, found.design):
        return None
    gone = tuple(b for b in before if not any(same(b, f, rules) for f in now))
    return Proved(after, found, gone, left, new)


def _wakes_to(finding: Finding, now: Finding, woken: tuple[str, ...]) -> bool:
    """Tell whether a finding is only a matter of a stage that works for the first time."""
    rank = SEVERITIES.index(now.severity)
    return (
        bool(now.designators)
        and set(now.designators) <= set(woken)
        and rank > SEVERITIES.index(finding.severity)
        and rank >= SEVERITIES.index("minor")
    )


def _taken_as(review: DesignReview, source: Source, other: DesignReview) -> DesignReview:
    """Return the review of a deck taken for a board or a bench, as another one is."""
    kind = other.design.kind
    if kind == review.design.kind or kind not in ("board", "bench"):
        return review
    settings = msgspec.structs.replace(review.design.settings, kind=kind)
    return review_deck(source.deck(), settings, installed(review))[0]


def _eased(before: Finding, now: Finding) -> bool:
    """Tell whether a finding on an output's range was grave and is a matter of its last end."""
    if before.rule != "headroom-output" or before.severity not in ("critical", "major"):
        return False
    return now.severity in ("minor", "remark")


def _fewer(finding: Finding, now: Finding) -> bool:
    """Tell whether a finding about several designators is there still for some of them."""
    if finding.rule != now.rule:
        return False
    places = finding.location is not None and finding.location == now.location
    return places or bool(
        set(finding.designators) & set(now.designators) and set(finding.nets) & set(now.nets)
    )


def _known(finding: Finding, before: tuple[Finding, ...], rules: dict[str, Rule]) -> bool:
    """Tell whether a finding was there before, and no milder than it is now."""
    rank = SEVERITIES.index(finding.severity)
    return any(same(b, finding, rules) and SEVERITIES.index(b.severity) <= rank for b in before)


def _left_open(before: DesignReview, after: DesignReview, woken: tuple[str, ...]) -> bool:
    """Tell whether something that was judged is not any more: silence is no cure.

    woken  stages that did not work before, of which nothing was judged
    """
    open_before = {(note.subject, note.rule) for note in before.not_checked}
    if any(
        (note.subject, note.rule) not in open_before and note.subject not in woken
        for note in after.not_checked
    ):
        return True
    names = [s.designator for s in before.design.stages]
    return names != [s.designator for s in after.design.stages]


def _gains_kept(before: Design, after: Design) -> bool:
    for old, new in zip(before.stages, after.stages, strict=True):
        if len(old.gain) != len(new.gain):
            return False
        for (_, was), (_, now) in zip(old.gain, new.gain, strict=True):
            if max(abs(was), abs(now)) > SMALL_GAIN and abs(now - was) > GAIN_KEPT * abs(was):
                return False
    return True
