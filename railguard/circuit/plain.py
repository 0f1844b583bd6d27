"""The cards most netlists are made of, bound at once: R, C, L, V or I, two nets, a value.

Only what has one reading is taken: plain words of the grammar, four of them, the last a number
without a trap or a sign to be told. `bind` reads the same cards and gives the same element; a
property test holds the two equal.
"""

from railguard.circuit.model import Element
from railguard.circuit.sources import Source
from railguard.deck.cards import NOT_PLAIN
from railguard.deck.lines import Line
from railguard.deck.numbers import plain_number
from railguard.location import Location

_KINDS = {letter: letter.upper() for letter in "RrCcLlVvIi"}
_NOTHING: dict[str, float] = {}
"""One mapping for all elements without parameters: none of them writes to it."""


def plain_element(line: Line) -> Element | None:
    """Return the element of a card of two nets and a plain value; None for any other card."""
    text = line.text
    kind = _KINDS.get(text[0])
    if kind is None:
        return None
    words = text.split()
    if len(words) != 4 or NOT_PLAIN.search(text) is not None:
        return None
    name, first, second, word = words
    value = plain_number(word, kind)
    if value is None or (value < 0 and kind in "RCL"):
        return None
    source = Source(value) if kind in "VI" else None
    return Element(
        kind=kind,
        designator=name,
        nets=(first, second),
        value=value if source is None else None,
        source=source,
        parameters=_NOTHING,
        location=Location(line.file, line.number, line.column, len(text)),
    )
