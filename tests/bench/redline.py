"""Redline over the fault suite: what is proposed, whether it cures, whether it brings anything new.

    python tests/bench/redline.py [EVERY] [START]

Every proposal's edits are made in the faulty netlist's text and the text is reviewed again, apart
from the proof the redline made itself. A finding counts as one a card can cure unless
`redline.reach.no_card` says why none can; those are listed by reason.
"""

import sys
import time
from collections import Counter, defaultdict

from railguard.redline.proof import every
from railguard.redline.propose import causes, proposals
from railguard.redline.reach import no_card
from railguard.redline.source import of_text
from railguard.reviewing import review_deck
from railguard.rules.registry import RULES
from railguard.settings.model import Settings
from tests.faults.suite import cases

SHOWN = 40
LOOKS_AT = {rule.name: rule.looks_at for rule in RULES}


def is_one(before, now):
    """Tell whether a finding was there before: the same rule on the same subject or a wider one."""
    if before.rule != now.rule or not set(now.designators) <= set(before.designators):
        return False
    return before.family == now.family and (
        before.nets == now.nets or LOOKS_AT[now.rule] in ("stage", "design")
    )


def main(step: int = 29, start: int = 0) -> None:
    """Print the table."""
    began = time.perf_counter()
    total, cured, wrong = Counter(), Counter(), []
    excluded: dict[str, Counter[str]] = defaultdict(Counter)
    missing = []
    decks = made = 0
    for case in cases(every=step, start=start):
        source = of_text(case.faulty)
        review, _ = review_deck(source.deck(), Settings())
        found = proposals(review, source)
        decks += 1
        before = tuple(every(review.findings))
        gone = set()
        for proposal in found:
            made += 1
            after, _ = review_deck(source.patched(proposal.edits).deck(), Settings())
            now = tuple(every(after.findings))
            stays = any(is_one(proposal.finding, f) for f in now)
            seen = (*before, *proposal.uncovered)
            if stays or any(not any(is_one(b, f) for b in seen) for f in now):
                wrong.append((case.name, proposal.what))
            gone |= {(c.rule, c.designators, c.nets) for c in proposal.cures}
        for finding in causes(review):
            reason = no_card(finding, review.design)
            hit = (finding.rule, finding.designators, finding.nets) in gone
            if reason and not hit:
                excluded[finding.rule][reason.split(" (")[0]] += 1
                continue
            total[finding.rule] += 1
            cured[finding.rule] += hit
            if not hit:
                missing.append(f"{case.name}: {finding.rule}, {finding.message[:90]}")
    for rule in sorted(total):
        print(f"{rule:32}{total[rule]:5}{cured[rule]:5}")
    every_one, all_cured = sum(total.values()), sum(cured.values())
    share = all_cured / every_one if every_one else 1.0
    print(
        f"{decks} decks, {every_one} findings a card can cure, "
        f"{all_cured} with a proposal: {share:.1%}"
    )
    print(f"{made} proposals, {len(wrong)} that do not cure or bring something new")
    for name, what in wrong[:SHOWN]:
        print(f"  wrong: {name}: {what}")
    print("No card, by reason:")
    for rule in sorted(excluded):
        for reason, count in excluded[rule].most_common():
            print(f"  {rule:32}{count:5}  {reason}")
    print("Without a proposal:")
    for line in missing[:SHOWN]:
        print(f"  {line}")
    print(f"{time.perf_counter() - began:.0f} s")


if __name__ == "__main__":
    main(*map(int, sys.argv[1:3]))
