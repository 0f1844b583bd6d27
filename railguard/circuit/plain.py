"""The cards most netlists are made of, bound at once: plain words, each with one reading.

A passive or a source of two nets and a value, a source with its DC value and its AC probe, a call
without parameters. Only what needs no sign to be told and nothing looked up is taken; `bind`
reads the same cards and gives the same element; a property test holds the two equal.
"""

from collections.abc import Mapping

from railguard.circuit.model import Element, Instance
from railguard.circuit.scopes import Scope
from railguard.circuit.sources import Source
from railguard.deck.cards import NOT_PLAIN
from railguard.deck.lines import Line
from railguard.deck.numbers import plain_number
from railguard.location import Location

_KINDS = {letter: letter.upper() for letter in "RrCcLlVvIiXx"}
_SOURCES = frozenset("VI")
_NOTHING: Mapping[str, float] = {}
"""One mapping for all elements without parameters: none of them writes to it."""
_CALL_WORD = "params"
"""The plain word that is neither a call's net nor its name."""


def plain_card(line: Line, scope: Scope) -> Element | Instance | None:
    """Return what a card of plain words is; None for any card that has to be looked at closely.

    scope  where the card stands: a call is taken only where its last word is defined from here
    """
    text = line.text
    kind = _KINDS.get(text[0])
    if kind is None or NOT_PLAIN.search(text) is not None:
        return None
    words = text.split()
    if kind == "X":
        return _call(words, line, scope)
    if len(words) == 4:
        name, first, second, word = words
        value = plain_number(word, kind)
        if value is None:
            return None
        source = None
        if kind in _SOURCES:
            source, value = Source(value), None
        elif value < 0:
            return None
    elif kind in _SOURCES and len(words) > 4:
        source, value = _source(words, kind), None
        if source is None:
            return None
        name, first, second = words[:3]
    else:
        return None
    return Element(
        kind=kind,
        designator=name,
        nets=(first, second),
        value=value,
        source=source,
        parameters=_NOTHING,
        location=Location(line.file, line.number, line.column, len(text)),
    )


def _source(words: list[str], kind: str) -> Source | None:
    """Return the source of `V1 a 0 DC 5`, `V1 a 0 5 AC 1` and the like."""
    at = 4 if words[3].lower() == "dc" else 3
    dc = plain_number(words[at], kind)
    rest = words[at + 1 :]
    if dc is None or not rest:
        return None if dc is None else Source(dc)
    if len(rest) != 2 or rest[0].lower() != "ac":
        return None
    probe = plain_number(rest[1], kind)
    return None if probe is None else Source(dc, (probe, 0.0))


def _call(words: list[str], line: Line, scope: Scope) -> Instance | None:
    if len(words) < 3 or line.note or scope.subcircuit(words[-1].casefold()) is None:
        return None
    for word in words:
        if word[-1] == ":" or word == "/" or word.lower() == _CALL_WORD:
            return None
    return Instance(
        designator=words[0],
        nets=tuple(words[1:-1]),
        model=words[-1],
        parameters=_NOTHING,
        location=Location(line.file, line.number, line.column, len(line.text)),
    )
