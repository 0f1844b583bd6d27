"""The JUnit XML report: a suite a netlist, a case a rule and what it looked at.

A case fails where a finding stands at or above the hold level, and is skipped where nothing could
be judged; whatever stands below the level is written into a case that passes. So a suite has a
failure exactly where its netlist is on hold. No times and no host: the same netlists give the same
bytes.
"""

from pathlib import Path
from xml.etree import ElementTree as Xml

from railguard.notices import NotChecked
from railguard.report import words
from railguard.report.cases import Case, Told, cases
from railguard.report.escaping import xml
from railguard.report.places import from_root
from railguard.reviewing import DesignReview, Review
from railguard.rules.finding import Finding
from railguard.words import at_or_above


def document(review: Review, root: Path | None = None) -> bytes:
    """Return the report as UTF-8, indented, ending in a newline.

    root  the run's root, from which netlists are named; None: the current folder
    """
    base = root or Path.cwd()
    top = Xml.Element("testsuites", name="railguard")
    for design in review.designs:
        top.append(_suite(design, review, base))
    if review.findings:
        top.append(_run(review, base))
    for count in ("tests", "failures", "errors", "skipped"):
        top.set(count, str(sum(int(suite.get(count, "0")) for suite in top)))
    Xml.indent(top, " ")
    return bytes(Xml.tostring(top, encoding="utf-8", xml_declaration=True)) + b"\n"


def _suite(design: DesignReview, review: Review, root: Path) -> Xml.Element:
    name = xml(from_root(design.path, root))
    suite = Xml.Element("testsuite", name=name)
    facts = Xml.SubElement(suite, "properties")
    for fact, value in (
        ("verdict", design.verdict),
        ("kind", design.design.kind),
        ("sha256", design.design.circuit.sha256),
    ):
        Xml.SubElement(facts, "property", name=fact, value=value)
    required = frozenset(design.open_though_required())
    made = [_case(case, name, design, required, root) for case in cases(design, review.extra_rules)]
    _count(suite, made)
    return suite


def _run(review: Review, root: Path) -> Xml.Element:
    """Return the suite of what concerns the run itself, which holds no netlist."""
    suite = Xml.Element("testsuite", name=words.RUN)
    made = []
    for finding in review.findings:
        subject = ", ".join((*finding.designators, *finding.nets))
        case = Xml.Element("testcase", classname=words.RUN, name=xml(f"{finding.rule} {subject}"))
        Xml.SubElement(case, "system-out").text = _told(Told(finding), root)
        made.append(case)
    _count(suite, made)
    return suite


def _count(suite: Xml.Element, made: list[Xml.Element]) -> None:
    """Add cases to a suite with their counts; names that stand twice are numbered."""
    seen: dict[str, int] = {}
    for case in made:
        name = case.get("name", "")
        seen[name] = seen.get(name, 0) + 1
        if seen[name] > 1:
            case.set("name", f"{name} [{seen[name]}]")
    suite.set("tests", str(len(made)))
    suite.set("failures", str(sum(case.find("failure") is not None for case in made)))
    suite.set("errors", "0")
    suite.set("skipped", str(sum(case.find("skipped") is not None for case in made)))
    suite.extend(made)


def _case(
    case: Case, suite: str, design: DesignReview, required: frozenset[NotChecked], root: Path
) -> Xml.Element:
    holding = design.design.settings.hold_at
    shown = Xml.Element("testcase", classname=suite, name=xml(f"{case.rule} {case.subject}"))
    failing = [
        told
        for told in case.told
        if told.finding.waiver is None and at_or_above(told.finding.severity, holding)
    ]
    place = next((t.finding.location for t in (*failing, *case.told) if t.finding.location), None)
    if place is not None:
        shown.set("file", xml(from_root(place.file, root)))
        shown.set("line", str(place.line))
    missing = [note for note in case.missed if note in required]
    open_points = "\n".join(xml(f"{n.why}. {words.ADD}: {n.add}") for n in case.missed)
    if failing:
        worst = failing[0].finding
        failure = Xml.SubElement(shown, "failure", type=worst.severity, message=xml(worst.message))
        failure.text = "\n\n".join(_told(told, root) for told in failing)
    elif missing:
        what = f"This family must not stay open, and it does: {missing[0].why}."
        Xml.SubElement(shown, "failure", type="open", message=xml(what)).text = open_points
    elif case.missed:
        why = xml(f"{words.NOT_CHECKED}: {case.missed[0].why}")
        Xml.SubElement(shown, "skipped", message=why).text = open_points
    rest = [told for told in case.told if told not in failing]
    if rest:
        Xml.SubElement(shown, "system-out").text = "\n\n".join(_told(told, root) for told in rest)
    return shown


def _told(told: Told, root: Path) -> str:
    """Return a finding as lines: what, remedy, reason, place, waiver, cause."""
    finding = told.finding
    lines = [
        f"{finding.severity}: {finding.message}",
        f"{words.FIT}: {finding.remedy}" if finding.remedy else "",
        f"{words.SOURCE}: {finding.source}" if finding.source else "",
        f"Line {finding.location.line} of {from_root(finding.location.file, root)}"
        if finding.location
        else "",
        _waived(finding),
        f"It follows from {told.cause.rule}: {told.cause.message}" if told.cause else "",
    ]
    return "\n".join(xml(line) for line in lines if line)


def _waived(finding: Finding) -> str:
    note = finding.waiver
    return f"{words.WAIVED}: {words.waiver(note)}" if note is not None else ""
