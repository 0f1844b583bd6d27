"""A slice of the fault suite: every proposal cures its finding without a new one.

The whole is in tests/bench/redline.py.
"""

import pytest

from railguard.redline.proof import every
from railguard.redline.propose import causes, proposals
from railguard.redline.reach import no_card
from railguard.redline.source import of_text
from railguard.reviewing import review_deck
from railguard.rules.registry import RULES
from railguard.settings.model import Settings
from tests.faults.suite import cases

SLICE = list(cases(every=311, start=3))
LOOKS_AT = {rule.name: rule.looks_at for rule in RULES}
WANTED = 0.90
"""Share of the findings a card can cure that get a proposal."""


def reviewed(source):
    """Review a deck by the rules of the house alone."""
    return review_deck(source.deck(), Settings())[0]


def is_one(before, now):
    """Tell whether a finding was there before: the same rule on the same subject or a wider one."""
    if before.rule != now.rule or not set(now.designators) <= set(before.designators):
        return False
    return before.nets == now.nets or LOOKS_AT[now.rule] in ("stage", "design")


@pytest.fixture(scope="module")
def answered():
    """Review each case and ask for its proposals."""
    found = []
    for case in SLICE:
        source = of_text(case.faulty)
        review = reviewed(source)
        found.append((case, source, review, proposals(review, source)))
    return found


def test_every_proposal_cures_and_brings_nothing_new(answered):
    """The edits are made here, and the text reviewed again."""
    made = 0
    for case, source, review, found in answered:
        before = tuple(every(review.findings))
        for proposal in found:
            made += 1
            now = tuple(every(reviewed(source.patched(proposal.edits)).findings))
            assert not any(is_one(proposal.finding, f) for f in now), (case.name, proposal.what)
            seen = (*before, *proposal.uncovered)
            new = [f for f in now if not any(is_one(b, f) for b in seen)]
            assert not new, (case.name, proposal.what, new[0].message)
    assert made > len(SLICE) / 3


def test_most_findings_a_card_can_cure_have_a_proposal(answered):
    """Nine in ten at least."""
    curable = cured = 0
    for _, _, review, found in answered:
        gone = [f for proposal in found for f in proposal.cures]
        for finding in causes(review):
            hit = any(finding == f for f in gone)
            if hit or not no_card(finding, review.design):
                curable += 1
                cured += hit
    assert cured >= WANTED * curable
