"""Where cards stand: behind a title, before .end, under designators of their own."""

from collections.abc import Iterator

from railguard.redline.cards import replaced, words_of
from railguard.redline.model import Edit
from railguard.redline.scene import Candidate, Scene
from railguard.redline.source import can_be_patched
from railguard.rules.finding import Finding


def titled(finding: Finding, scene: Scene) -> Iterator[Candidate]:
    """Put a title line before a card that stands on the first line."""
    place = finding.location
    if place is not None and can_be_patched(scene.source, place.file):
        yield Candidate(
            edits=(Edit(place.file, 1, 1, 0, "* netlist\n"),),
            what="put a title line before the first card",
            regains=True,
        )


def before_end(finding: Finding, scene: Scene) -> Iterator[Candidate]:
    """Move .end behind the last card."""
    place = finding.location
    if place is None or not can_be_patched(scene.source, place.file):
        return
    lines = scene.physical(place.file)
    ends = [i for i, text in enumerate(lines) if text.strip().casefold() == ".end"]
    if not ends or ends[0] + 1 >= len(lines):
        return
    first = ends[0]
    last = max((i for i, text in enumerate(lines) if text.strip()), default=first)
    edits = [Edit(place.file, first + 1, 1, 0, "* ")]
    if ends[-1] != last:
        edits.append(Edit(place.file, last + 1, len(lines[last]) + 1, 0, "\n.end"))
    yield Candidate(edits=tuple(edits), what="move .end behind the last card", regains=True)


def renamed(finding: Finding, scene: Scene) -> Iterator[Candidate]:
    """Give the second of two equal designators the next free number."""
    if not finding.designators:
        return
    name = finding.designators[0].rpartition(".")[2]
    same = [
        x for x in scene.lines.values()
        if x.text.split(None, 1)[0].casefold() == name.casefold()
    ]  # fmt: skip
    for line in same[1:]:
        if not can_be_patched(scene.source, line.file):
            continue
        scene.forget()
        new = scene.new_name(name[:1].upper())
        yield Candidate(
            edits=(replaced(line, words_of(line)[0], new),),
            what=f"call the second {name} {new}",
            regains=True,
        )


def taken_out(finding: Finding, scene: Scene) -> Iterator[Candidate]:
    """Turn the card of an element without effect into a comment."""
    element = scene.elements.get(finding.designators[0]) if finding.designators else None
    edits = scene.without(element) if element is not None else ()
    if element is not None and edits:
        yield Candidate(
            edits=edits,
            what=f"take {element.designator} out",
            choice="with both ends on one net it does nothing; if it was meant for another net, "
            "correct that instead",
        )


def uncontinued(finding: Finding, scene: Scene) -> Iterator[Candidate]:
    """Turn a continuation line that continues nothing into a comment."""
    place = finding.location
    if place is None or not can_be_patched(scene.source, place.file):
        return
    yield Candidate(
        edits=(Edit(place.file, place.line, 1, 0, "* "),),
        what=f"make a comment of line {place.line}",
        regains=True,
    )
