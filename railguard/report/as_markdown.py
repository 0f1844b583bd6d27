"""The Markdown report: for a pull request's comment or a ticket.

CommonMark with tables, no HTML. A comment has an end: what does not fit is left out worst last, and
the report says how much that was. Text from a netlist stands for itself and links to nothing.
"""

from collections.abc import Iterable
from pathlib import Path

from railguard.report import words
from railguard.report.escaping import markdown
from railguard.report.grouping import blocks, open_groups
from railguard.report.places import from_root
from railguard.report.visible import shortened
from railguard.reviewing import DesignReview, Review
from railguard.rules.finding import Finding
from railguard.words import SEVERITIES

ROOM = 60_000
"""Characters; the comments of some forges end at 65,536."""

ROWS = 250
"""Netlists in the table of a report on many."""

DETAILED = 12
"""With more netlists than this, only those on hold are shown in full."""

_CLOSING = 1_000
"""Characters kept for the last lines."""


def document(review: Review, root: Path | None = None) -> bytes:
    """Return the report as UTF-8, ending in a newline.

    root  the run's root, from which netlists are named; None: the current folder
    """
    page = _Page(root or Path.cwd())
    designs = sorted(review.designs, key=words.rank)
    held = sum(design.verdict == "hold" for design in designs)
    if len(designs) == 1:
        page.add(f"## railguard: {designs[0].verdict}")
    else:
        page.add(f"## railguard: {held} of {words.plural(len(designs), 'netlist')} on hold")
        page.table(designs)
    if len(designs) > DETAILED:
        shown = min(held, DETAILED)
        page.add(words.left_to_the_table(len(designs), held, shown))
        designs = designs[:shown]
    for design in designs:
        page.design(design)
    if review.findings:
        page.add(f"### {words.RUN}")
        for finding in review.findings:
            page.finding(finding, "")
    return page.closed()


def _clean(text: str) -> str:
    return markdown(shortened(text))


class _Page:
    """Blocks of lines, as many as there is room for."""

    def __init__(self, root: Path) -> None:
        self.root = root
        self.blocks: list[str] = []
        self.room = ROOM - _CLOSING
        self.findings_out = 0
        self.netlists_out = 0

    def add(self, block: str) -> bool:
        """Add a block where it fits; blocks stand apart by an empty line.

        Once one did not fit nothing is added any more, so that no small block stands where a
        worse one was left out.
        """
        if len(block) + 2 > self.room:
            self.room = 0
            return False
        self.blocks.append(block)
        self.room -= len(block) + 2
        return True

    def closed(self) -> bytes:
        out = []
        if self.findings_out:
            out.append(words.plural(self.findings_out, "finding"))
        if self.netlists_out:
            out.append(f"all of {words.plural(self.netlists_out, 'netlist')}")
        if out:
            self.blocks.append(
                f"Left out for want of room: {' and '.join(out)}. The reports in other formats "
                "hold everything."
            )
        self.blocks.append(words.CAUTION)
        return ("\n\n".join(self.blocks) + "\n").encode()

    def name(self, path: str) -> str:
        return _clean(from_root(path, self.root))

    # ------------------------------------------------------------------- parts

    def table(self, designs: list[DesignReview]) -> None:
        """Add one row a netlist, the worst first."""
        rows = [
            f"| verdict | {' | '.join(SEVERITIES)} | open | netlist |",
            f"|{' --- |' * (len(SEVERITIES) + 3)}",
        ]
        for design in designs[:ROWS]:
            found = words.counts(design.findings)
            numbers = " | ".join(str(found[s] or "") for s in SEVERITIES)
            rows.append(
                f"| {design.verdict} | {numbers} | {design.open or ''} | {self.name(design.path)} |"
            )
        while sum(map(len, rows)) > self.room // 2:
            rows = rows[: len(rows) * 3 // 4]
        self.add("\n".join(rows))
        shown = len(rows) - 2
        if shown < len(designs):
            self.add(
                f"And {words.plural(len(designs) - shown, 'netlist')} more, none of them worse."
            )

    def design(self, design: DesignReview) -> None:
        """Add one netlist: findings by stage, then what stayed open, what is waived."""
        what = f"{words.verdict(design)} It is {_clean(words.kind(design))}."
        if not self.add(f"### {self.name(design.path)}\n\n{what}"):
            self.netlists_out += 1
            return
        stages = {stage.designator: stage for stage in design.design.stages}
        for subject, findings in blocks(design):
            stage = stages.get(subject)
            title = f"**{_clean(subject if stage is None else words.name(stage))}**"
            about = f", {_clean(words.heading(stage))}" if stage is not None else ""
            self.block(f"{title}{about}", findings, design.path)
        self.listing(
            f"{words.NOT_CHECKED} ({len(design.not_checked)})",
            [
                f"- {_clean(words.open_point(group))} {words.ADD}: {_clean(group.add)}"
                for group in open_groups(design.not_checked, design.design.stages)
            ],
        )
        waived = [finding for finding in design.findings if finding.waiver is not None]
        self.listing(f"{words.WAIVED} ({len(waived)})", [_waived(finding) for finding in waived])

    def block(self, title: str, findings: list[Finding], deck: str) -> None:
        """Add a stage's heading with its first finding, and the other findings behind it."""
        first, *rest = findings
        if not self.add(f"{title}\n\n{_finding(first, deck)}"):
            self.findings_out += len(findings)
            return
        for finding in rest:
            self.finding(finding, deck)

    def finding(self, finding: Finding, deck: str) -> None:
        if not self.add(_finding(finding, deck)):
            self.findings_out += 1

    def listing(self, title: str, items: Iterable[str]) -> None:
        """Add a list under its title, as much of it as fits."""
        lines = list(items)
        if not lines:
            return
        shown = len(lines)
        while shown > 1 and sum(map(len, lines[:shown])) > self.room // 2:
            shown //= 2
        self.add(_listed(title, lines[:shown], len(lines) - shown))


def _listed(title: str, lines: list[str], more: int) -> str:
    rest = [f"- and {more} more, left out for want of room"] if more else []
    return "\n".join([f"{title}:", "", *lines, *rest])


def _finding(finding: Finding, deck: str) -> str:
    """Return a finding as an item of a list, its remedy and reason below it."""
    place = _clean(words.place(finding.location, deck))
    about = f"{_clean(finding.rule)}{place}"
    lines = [f"- **{finding.severity}**: {_clean(finding.message)} ({about})"]
    if finding.remedy:
        lines.append(f"  - {words.FIT}: {_clean(finding.remedy)}")
    if finding.source:
        lines.append(f"  - {words.SOURCE}: {_clean(finding.source)}")
    lines += _follows(finding, "  ")
    return "\n".join(lines)


def _follows(finding: Finding, indent: str) -> Iterable[str]:
    for inner in finding.consequences:
        told = f"{_clean(inner.message)} ({inner.severity}, {_clean(inner.rule)})"
        yield f"{indent}- {words.FOLLOWS} {told}"
        yield from _follows(inner, f"{indent}  ")


def _waived(finding: Finding) -> str:
    told = words.waiver(finding.waiver) if finding.waiver is not None else ""
    about = ", ".join(finding.designators) or ", ".join(finding.nets)
    return f"- {_clean(about)}: {_clean(told)} ({finding.severity}, {_clean(finding.rule)})"
