"""Items of a card to an element: the roles of its words, letter by letter.

How many nodes a card has depends on names defined elsewhere, so roles are given here, with the
scope at hand, and not in the grammar. A card that fits neither its letter nor the table of board
designators becomes a problem; its net-like words stay in the circuit as an opaque element, so that
nothing on those nets is taken for unconnected.
"""

from collections.abc import Callable

from railguard.circuit import active
from railguard.circuit.board import behind_call, kind_of
from railguard.circuit.boards import BOARD_LETTERS, component, is_board
from railguard.circuit.calls import instance
from railguard.circuit.card import Names, UnboundError, flat
from railguard.circuit.model import Element, Instance
from railguard.circuit.passives import passive
from railguard.circuit.written import text_of
from railguard.deck.cards import Assignment, Call, Group, Items
from railguard.deck.lines import Line
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


def bind(names: Names, items: Items, line: Line) -> tuple[Element, ...] | Instance:
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
        call = instance(names, name, rest, line)
        own = behind_call(name) if names.scope.subcircuit(call.model.casefold()) is None else ""
        if not own:
            return call
        return tuple(component(names, name, rest, line, kind_of(own) or "opaque"))
    handler = _LETTERS.get(letter)
    if handler is None or (letter in BOARD_LETTERS and not _own_letter(name)):
        board = kind_of(name)
        if board is not None and (handler is None or is_board(names, name, rest, board)):
            return tuple(component(names, name, rest, line, board))
    if handler is None:
        raise names.unbound(
            items,
            line,
            "netlist-card",
            f"no element has a designator that begins with {letter}",
        )
    try:
        return tuple(handler(names, (name, *rest), line, letter))
    except UnboundError:
        board = kind_of(name)
        modelled = letter == "D" and names.names_model(flat(rest), 0)
        if board is None or board == "opaque" or modelled:
            raise
        return tuple(component(names, name, rest, line, board))


def _own_letter(name: str) -> bool:
    """Tell at a glance that R7, C12, V1 and the like are what their letter says."""
    return name[0] in "RrCcLlVvIiEeGgDdZz" and name[1:2].isdigit()


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
