"""Values written so that every program reads them as meant."""

from collections.abc import Iterator

from railguard.deck.lines import Line
from railguard.location import Location
from railguard.notices import Problem
from railguard.redline.cards import Word, lines_of, replaced, spelled, words_of
from railguard.redline.model import Edit
from railguard.redline.scene import UNITS, Candidate, Scene, all_of, odd
from railguard.rules.finding import Finding
from railguard.units import preferred, si


def respelled(finding: Finding, scene: Scene) -> Iterator[Candidate]:
    """Write a value anew: `1M` of a resistor as `1meg`, `4k7` as `4.7k`, `1,5k` as `1.5k`."""
    for problem in _problems(finding, scene):
        if problem.likely_value is None or problem.location is None:
            continue
        line = _holding(problem.location, scene)
        element = scene.elements.get(problem.designators[0]) if problem.designators else None
        if line is None or element is None or scene.card(element.location) is None:
            continue
        word, length = _written(line.text, words_of(line)[3:], problem)
        if word is None:
            continue
        text = spelled(problem.likely_value, "", element.kind)
        unit = UNITS.get(element.kind, "")
        edit = replaced(line, Word(line.text[word.at : word.at + length], word.at), text)
        yield Candidate(
            edits=(edit,),
            what=f"write {element.designator} as {text}",
            choice=f"every program reads it as {si(problem.likely_value, unit)}",
        )


def _problems(finding: Finding, scene: Scene) -> list[Problem]:
    return [
        p for p in scene.design.problems
        if p.rule == finding.rule and p.location == finding.location
    ]  # fmt: skip


def _holding(place: Location, scene: Scene) -> Line | None:
    """Return the card one of whose lines is at a place."""
    return next(
        (
            line
            for line in scene.lines.values()
            if line.file == place.file and place.line in lines_of(line)
        ),
        None,
    )


def _written(text: str, words: tuple[Word, ...], problem: Problem) -> tuple[Word | None, int]:
    """Find how a value is written on its card, and how many characters of it are the value."""
    found = problem.message.partition("The value ")[2].partition(" of ")[0]
    at = text.find(found, words[0].at) if found and words else -1
    if at < 0:
        return None, 0
    end = at + len(found)
    if problem.rule == "netlist-value-form" and " " not in found:
        behind = next((w for w in words if w.at >= end), None)
        between = text[end : behind.at] if behind is not None else ""
        if behind is not None and ("," in between or "blank" in problem.message):
            end = behind.at + len(behind.text)
    return Word(text[at:end], at), end - at


def commented(finding: Finding, scene: Scene) -> Iterator[Candidate]:
    """Turn what stands behind a value into a comment."""
    for problem in _problems(finding, scene):
        element = scene.elements.get(problem.designators[0]) if problem.designators else None
        line = scene.card(element.location) if element is not None else None
        if line is None or element is None:
            continue
        words = words_of(line)
        value = scene.value_word(line, element)
        if value is None or value not in words or words.index(value) + 1 >= len(words):
            continue
        behind = words[words.index(value) + 1]
        place = line.at(behind.at, 0)
        yield Candidate(
            edits=(Edit(place.file, place.line, place.column, 0, "; "),),
            what=f"make a comment of what stands behind the value of {element.designator} "
            f"({line.text[behind.at :].strip()})",
            choice="the note stays for people, and no program takes it for the value",
        )


def in_series(finding: Finding, scene: Scene) -> Iterator[Candidate]:
    """Give values of no series the nearest preferred one."""
    edits, words = [], []
    for designator in finding.designators:
        element = scene.elements.get(designator)
        if element is None or not element.value or not odd(element.value):
            continue
        value = preferred(element.value, scene.series(element.kind, element))
        edits.append(scene.value(element, value))
        words.append(f"{designator} = {si(value, UNITS[element.kind])}")
    made = all_of(*edits)
    if made is not None:
        yield Candidate(
            edits=made,
            what=", ".join(words),
            choice="the nearest of the series that matches the stated tolerance",
        )


def made_positive(finding: Finding, scene: Scene) -> Iterator[Candidate]:
    """Write a resistance of zero as a milliohm, and drop a sign that is odd."""
    for designator in finding.designators:
        element = scene.elements.get(designator)
        line = scene.card(element.location) if element is not None else None
        if line is None or element is None or element.kind not in UNITS:
            continue
        word = scene.value_word(line, element)
        if word is None:
            continue
        value = abs(element.value or 0.0) or (1e-3 if element.kind == "R" else 0.0)
        if value:
            yield Candidate(
                edits=(replaced(line, word, spelled(value, "", element.kind)),),
                what=f"write {designator} as {spelled(value, '', element.kind)}",
                regains=True,
            )
