"""The report on the terminal: a block for each stage that has something to say, worst first.

Colour is a second cue only: every severity is a word. In a pipe it is plain text of 80 columns.
Text from a netlist is shown as it is, never interpreted.
"""

import io
from collections.abc import Callable
from typing import IO

import msgspec
from rich.cells import cell_len
from rich.console import Console
from rich.text import Text

from railguard.analysis.stage import Stage
from railguard.report import words
from railguard.report.grouping import blocks, common_folder, open_groups, with_consequences
from railguard.report.scale import ASCII as ASCII_MARKS
from railguard.report.scale import MEANINGS, Line, Role, Scale, draw, input_scale, output_scale
from railguard.report.scale import UNICODE as UNICODE_MARKS
from railguard.report.visible import encodable, shortened, visible
from railguard.report.wrapping import wrapped
from railguard.reviewing import DesignReview, Review
from railguard.rules.finding import Finding
from railguard.rules.registry import RULES
from railguard.words import SEVERITIES

NARROWEST, WIDEST = 60, 160
DETAILED_FILES = 12
"""With more files than this, only those that are held are shown in full."""

DEEPEST = 24
"""Columns of a designator beside which its heading stands; behind a longer one it stands below."""

_STYLES = {"critical": "bold magenta", "major": "bold yellow", "minor": "cyan", "remark": "dim"}
_MARKS: dict[Role, str] = {
    "asked-beyond": "bold magenta",
    "asked-typical": "yellow",
    "asked-sure": "bold",
    "asked-unknown": "bold",
}
_REASONS = {rule.name: rule.reason for rule in RULES}
_OUTPUT_FAMILIES = frozenset({"headroom-output", "headroom-load", "drive-current"})


def terminal(review: Review, stream: IO[str] | None) -> bytes:
    """Print a review.

    stream   where to; None: nothing is printed and the plain text of 80 columns is returned
    """
    return _printed(stream, lambda printer: printer.run(review))


def print_on(console: Console, review: Review) -> None:
    """Print a review on a console of any kind, in its width."""
    _Printer(console, "utf-8").run(review)


def held(review: Review, stream: IO[str] | None = None) -> bytes:
    """Print only what puts designs on hold; nothing where nothing does.

    stream   as for `terminal`
    """
    return _printed(stream, lambda printer: printer.held(review))


def _printed(stream: IO[str] | None, run: Callable[["_Printer"], None]) -> bytes:
    out = io.StringIO() if stream is None else stream
    console = Console(
        file=out,
        highlight=False,
        markup=False,
        emoji=False,
        width=80 if stream is None or not out.isatty() else None,
    )
    console.size = console.size  # asked of the terminal once, not for every line
    run(_Printer(console, getattr(out, "encoding", None) or "utf-8"))
    return out.getvalue().encode() if isinstance(out, io.StringIO) else b""


class _Printer:
    def __init__(self, console: Console, encoding: str) -> None:
        self.console = console
        self.width = min(max(console.width, NARROWEST), WIDEST)
        self.encoding = encoding
        self.ascii = encodable("━┃◆Ω", encoding) != "━┃◆Ω"
        self.explained: dict[str, set[str]] = {}
        self.deck = ""
        self.roles: set[Role] = set()

    def run(self, review: Review) -> None:
        if len(review.designs) > 1:
            self.table(review)
        for design in self.in_full(review.designs):
            self.design(design)
        if review.findings:
            self.line(words.RUN, "bold")
            for finding in review.findings:
                self.finding(finding, 2)
            self.line("")
        if len(review.designs) > 1:
            held = sum(d.verdict == "hold" for d in review.designs)
            self.line(f"{words.plural(len(review.designs), 'netlist')}, {held} on hold.", "bold")
        self.legend()
        self.paragraph(words.CAUTION, 0, style="dim")

    def held(self, review: Review) -> None:
        for design in review.designs:
            if design.verdict != "hold":
                continue
            self.deck = design.path
            self.line(self.clean(design.path), "bold underline")
            stages = {s.designator: s for s in design.design.stages}
            holding = msgspec.structs.replace(
                design, findings=design.holding(), not_checked=design.open_though_required()
            )
            for subject, findings in blocks(holding):
                self.block(subject, findings, stages)
            self.not_checked(holding)
        self.legend()

    # ------------------------------------------------------------------ text

    def clean(self, text: str) -> str:
        return encodable(shortened(visible(text)), self.encoding)

    def line(self, text: str, style: str = "") -> None:
        self.console.print(Text(text, style=style), soft_wrap=True)

    def paragraph(self, text: str, indent: int, label: str = "", style: str = "") -> None:
        """Print wrapped text, its label hanging before it."""
        lead = " " * indent + (f"{label:<{max(8, len(label) + 2)}}" if label else "")
        mark = "dim" if label else ""
        whole = Text()
        for row in wrapped(self.clean(text), self.width - len(lead)):
            whole.append("\n" if whole else "")
            whole.append(lead, mark).append(row, style)
            lead, mark = " " * len(lead), ""
        if whole:
            self.console.print(whole, soft_wrap=True)

    # ------------------------------------------------------------------ parts

    def table(self, review: Review) -> None:
        """Print one row a netlist, worst first."""
        rows = sorted(review.designs, key=words.rank)
        folder, names = common_folder([design.path for design in rows])
        if folder:
            self.paragraph(f"{words.plural(len(rows), 'netlist')} in {folder}", 0)
        self.line("verdict     critical  major  minor  remark  open  netlist", "bold")
        for design, name in zip(rows, names, strict=True):
            found = words.counts(design.findings)
            numbers = "  ".join(
                f"{found[s] or '':>{w}}" for s, w in zip(SEVERITIES, (8, 5, 5, 6), strict=True)
            )
            self.line(
                f"{design.verdict:<10}  {numbers}  {design.open or '':>4}  {self.clean(name)}"
            )
        self.line("")

    def in_full(self, designs: tuple[DesignReview, ...]) -> list[DesignReview]:
        """Return the designs to show with their findings, and say which are left to the table."""
        rows = sorted(designs, key=words.rank)
        if len(rows) <= DETAILED_FILES:
            return rows
        held = [design for design in rows if design.verdict == "hold"]
        shown = held[:DETAILED_FILES]
        self.paragraph(words.left_to_the_table(len(rows), len(held), len(shown)), 0)
        self.line("")
        return shown

    def design(self, review: DesignReview) -> None:
        self.deck = review.path
        self.line(self.clean(review.path), "bold underline")
        found = words.count_words(review.findings).capitalize()
        covered = f"{review.judged} judged, {review.open} not checked"
        self.paragraph(f"{found}; {covered}; {words.kind(review)}.", 0)
        self.line("")
        stages = {s.designator: s for s in review.design.stages}
        for subject, findings in blocks(review):
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
            self.heading(stage)
            self.scales(stage, findings)
        for finding in findings:
            self.finding(finding, 2)
        self.line("")

    def heading(self, stage: Stage) -> None:
        name, about = self.clean(words.name(stage)), self.clean(words.heading(stage))
        lead = f"{name}  "
        if cell_len(lead) > DEEPEST:
            self.line(name, "bold")
            lead = "    "
        for row in wrapped(about, self.width - cell_len(lead)):
            self.console.print(Text.assemble((lead, "bold"), row), soft_wrap=True)
            lead = " " * cell_len(lead)

    def scales(self, stage: Stage, findings: list[Finding]) -> None:
        everything = list(with_consequences(findings))
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
            row = Text().append(f"  {scale.name if number == 1 else '':<8}", style="dim")
            row.append_text(self.spans(line))
            self.console.print(row, soft_wrap=True)

    def spans(self, line: Line) -> Text:
        row = Text()
        for text, role in line:
            self.roles.add(role)
            row.append(encodable(text, self.encoding), style=_MARKS.get(role, ""))
        return row

    def finding(self, finding: Finding, indent: int) -> None:
        head = Text(" " * indent)
        head.append(finding.severity, style=_STYLES[finding.severity])
        place = self.clean(words.place(finding.location, self.deck))
        head.append(f"  {finding.rule}{place}", style="dim")
        self.console.print(head, soft_wrap=True)
        self.paragraph(finding.message, indent + 2)
        if finding.remedy:
            self.paragraph(finding.remedy, indent + 2, words.FIT)
        self.reason(finding, indent + 2)
        self.consequences(finding, indent + 2)

    def reason(self, finding: Finding, indent: int) -> None:
        """Print why a rule speaks once a report, and each source of it once."""
        if finding.rule not in self.explained:
            self.explained[finding.rule] = set()
            why = f"{_REASONS.get(finding.rule, '')} {words.in_brackets(finding.source)}".strip()
            if why:
                self.paragraph(why, indent, words.WHY)
        elif finding.source and finding.source not in self.explained[finding.rule]:
            self.paragraph(finding.source, indent, words.SOURCE)
        self.explained[finding.rule].add(finding.source)

    def consequences(self, finding: Finding, indent: int) -> None:
        if not finding.consequences:
            return
        self.paragraph(words.FOLLOWS, indent)
        for inner in finding.consequences:
            self.paragraph(f"{inner.message} ({inner.severity}, {inner.rule})", indent + 2)
            self.consequences(inner, indent + 2)

    def not_checked(self, review: DesignReview) -> None:
        if not review.not_checked:
            return
        self.line(f"{words.NOT_CHECKED} ({len(review.not_checked)})", "bold")
        for group in open_groups(review.not_checked, review.design.stages):
            self.paragraph(words.open_point(group), 2)
            self.paragraph(group.add, 4, words.ADD)
        self.line("")

    def waived(self, review: DesignReview) -> None:
        waived = [f for f in review.findings if f.waiver is not None]
        if not waived:
            return
        self.line(f"{words.WAIVED} ({len(waived)})", "bold")
        for finding in waived:
            told = words.waiver(finding.waiver) if finding.waiver else ""
            about = ", ".join(finding.designators) or ", ".join(finding.nets)
            self.paragraph(f"{about}: {finding.rule} ({finding.severity}): {told}", 2)
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
        shown = [f"{marks.glyphs[r]} {text}" for r, text in MEANINGS if r in self.roles]
        line = "Scale:"
        for text in shown[:-1]:
            line = self.packed(line, f"{text};")
        if shown:
            self.line(self.packed(line, f"{shown[-1]}."), "dim")

    def packed(self, line: str, item: str) -> str:
        """Return a line with one more item, which is not broken; print what is full before it."""
        if cell_len(line) + 1 + cell_len(item) <= self.width:
            return f"{line} {item}"
        self.line(line, "dim")
        return item
