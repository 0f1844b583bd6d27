"""What every rule says of the netlists it fails, and of those that lack its data, as one text.

`python -m tests.rules.fourfold.told` writes `told.txt` anew; read the difference before it is kept.
"""

from collections.abc import Iterator
from pathlib import Path
from textwrap import fill

from railguard.notices import NotChecked
from railguard.reviewing import review
from railguard.rules.finding import Finding
from tests.rules.fourfold.cases import ALL
from tests.rules.fourfold.four import deck

FILE = Path(__file__).with_name("told.txt")


def everything() -> str:
    """Return what all rules say, a paragraph for each netlist."""
    return "\n".join(
        paragraph for rule in sorted(ALL) for kind in KINDS for paragraph in said(rule, kind)
    )


KINDS = ("failing", "outside", "unknown")


def said(rule: str, kind: str) -> Iterator[str]:
    """Yield what one rule says of one of its netlists; nothing where it is silent."""
    four = ALL[rule]
    (design,) = review(deck(getattr(four, kind)), plugins=False).designs
    lines = [line for one in _flat(design.findings) if one.rule == rule for line in _finding(one)]
    names = {rule, four.listed}
    lines += [line for note in design.not_checked if note.rule in names for line in _open(note)]
    if lines:
        yield "\n".join([f"{rule}, {kind}", *lines, ""])


def _flat(findings: tuple[Finding, ...]) -> Iterator[Finding]:
    for finding in findings:
        yield finding
        yield from _flat(finding.consequences)


def _finding(one: Finding) -> Iterator[str]:
    line = "no line" if one.location is None else f"line {one.location.line}"
    about = ", ".join([*one.designators, *(f"net {net}" for net in one.nets), line])
    yield f"  {one.severity}: {about}{f'; {one.cause}' if one.cause else ''}"
    yield _wrapped(one.message)
    yield _wrapped(f"Remedy: {one.remedy or 'none'}")
    numbers = ", ".join(
        f"{name} {value:.4g}{one.unit and ' ' + one.unit}"
        for name, value in (("demand", one.demand), ("limit", one.limit), ("margin", one.margin))
        if value is not None
    )
    yield f"    {numbers or 'no numbers'}; {one.corner}; {', '.join(one.basis)}"
    yield _wrapped(f"Source: {one.source}")


def _open(note: NotChecked) -> Iterator[str]:
    yield f"  not checked: {note.subject}, {note.rule}"
    yield _wrapped(note.why)
    yield _wrapped(f"Add: {note.add}")


def _wrapped(text: str) -> str:
    return fill(
        text, 100, initial_indent="    ", subsequent_indent="      ", break_on_hyphens=False
    )


if __name__ == "__main__":
    FILE.write_text(everything(), "utf-8")
