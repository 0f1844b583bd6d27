"""Proposals for a reviewed design, each proved by a review of the changed deck.

`proposals` answers finding by finding against the deck as it is, for reports that offer single
fixes. `redline` lays one proposal over the other, so that its end is one deck that was reviewed
as a whole.
"""

from collections.abc import Iterable

import msgspec

from railguard.redline.advice import advise, substitutes
from railguard.redline.gain import RANGES
from railguard.redline.model import Changed, Proposal, Redline
from railguard.redline.proof import Proved, every, prove, same
from railguard.redline.scene import Candidate, Scene
from railguard.redline.source import Source, of_review
from railguard.redline.table import candidates
from railguard.redline.tags import Tagged
from railguard.reviewing import DesignReview
from railguard.rules.finding import Finding
from railguard.rules.registry import RULES

TRIED = 40
"""Reviews spent on one finding before it is left to words."""
REVIEWS = 600
"""Reviews spent on one deck; what is not tried by then is left to words, which say so."""


class _Effort:
    """Counts reviews down."""

    def __init__(self, reviews: int) -> None:
        self.left = reviews

    def spend(self) -> bool:
        """Take one review off; tell whether there was one left."""
        self.left -= 1
        return self.left >= 0


class _Cured(msgspec.Struct, frozen=True):
    proposal: Proposal
    proved: Proved
    given: tuple[str, ...]
    regains: bool


def proposals(review: DesignReview, source: Source | None = None) -> tuple[Proposal, ...]:
    """Return a proved change for each finding that has one, worst finding first.

    Each stands for itself: its edits are to be made in the deck as it was reviewed. Several may
    be made together where their edits do not overlap; `redline` proves them together.

    source  the deck's files; None: they are read again from where the review read them. Nothing is
            proposed for a text without a file, or where a file has changed since
    """
    source = source if source is not None else of_review(review)
    if source is None or not review.design.circuit.readable:
        return ()
    found: list[Proposal] = []
    names: list[str] = []
    done: list[Finding] = []
    effort = _Effort(REVIEWS)
    for finding in causes(review):
        if any(finding is d for d in done):
            continue
        cured = _cure(finding, review, source, names, effort)
        if cured is not None:
            found.append(cured.proposal)
            names += cured.given
            if len({f.rule for f in cured.proposal.cures}) == 1:
                done += cured.proposal.cures  # one change for all: decoupling of both rails
    return tuple(found)


def causes(review: DesignReview) -> tuple[Finding, ...]:
    """Return the findings to be cured: what follows from another one goes with it or stays."""
    return tuple(f for f in review.findings if f.waiver is None)


def _cure(
    finding: Finding,
    review: DesignReview,
    source: Source,
    names: Iterable[str],
    effort: _Effort,
    *,
    easing: bool = False,
) -> _Cured | None:
    """Return the first change that cures a finding; the first that eases it where none does.

    easing  True: what eases it will do
    """
    eased: _Cured | None = None
    scene = Scene(review.design, source, names)
    tried: set[tuple[object, ...]] = set()
    for candidate in candidates(finding, scene):
        if candidate.edits in tried:
            continue
        if len(tried) >= TRIED or not effort.spend():
            return eased
        tried.add(candidate.edits)
        given = tuple(scene.given)
        proved = prove(review, source, finding, candidate)
        if proved is None or (proved.left and (eased is not None or not easing)):
            continue
        made = _Cured(_proposal(finding, candidate, proved), proved, given, candidate.regains)
        if not proved.left:
            return made
        eased = made
    return eased


def _proposal(finding: Finding, candidate: Candidate, proved: Proved) -> Proposal:
    what = f"{candidate.what[:1].upper()}{candidate.what[1:]}."
    return Proposal(
        finding=finding,
        what=what,
        reason=f"{finding.rule}: {what}",
        choice=f"{candidate.choice[:1].upper()}{candidate.choice[1:]}." if candidate.choice else "",
        edits=candidate.edits,
        cures=proved.cures,
        left=proved.left,
        uncovered=proved.uncovered,
    )


def redline(review: DesignReview, source: Source | None = None) -> Redline:
    """Cure what cards can cure, one finding after the other, and advise on the rest."""
    source = source if source is not None else of_review(review)
    if source is None or not review.design.circuit.readable:
        return Redline(
            path=review.path,
            verdict=review.verdict,
            held=review.verdict == "hold",
            remaining=tuple(every(review.findings)),
            why="its files cannot be read again as they were reviewed",
        )
    rules = {r.name: r for r in RULES}
    first = tuple(every(review.findings))
    now, deck, tags = review, source, Tagged(source)
    found: list[Proposal] = []
    names: list[str] = []
    given_up: list[Finding] = []
    moved = False
    effort = _Effort(REVIEWS)
    while effort.left > 0:
        finding = next(
            (f for f in causes(now) if not any(same(f, g, rules) for g in given_up)), None
        )
        if finding is None:
            if not (given_up and moved):
                break
            given_up, moved = [], False  # what was in the way may be gone
            continue
        cured = _cure(finding, now, deck, names, effort, easing=True)
        if cured is None:
            given_up.append(finding)
            continue
        moved = True
        found.append(_with_devices(cured, now))
        names += cured.given
        tags.edit(cured.proposal.edits, cured.proposal.reason)
        now, deck = cured.proved.review, cured.proved.source
    last = tuple(every(now.findings))
    return Redline(
        path=review.path,
        verdict=now.verdict,
        held=now.verdict == "hold",
        proposals=tuple(found),
        advice=tuple(advise(f, now, tried=effort.left > 0) for f in causes(now)),
        gone=tuple(f for f in first if not any(same(f, other, rules) for other in last)),
        remaining=last,
        uncovered=tuple(f for f in last if not any(same(other, f, rules) for other in first)),
        files=_changed(source, deck, tags),
        data=tuple(deck.files.items()),
    )


def _with_devices(cured: _Cured, review: DesignReview) -> Proposal:
    """Name the devices that would do without a change that costs gain, or a source's resistance."""
    proposal = cured.proposal
    costs = proposal.finding.rule == "bias-current-error" or (
        cured.regains and proposal.finding.rule in (*RANGES, "headroom-offset")
    )
    if not costs:
        return proposal
    return msgspec.structs.replace(proposal, instead=substitutes(proposal.finding, review)[0])


def _changed(before: Source, after: Source, tags: Tagged) -> tuple[Changed, ...]:
    return tuple(
        Changed(file, before.text(file), after.text(file), tags.reasons(file))
        for file in before.files
        if before.files[file] != after.files[file]
    )
