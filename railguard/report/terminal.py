"""The report on the terminal: a block for each stage that has something to say, worst first.

Colour is a second cue only: every severity is a word. In a pipe it is plain text of 80 columns.
Text from a netlist is shown as it is, never interpreted.
"""

import io
import textwrap
from collections.abc import Iterable
from typing import IO

from rich.console import Console
from rich.text import Text

from railguard.analysis.stage import Stage
from railguard.report import words
from railguard.report.scale import ASCII as ASCII_MARKS
from railguard.report.scale import MEANINGS, Line, Role, Scale, draw, input_scale, output_scale
from railguard.report.scale import UNICODE as UNICODE_MARKS
from railguard.report.visible import encodable, shortened, visible
from railguard.review import DesignReview, Review
from railguard.rules.finding import Finding
from railguard.rules.registry import RULES
from railguard.words import SEVERITIES

NARROWEST, WIDEST = 60, 160
DETAILED_FILES = 12
"""With more files than this, only those that are held are shown in full."""

_STYLES = {"critical": "bold magenta", "major": "bold yellow", "minor": "cyan", "remark": "dim"}
_MARKS: dict[Role, str] = {
    "asked-beyond": "bold magenta",
    "asked-typical": "yellow",
    "asked-sure": "bold",
    "asked-unknown": "bold",
}
_REASONS = {rule.name: rule.reason for rule in RULES}
_OUTPUT_FAMILIES = frozenset(
    {"headroom-output", "headroom-stuck", "headroom-load", "drive-current"}
)


def terminal(review: Review, stream: IO[str] | None) -> bytes:
    """Print a review.

    stream   where to; None: nothing is printed and the plain text of 80 columns is returned
    """
    out = io.StringIO() if stream is None else stream
    console = Console(
        file=out,
        highlight=False,
        markup=False,
        emoji=False,
        width=80 if stream is None or not out.isatty() else None,
    )
    _Printer(console, getattr(out, "encoding", None) or "utf-8").run(review)
    return out.getvalue().encode() if isinstance(out, io.StringIO) else b""


class _Printer:
    def __init__(self, console: Console, encoding: str) -> None:
        self.console = console
        self.width = min(max(console.width, NARROWEST), WIDEST)
        self.encoding = encoding
        self.ascii = encodable("━┃◆Ω", encoding) != "━┃◆Ω"
        self.explained: set[str] = set()
        self.roles: set[Role] = set()

    def run(self, review: Review) -> None:
        if len(review.designs) > 1:
            self.table(review)
        shown = review.designs
        if len(shown) > DETAILED_FILES:
            shown = tuple(d for d in shown if d.verdict == "hold")
        for design in shown:
            self.design(design)
        for finding in review.findings:
            self.finding(finding, 0)
        if len(review.designs) > 1:
            held = sum(d.verdict == "hold" for d in review.designs)
            self.line(f"{words.plural(len(review.designs), 'netlist')}, {held} on hold.", "bold")
        self.legend()
        self.paragraph(words.CAUTION, 0, style="dim")

    # ------------------------------------------------------------------ text

    def clean(self, text: str) -> str:
        return encodable(shortened(visible(text)), self.encoding)

    def line(self, text: str, style: str = "") -> None:
        self.console.print(Text(text, style=style), soft_wrap=True)

    def paragraph(self, text: str, indent: int, label: str = "", style: str = "") -> None:
        """Print wrapped text, its label hanging before it."""
        lead = " " * indent + (f"{label:<8}" if label else "")
        wrapped = textwrap.wrap(
            self.clean(text),
            self.width,
            initial_indent=lead,
            subsequent_indent=" " * len(lead),
            break_on_hyphens=False,
        )
        for number, row in enumerate(wrapped):
            made = Text(row, style=style)
            if label and number == 0:
                made.stylize("dim", indent, indent + len(label))
            self.console.print(made, soft_wrap=True)

    # ------------------------------------------------------------------ parts

    def table(self, review: Review) -> None:
        """Print one row a netlist, worst first."""
        order = {"hold": 0, "incomplete": 1, "pass": 2}
        rows = sorted(
            review.designs,
            key=lambda d: (order[d.verdict], *(-words.counts(d.findings)[s] for s in SEVERITIES)),
        )
        widest = min(max(len(self.clean(d.path)) for d in rows), self.width - 50)
        head = f"{'netlist':<{widest}}  verdict     critical  major  minor  remark  open"
        self.line(head, "bold")
        for design in rows:
            name = self.clean(design.path)
            name = name if len(name) <= widest else "..." + name[-(widest - 3) :]
            found = words.counts(design.findings)
            numbers = "  ".join(
                f"{found[s] or '':>{w}}" for s, w in zip(SEVERITIES, (8, 5, 5, 6), strict=True)
            )
            self.line(f"{name:<{widest}}  {design.verdict:<10}  {numbers}  {design.open or '':>4}")
        self.line("")

    def design(self, review: DesignReview) -> None:
        self.line(self.clean(review.path), "bold underline")
        found = words.count_words(review.findings).capitalize()
        covered = f"{review.judged} judged, {review.open} not checked"
        self.paragraph(f"{found}; {covered}; {words.kind(review)}.", 0)
        self.line("")
        stages = {s.designator: s for s in review.design.stages}
        for subject, findings in _blocks(review, stages):
            self.block(subject, findings, stages)
        self.not_checked(review)
        self.waived(review)
        self.reading(review)
        self.settings(review)
        style = _STYLES["critical"] if review.verdict == "hold" else "bold"
        self.paragraph(words.verdict(review), 0, style=style)
        self.line("")

    def block(self, subject: str, findings: list[Finding], stages: dict[str, Stage]) -> None:
        stage = stages.get(subject)
        if stage is None:
            self.line(self.clean(subject), "bold")
        else:
            title = Text(self.clean(f"{stage.schematic}  "), style="bold")
            title.append(self.clean(words.heading(stage)), style="not bold")
            for row in title.wrap(self.console, self.width):
                self.console.print(row)
            self.scales(stage, findings)
        for finding in findings:
            self.finding(finding, 2)
        self.line("")

    def scales(self, stage: Stage, findings: list[Finding]) -> None:
        everything = [inner for finding in findings for inner in _all(finding)]
        worst = all(f.corner == "worst-case" for f in everything)
        rules = {f.rule for f in everything}
        if rules & _OUTPUT_FAMILIES or not any(r.startswith("headroom-input") for r in rules):
            self.scale(output_scale(stage, worst=worst and bool(rules & _OUTPUT_FAMILIES)))
        if any(r.startswith("headroom-input") for r in rules):
            self.scale(input_scale(stage, worst=worst))

    def scale(self, scale: Scale | None) -> None:
        if scale is None or scale.asked.low is None:
            return
        lines = draw(scale, self.width - 10, ascii_only=self.ascii)
        for number, line in enumerate(lines):
            if not line:
                continue
            row = Text(f"  {scale.name if number == 1 else '':<8}", style="dim")
            row.append_text(self.spans(line))
            self.console.print(row, soft_wrap=True)

    def spans(self, line: Line) -> Text:
        row = Text()
        for text, role in line:
            self.roles.add(role)
            row.append(encodable(text, self.encoding), style=_MARKS.get(role, ""))
        return row

    def finding(self, finding: Finding, indent: int) -> None:
        place = f", line {finding.location.line}" if finding.location is not None else ""
        head = Text(" " * indent)
        head.append(finding.severity, style=_STYLES[finding.severity])
        head.append(f"  {finding.rule}{place}", style="dim")
        self.console.print(head, soft_wrap=True)
        self.paragraph(finding.message, indent + 2)
        if finding.remedy:
            self.paragraph(finding.remedy, indent + 2, words.FIT)
        reason = _REASONS.get(finding.rule, "")
        if reason and finding.rule not in self.explained:
            self.explained.add(finding.rule)
            self.paragraph(f"{reason} ({finding.source})", indent + 2, words.WHY)
        elif finding.source:
            self.paragraph(finding.source, indent + 2, words.SOURCE)
        if finding.consequences:
            self.paragraph(words.FOLLOWS, indent + 2)
            for inner in finding.consequences:
                self.paragraph(f"{inner.message} ({inner.severity}, {inner.rule})", indent + 4)

    def not_checked(self, review: DesignReview) -> None:
        if not review.not_checked:
            return
        grouped: dict[tuple[str, str], dict[str, list[str]]] = {}
        for note in review.not_checked:
            subjects = grouped.setdefault((note.why, note.add), {})
            subjects.setdefault(note.subject, []).append(note.rule)
        self.line(f"{words.NOT_CHECKED} ({len(review.not_checked)})", "bold")
        for (why, add), subjects in grouped.items():
            by_rules: dict[tuple[str, ...], list[str]] = {}
            for subject, rules in subjects.items():
                by_rules.setdefault(tuple(rules), []).append(subject)
            about = "; ".join(
                f"{', '.join(names)}: {', '.join(rules)}" for rules, names in by_rules.items()
            )
            self.paragraph(f"{why}.", 2)
            self.paragraph(about, 4, style="dim")
            self.paragraph(f"{words.ADD}: {add}", 4)
        self.line("")

    def waived(self, review: DesignReview) -> None:
        waived = [f for f in review.findings if f.waiver is not None]
        if not waived:
            return
        self.line(f"{words.WAIVED} ({len(waived)})", "bold")
        for finding in waived:
            note = finding.waiver
            who = f" by {note.by}" if note and note.by else ""
            until = f" until {note.until}" if note and note.until else ""
            reason = note.reason if note else ""
            about = ", ".join(finding.designators) or ", ".join(finding.nets)
            self.paragraph(f"{about}: {finding.rule} ({finding.severity}): {reason}{who}{until}", 2)
        self.line("")

    def reading(self, review: DesignReview) -> None:
        if not review.design.remarks:
            return
        self.line(words.READING, "bold")
        for remark in review.design.remarks:
            self.paragraph(remark.message, 2)
        self.line("")

    def settings(self, review: DesignReview) -> None:
        used = review.design.settings
        if not used.file and not used.rules_off:
            return
        off = f" It switches off {', '.join(used.rules_off)}." if used.rules_off else ""
        self.paragraph(f"Settings: {words.near(used.file) or 'from the command line'}.{off}", 0)

    def legend(self) -> None:
        marks = ASCII_MARKS if self.ascii else UNICODE_MARKS
        shown = [f"{marks.glyphs[r] * 2} {text}" for r, text in MEANINGS if r in self.roles]
        if shown:
            self.paragraph("Scale: " + ", ".join(shown) + ".", 0, style="dim")


def _all(finding: Finding) -> Iterable[Finding]:
    yield finding
    for inner in finding.consequences:
        yield from _all(inner)


def _blocks(review: DesignReview, stages: dict[str, Stage]) -> list[tuple[str, list[Finding]]]:
    """Group what is not waived by stage, rail and netlist, the worst block first."""
    rails = {rail.net for rail in review.design.rails}
    blocks: dict[str, list[Finding]] = {}
    for finding in review.findings:
        if finding.waiver is not None:
            continue
        blocks.setdefault(_subject(finding, stages, rails), []).append(finding)

    def weight(item: tuple[str, list[Finding]]) -> int:
        return min(SEVERITIES.index(f.severity) for f in item[1])

    return sorted(blocks.items(), key=weight)


def _subject(finding: Finding, stages: dict[str, Stage], rails: set[str]) -> str:
    if finding.family == "netlist":
        return "Netlist"
    if finding.family in ("supply", "decoupling") and finding.nets:
        on_rails = [net for net in finding.nets if net in rails]
        if len(on_rails) == 1 and len(finding.designators) != 1:
            return f"Rail {on_rails[0]}"
    known = [name for name in finding.designators if name in stages]
    if known:
        return known[0]
    if finding.designators:
        return finding.designators[0]
    return f"Rail {finding.nets[0]}" if finding.nets else "Netlist"
