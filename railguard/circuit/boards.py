"""Cards of board components, by the table of designators."""

from railguard.circuit.board import kind_of
from railguard.circuit.card import Names, flat
from railguard.circuit.model import Element
from railguard.circuit.sources import Source
from railguard.circuit.values import not_fitted
from railguard.circuit.waveforms import FUNCTIONS
from railguard.deck.cards import Assignment, Items
from railguard.deck.lines import Line
from railguard.deck.numbers import read_number

BOARD_LETTERS = frozenset("FHUBJTSKMPNOWARI")
"""Letters SPICE knows that board designators begin with as well."""


def is_board(names: Names, letter: str, rest: Items, board: str) -> bool:
    """Tell whether a card whose letter SPICE knows is a board component all the same."""
    words = flat(rest)
    if letter in "FH":
        steered = len(words) >= 4 and words[2][:1].upper() == "V"
        return not steered and not any(w.lower().startswith("poly") for w in words)
    if letter == "I":
        return board == "ic" and len(words) >= 3 and not _drives(names, rest[2:])
    if letter == "U":
        return board == "ic" and bool(words)
    if letter == "B":
        return not any(isinstance(i, Assignment) for i in rest)
    if letter == "J":
        return not names.names_model(words, 3)
    if letter == "T":
        return not any(isinstance(i, Assignment) for i in rest)
    if letter in "SKMPNOWA":
        return board in ("open", "link") and not any(isinstance(i, Assignment) for i in rest)
    return (
        letter == "R" and board == "pot" and len(words) >= 4 and names.number(words[3]) is not None
    )


def _drives(names: Names, rest: Items) -> bool:
    """Tell whether what stands behind two nodes makes a source."""
    first = rest[0]
    if not isinstance(first, str):
        return True
    keyword = first.lower() in ("dc", "ac") or first.lower() in FUNCTIONS
    return keyword or names.number(first) is not None


def component(names: Names, name: str, rest: Items, line: Line, kind: str) -> list[Element]:
    """Bind a board component by what the table says of its designator."""
    words = flat(rest)
    place = line.location
    if not words:
        raise names.unbound((name, *rest), line, "netlist-card", f"{name} has no nodes")
    value = words[-1]
    nets = tuple(words[:-1]) if len(words) > 1 else tuple(words)
    if kind in ("battery", "diode"):
        if len(words) < 2:
            raise names.unbound(
                (name, *rest), line, "netlist-node-count", f"{name} has two nodes; found one"
            )
        if len(words) == 2:
            nets, value = tuple(words), ""
    fitted = not not_fitted(value)
    if kind == "pot" and len(words) >= 4:
        ohms = names.number(words[3], "R")
        half = None if ohms is None else ohms / 2
        ends = ((words[0], words[1]), (words[1], words[2]))
        return [
            Element(
                kind="R", designator=f"{name}.{i + 1}", nets=pair, value=half, text="trimmer",
                fitted=fitted, location=place,
            )
            for i, pair in enumerate(ends)
        ]  # fmt: skip
    if kind == "battery":
        volts = read_number(value, "V")
        source = Source(volts.value if volts else None, stated=volts is not None)
        return [
            Element(
                kind="battery", designator=name, nets=nets[:2], source=source, model=value,
                fitted=fitted, location=place,
            )
        ]  # fmt: skip
    if kind == "diode":
        return [
            Element(
                kind="D", designator=name, nets=nets[:2], model=value, fitted=fitted,
                location=place,
            )
        ]  # fmt: skip
    ohms = None
    if kind == "link":
        number = read_number(value, "R")
        ohms = number.value if number and number.value < 10 and kind_of(name) == "link" else None
        ohms = ohms if name.upper().startswith(("R", "W", "JP", "NT", "SJ")) else None
    return [
        Element(
            kind="opaque" if kind == "pot" else kind, designator=name, nets=nets, value=ohms,
            model=value, fitted=fitted, location=place,
        )
    ]  # fmt: skip
