"""An audit on the terminal: what would fail today, worst first, and what to do about the rest."""

import io
from collections.abc import Iterable, Iterator, Sequence
from typing import IO

from rich.console import Console
from rich.table import Table
from rich.text import Text

from railguard.audit.compare import Changed, Comparison
from railguard.audit.read import Base, Ranked, Row
from railguard.report.visible import encodable, shortened, visible
from railguard.report.words import CAUTION, plural
from railguard.report.wrapping import wrapped
from railguard.words import SEVERITIES

SHOWN = 25
"""Rows of each table; the other formats hold all of them."""


def pieces(base: Base, changes: Comparison | None, stream: IO[str] | None) -> Iterator[bytes]:
    """Print the report to `stream`, or yield it as plain text where there is none."""
    out = io.StringIO() if stream is None else stream
    console = Console(
        file=out,
        highlight=False,
        markup=False,
        emoji=False,
        width=80 if stream is None or not out.isatty() else None,
    )
    _Printer(console, getattr(out, "encoding", None) or "utf-8").run(base, changes)
    if isinstance(out, io.StringIO):
        yield out.getvalue().encode()
    else:
        out.flush()


class _Printer:
    def __init__(self, console: Console, encoding: str) -> None:
        self.console = console
        self.encoding = encoding

    def run(self, base: Base, changes: Comparison | None) -> None:
        self.summary(base)
        if changes is not None:
            self.changes(changes)
        else:
            self.ranking(base)
            self.families(base.by_family())
            self.unknown(base.unknown())
        self.not_read(base)
        self.settings(base)
        self.copies(base.copies())
        self.say(CAUTION, "dim")

    # ------------------------------------------------------------------ text

    def clean(self, text: object) -> str:
        return encodable(shortened(visible(str(text))), self.encoding)

    def say(self, text: str, style: str = "") -> None:
        self.console.print(Text(self.clean(text), style=style))

    def paragraph(self, text: str, indent: int) -> None:
        """Print wrapped text."""
        for line in wrapped(self.clean(text), self.console.width - indent):
            self.console.print(Text(" " * indent + line), soft_wrap=True)

    def table(self, title: str, heads: Sequence[str], rows: Iterable[Sequence[object]]) -> int:
        """Print a table whose columns of numbers stand to the right; return its rows."""
        made = Table(box=None, pad_edge=False, padding=(0, 2, 0, 0), header_style="dim")
        for head in heads:
            numbers = head.endswith("#")
            made.add_column(
                head.rstrip("#"),
                justify="right" if numbers else "left",
                no_wrap=numbers,
                overflow="fold",
            )
        count = 0
        for row in rows:
            made.add_row(*(Text(self.clean(cell)) for cell in row))
            count += 1
        if count:
            self.console.print(Text(title, style="bold"))
            self.console.print(made)
        return count

    def left_out(self, count: int) -> None:
        if count > SHOWN:
            self.say(f"  and {count - SHOWN} more (--as html, csv or json has them all)", "dim")
        if count:
            self.say("")

    # ------------------------------------------------------------------ parts

    def summary(self, base: Base) -> None:
        verdicts = base.verdicts()
        total = sum(verdicts.values())
        held, open_ = verdicts.get("hold", 0), verdicts.get("incomplete", 0)
        self.say(
            f"{plural(total, 'design')}: {held} on hold, {open_} incomplete,"
            f" {verdicts.get('pass', 0)} pass.",
            "bold",
        )
        also = [
            (base.count("state = 'library'"), "library", "libraries"),
            (base.count("state = 'design' AND included"), "included file", "included files"),
            (int(base.about("others") or 0), "other file", "other files"),
        ]
        words = [f"{n} {one if n == 1 else many}" for n, one, many in also if n]
        if words:
            self.say(f"Besides them {', '.join(words)}.")
        if not base.finished:
            self.say(
                "The audit was stopped before its end; run the same command to go on.",
                "bold yellow",
            )
        self.say("")

    def ranking(self, base: Base) -> None:
        """Print the worst designs with the worst finding of each as evidence."""
        failing = [
            design for design in base.ranking(SHOWN) if design.verdict != "pass" or design.critical
        ]
        if failing:
            self.say("Worst first", "bold")
        for design in failing:
            self.design(base, design)
        if failing:
            self.say("")
        held = base.verdicts().get("hold", 0)
        if held > SHOWN:
            self.left_out(held)

    def design(self, base: Base, design: Ranked) -> None:
        counts = ", ".join(
            f"{n} {word}" for word in SEVERITIES[:3] if (n := int(getattr(design, word)))
        )
        lead = f"{design.place:>4}  {design.path}"
        if design.circuit:
            lead += f" (runs {design.circuit})"
        ending = counts or f"{design.open} not checked"
        self.console.print(Text(self.clean(f"{lead}  {ending}"), style="bold"), soft_wrap=False)
        worst = next((f for f in base.findings(design.id) if not f.waived), None)
        if worst is not None and counts:
            inside = f" of {worst.file}" if worst.file != design.path else ""
            at = f", line {worst.line}{inside}" if worst.line else ""
            self.paragraph(f"{worst.severity}: {worst.message} ({worst.rule}{at})", 6)

    def families(self, rows: list[Row]) -> None:
        count = self.table(
            "Findings by family and device",
            ("family", "device", "designs#", "findings#"),
            ((r.name, r.detail or "(no op-amp)", r.designs, r.findings) for r in rows[:SHOWN]),
        )
        self.left_out(len(rows) if count else 0)

    def unknown(self, rows: list[Row]) -> None:
        count = self.table(
            "Unknown devices: what to describe first ([[devices]] in railguard.toml)",
            ("name", "designs#", "instances#", "about"),
            ((r.name, r.designs, r.findings, r.detail) for r in rows[:SHOWN]),
        )
        self.left_out(len(rows) if count else 0)

    def not_read(self, base: Base) -> None:
        rows = base.reasons()
        count = self.table(
            "Not read, by reason",
            ("files#", "reason", "such as"),
            ((r.designs, r.name, r.detail) for r in rows[:SHOWN]),
        )
        self.left_out(len(rows) if count else 0)

    def settings(self, base: Base) -> None:
        seen = base.settings_seen()
        if not seen:
            return
        obeyed = base.about("trusted") == "yes"
        what = "obeyed" if obeyed else "not obeyed (--trust-settings obeys them)"
        self.table(
            f"Settings files below the root, {what}", ("file",), ((s,) for s in seen[:SHOWN])
        )
        self.left_out(len(seen))

    def copies(self, rows: list[Row]) -> None:
        count = self.table(
            "Copies: designs of one content",
            ("first of them", "designs#"),
            ((r.name, r.designs) for r in rows[:SHOWN]),
        )
        self.left_out(len(rows) if count else 0)

    # ------------------------------------------------------------------ changes

    def changes(self, changes: Comparison) -> None:
        self.say(f"Against {changes.older} (railguard {changes.build_before})", "bold")
        self.say(
            f"{plural(len(changes.designs_new), 'design')} more, "
            f"{plural(len(changes.designs_gone), 'design')} gone; findings: "
            f"{len(changes.of('new'))} new, {len(changes.of('worse'))} worse, "
            f"{len(changes.of('gone'))} gone, {len(changes.of('better'))} better."
        )
        self.say("")
        for change in ("new", "worse", "gone", "better"):
            found = [one for one in changes.changed if one.change == change]
            for one in found[:SHOWN]:
                self.changed(one)
            self.left_out(len(found))

    def changed(self, one: Changed) -> None:
        severity = one.now or one.before or "remark"
        step = (
            f"{one.before} to {one.now}"
            if one.before and one.now and one.before != one.now
            else severity
        )
        self.say(f"{one.change:<7}{one.path}, {one.rule}: {step}", "bold")
        self.paragraph(one.message, 7)
