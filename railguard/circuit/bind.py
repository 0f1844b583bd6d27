"""Items of a card to an element: the roles of its words, letter by letter.

How many nodes a card has depends on names defined elsewhere, so roles are given here, with the
scope at hand, and not in the grammar. A card that fits neither its letter nor the table of board
designators becomes a problem; its net-like words stay in the circuit as an opaque element, so that
nothing on those nets is taken for unconnected.
"""

from collections.abc import Callable

import msgspec

from railguard.circuit import active
from railguard.circuit.board import kind_of
from railguard.circuit.boards import component, is_board
from railguard.circuit.card import Names, UnboundError
from railguard.circuit.model import Element
from railguard.circuit.passives import passive
from railguard.circuit.scopes import text_of
from railguard.deck.cards import Assignment, Call, Group, Items
from railguard.deck.lines import Line
from railguard.deck.numbers import read_number
from railguard.location import Location
from railguard.notices import Problem

_LETTERS: dict[str, Callable[[Names, Items, Line, str], list[Element]]] = {
    **dict.fromkeys("RCL", passive),
    **dict.fromkeys("VI", active.independent),
    **dict.fromkeys("EG", active.voltage_controlled),
    **dict.fromkeys("FH", active.current_controlled),
    **dict.fromkeys("DQJMZ", active.semiconductor),
    "K": active.coupling,
    "B": active.behavioural,
    **dict.fromkeys("SWTOUNPYA", active.other),
}


class Instance(msgspec.Struct, frozen=True, kw_only=True):
    """A subcircuit call that has not been expanded."""

    designator: str
    nets: tuple[str, ...]
    model: str
    parameters: dict[str, float]
    multiplier: float = 1.0
    notes: tuple[str, ...] = ()
    location: Location | None = None

    def element(self, ports: tuple[str, ...], notes: tuple[str, ...]) -> Element:
        """Return the call as one closed element."""
        return Element(
            kind="X",
            designator=self.designator,
            nets=self.nets,
            model=self.model,
            parameters=self.parameters,
            ports=ports,
            pin_notes=self.notes or pin_names(notes, len(self.nets)),
            location=self.location,
        )


def bind(names: Names, items: Items, line: Line) -> list[Element] | Instance:
    """Give a card its roles.

    Raises  UnboundError
    """
    if not items:
        raise UnboundError(_nothing(line), None)
    head = items[0]
    if isinstance(head, Call | Group | Assignment):
        raise names.unbound(items, line, "netlist-card", f"{text_of(head)} is no designator")
    name, letter = _designator(head)
    rest = items[1:]
    if letter == "X":
        return instance(names, name, rest, line)
    handler = _LETTERS.get(letter)
    board = kind_of(name)
    if board is not None and (handler is None or is_board(names, letter, rest, board)):
        return component(names, name, rest, line, board)
    if handler is None:
        raise names.unbound(
            items,
            line,
            "netlist-card",
            f"no element has a designator that begins with {letter}",
        )
    try:
        return handler(names, (name, *rest), line, letter)
    except UnboundError:
        if board is not None and board not in ("opaque",):
            return component(names, name, rest, line, board)
        raise


def instance(names: Names, name: str, rest: Items, line: Line) -> Instance:
    """Bind X: nodes, then a name, then parameters."""
    words: list[str] = []
    keys: dict[str, str] = {}
    done = False
    for item in rest:
        if isinstance(item, Assignment):
            keys[item.key] = text_of(item.value)
            done = True
        elif isinstance(item, Group):
            words += [i for i in item.items if isinstance(i, str)]
        elif isinstance(item, str):
            if item.lower() in ("params:", "text:") or (item.lower() == "params" and words):
                done = True
            elif not done and item not in (":", "/"):
                words.append(item)
    if len(words) < 2:
        board = kind_of(name)
        raise names.unbound(
            (name, *rest), line, "netlist-node-count",
            "a subcircuit call has nodes and a name" if board is None else "it has no nodes",
        )  # fmt: skip
    at = len(words) - 1
    if read_number(words[at]) is not None and names.scope.subcircuit(words[at].casefold()) is None:
        at = next((i for i in range(at, 0, -1) if names.scope.subcircuit(words[i].casefold())), at)
    parameters: dict[str, float] = {}
    for key, text in keys.items():
        value = names.number(text)
        if value is None and text[:1] in "{'":
            value, _ = names.evaluated(text, name, line)
        if value is not None:
            parameters[key] = value
    return Instance(
        designator=name,
        nets=tuple(words[:at]),
        model=words[at],
        parameters=parameters,
        multiplier=parameters.get("m", 1.0),
        notes=_card_pins(line.note),
        location=line.location,
    )


def pin_names(comments: tuple[str, ...], count: int) -> tuple[str, ...]:
    """Read the pin names of a connection ladder above a subcircuit.

    The usual form has one name a line, each line one `|` longer than the next:
    `connections: non-inverting input`, `| inverting input`, `| | positive supply`, ...
    """
    found: list[str] = []
    started = False
    for comment in comments:
        low = comment.lower()
        if not started and "connection" in low and ":" in comment:
            started = True
            found.append(comment.split(":", 1)[1].strip())
        elif started and comment.lstrip().startswith("|"):
            name = comment.replace("|", " ").strip()
            if name:
                found.append(name)
    return tuple(found) if len(found) == count else ()


def _nothing(line: Line) -> Problem:
    return Problem(
        rule="netlist-card",
        message=f"The card {line.text[:20]} cannot be read: it holds no word.",
        location=line.location,
    )


def _designator(head: str) -> tuple[str, str]:
    """Return a card's designator and its letter; `X§U1` is U1 on a subcircuit call."""
    if "§" in head:
        letter, _, name = head.partition("§")
        return head, letter[:1].upper() if name else head[:1].upper()
    return head, head[:1].upper()


def _card_pins(note: str) -> tuple[str, ...]:
    return tuple(part.strip() for part in note.split(")") if part.strip()) if note else ()
