"""What a review says of a case: whether the fault is told, and told once."""

from collections.abc import Iterable, Iterator
from typing import NamedTuple

from railguard.reviewing import DesignReview, review
from railguard.rules.finding import Finding
from railguard.words import at_or_above
from tests.faults.suite import Case


class Told(NamedTuple):
    """What was said of one faulty netlist.

    found   a rule of the case names who is at fault
    held    one of those findings is major at least, or hangs under one that is
    causes  top-level findings of critical or major
    every   all findings, consequences too
    """

    found: bool
    held: bool
    causes: tuple[Finding, ...]
    every: tuple[Finding, ...]


def flat(findings: Iterable[Finding]) -> Iterator[Finding]:
    """Yield findings and what follows from them."""
    for finding in findings:
        yield finding
        yield from flat(finding.consequences)


def reviewed(text: str) -> DesignReview:
    """Review a netlist's text by the rules of the house alone."""
    return review(text, plugins=False).designs[0]


def loud(design: DesignReview) -> tuple[Finding, ...]:
    """Return the top-level findings that hold a design."""
    return tuple(f for f in design.findings if at_or_above(f.severity, "major"))


def names(finding: Finding) -> set[str]:
    """Return what a finding names, in small letters."""
    return {n.casefold() for n in (*finding.designators, *finding.nets)}


def told(case: Case) -> Told:
    """Review the faulty netlist of a case."""
    design = reviewed(case.faulty)
    who = {w.casefold() for w in case.who}
    open_points = {(n.rule, n.subject.casefold()) for n in design.not_checked}

    def tells(finding: Finding) -> bool:
        return any(f.rule in case.rules and names(f) & who for f in flat([finding]))

    telling = [f for f in design.findings if tells(f)]
    # A device nobody knows is told where it is listed as not checked.
    listed = any(("netlist-device-unknown", w) in open_points for w in who)
    return Told(
        found=bool(telling) or (listed and "netlist-device-unknown" in case.rules),
        held=any(at_or_above(f.severity, "major") for f in telling),
        causes=loud(design),
        every=tuple(flat(design.findings)),
    )
