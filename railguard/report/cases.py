"""Every judgement of a design: a rule and the subject it looked at, with what came of it.

What a rule looks at comes from the registry; findings and open points are laid to the subject they
name. One that names none of them is a judgement of its own.
"""

from collections.abc import Iterable

import msgspec

from railguard.notices import NotChecked
from railguard.reviewing import DesignReview
from railguard.rules.finding import Finding
from railguard.rules.protocol import Rule
from railguard.rules.registry import RULES, subjects_of

WHOLE = "the netlist"


class Told(msgspec.Struct, frozen=True):
    """A finding, and the one it follows from where it is a consequence."""

    finding: Finding
    cause: Finding | None = None


class Case(msgspec.Struct):
    """One judgement."""

    rule: str
    subject: str
    told: list[Told] = []
    missed: list[NotChecked] = []


def cases(design: DesignReview, extra: Iterable[Rule] = ()) -> list[Case]:
    """Return the judgements of a design, rule by rule in the registry's order.

    extra  rules of other packages that ran
    """
    found: dict[tuple[str, str], Case] = {}
    ran = frozenset(design.rules)
    for rule in (*RULES, *extra):
        if rule.name in ran:
            for subject in subjects_of(rule, design.design):
                _case(found, rule.name, _name(subject))
    for told in flat(design.findings):
        finding = told.finding
        for name in _subjects(found, finding.rule, (*finding.designators, *finding.nets)):
            _case(found, finding.rule, name).told.append(told)
    for note in design.not_checked:
        for name in _subjects(found, note.rule, (note.subject,)):
            _case(found, note.rule, name).missed.append(note)
    named = {case.rule for case in found.values() if case.subject != WHOLE}
    # A rule on the whole netlist that spoke of elements by name has no more to say of the whole.
    return [
        case
        for case in found.values()
        if case.subject != WHOLE or case.told or case.missed or case.rule not in named
    ]


def _case(found: dict[tuple[str, str], Case], rule: str, subject: str) -> Case:
    return found.setdefault((rule, subject), Case(rule, subject))


def _name(subject: object) -> str:
    for field in ("designator", "net"):
        if (name := getattr(subject, field, "")) != "":
            return str(name)
    return WHOLE


def flat(findings: Iterable[Finding], cause: Finding | None = None) -> Iterable[Told]:
    """Yield findings and all that follows from them, each with its first cause."""
    for finding in findings:
        yield Told(finding, cause)
        yield from flat(finding.consequences, cause or finding)


def _subjects(
    found: dict[tuple[str, str], Case], rule: str, names: tuple[str, ...]
) -> tuple[str, ...]:
    """Return the subjects of a rule among some names; where none is one, a name of its own."""
    known = tuple(name for name in dict.fromkeys(names) if (rule, name) in found)
    return known or (", ".join(name for name in names if name) or WHOLE,)
