"""Cards of board components, by the table of designators."""

from railguard.circuit.board import kind_of, prefix_of
from railguard.circuit.card import Names, flat
from railguard.circuit.model import Element
from railguard.circuit.sources import Source
from railguard.circuit.values import is_rating, not_fitted
from railguard.circuit.waveforms import FUNCTIONS
from railguard.deck.cards import Assignment, Group, Items
from railguard.deck.lines import Line
from railguard.deck.numbers import read_number

BOARD_LETTERS = frozenset("FHUBJTSKMPNOWARCLIVEGZD")
"""Letters SPICE knows that board designators begin with as well."""

_POT_OR_REGULATOR = {"VR": "ic"}
"""What a designator of the pots is where its value is no resistance."""

_SOURCE_WORDS = FUNCTIONS | {"dc", "ac", "value", "table", "laplace", "freq", "vol", "cur"}


def is_board(names: Names, name: str, rest: Items, board: str) -> bool:
    """Tell whether a card whose letter SPICE knows is a board component all the same."""
    letter, words = name[0].upper(), flat(rest)
    keyed = any(isinstance(item, Assignment) for item in rest)
    longer = len(prefix_of(name)) > 1
    match letter:
        case "W":
            return not keyed and not _steered(words) and not names.names_model(words, 2)
        case "F" | "H":
            return not _steered(words) and not any(w.lower().startswith("poly") for w in words)
        case "U":
            return board == "ic" and bool(words)
        case "B" | "T":
            return not keyed
        case "J":
            return not names.names_model(words, 3)
        case "R" | "C" | "L":
            if board == "pot":
                return len(words) >= 4 and not _rated(words[3:])
            return longer and len(words) >= 3 and not keyed and not _is_value(names, words, letter)
        case "V" | "I":
            return longer and len(words) >= 3 and not keyed and not _drives(names, rest)
        case "E" | "G":
            return longer and len(words) < 5 and not keyed
        case "D" | "Z":
            pins = board == "ic" or letter == "Z"
            return longer and pins and not keyed and not names.names_model(words, 2)
        case _:
            pins = board in ("open", "link") or (board == "ic" and len(words) >= 5)
            return pins and not keyed and not names.names_model(words, 2)
    return False


def _steered(words: list[str]) -> bool:
    """Tell whether the word behind two nodes is a voltage source whose current steers the card."""
    return len(words) >= 4 and words[2][:1].upper() == "V"


def _is_value(names: Names, words: list[str], letter: str) -> bool:
    """Tell whether the word behind two nodes is the value of a passive."""
    if len(words) > 3 and names.number(words[-1]) is None and not _rated(words[3:]):
        return False  # CN1 1 2 3 HEADER: with numbered nets the third looks like a value
    word = words[2]
    number = names.number(word, letter)
    return number is not None or not_fitted(word) or names.names_model(words, 2)


def _rated(words: list[str]) -> bool:
    """Tell whether all words are tolerances, packages or ratings."""
    return all(is_rating(word) for word in words)


def _drives(names: Names, rest: Items) -> bool:
    """Tell whether what stands behind two nodes makes a source."""
    opened = [i for item in rest for i in (item.items if isinstance(item, Group) else (item,))]
    first = opened[2] if len(opened) > 2 else None
    if not isinstance(first, str):
        return True
    return first.lower() in _SOURCE_WORDS or names.number(first) is not None


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
    ohms = names.number(words[3], "R") if kind == "pot" and len(words) >= 4 else None
    if ohms is not None:
        half = ohms / 2
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
    if kind == "link" and len(nets) > 2 and (prefix_of(name) == "NT" or _THREE_PADS in value):
        return _several_pads(name, nets, value, fitted, line)
    if kind == "link":
        number = read_number(value, "R")
        ohms = number.value if number and number.value < 10 and kind_of(name) == "link" else None
        ohms = ohms if name.upper().startswith(("R", "W", "JP", "NT", "SJ")) else None
    return [
        Element(
            kind=_POT_OR_REGULATOR.get(prefix_of(name), "opaque") if kind == "pot" else kind,
            designator=name, nets=nets, value=ohms,
            model=value, fitted=fitted, location=place,
        )
    ]  # fmt: skip


_THREE_PADS = "_3_"
"""In the value of a jumper of three pads, as KiCad names them: SolderJumper_3_Bridged12."""


def _several_pads(
    name: str, nets: tuple[str, ...], value: str, fitted: bool, line: Line
) -> list[Element]:
    """Join all pads of a net tie, and those of a jumper that its value says are bridged.

    Where it says none, which are joined is settled on the board and not in the netlist.
    """
    bridged = value.rpartition("Bridged")[2]
    if prefix_of(name) == "NT" or bridged == "123":
        pairs: tuple[tuple[str, ...], ...] = tuple((nets[0], other) for other in nets[1:])
    else:
        pairs = (nets[:2],) if bridged == "12" else (nets,)
    return [
        Element(
            kind="link" if len(pair) == 2 else "opaque",
            designator=f"{name}.{number}" if len(pairs) > 1 else name,
            nets=pair, model=value, fitted=fitted, location=line.location,
        )
        for number, pair in enumerate(pairs, 1)
    ]  # fmt: skip
