"""What is said of cards and calls that a circuit cannot take as they stand."""

from railguard.circuit.card import counted
from railguard.circuit.model import Instance
from railguard.circuit.scopes import Scope
from railguard.deck.files import Deck
from railguard.deck.lines import Line
from railguard.notices import Problem


def too_large(deck: Deck, line: Line) -> Problem:
    """A deck that passes the bound on elements at a card."""
    return Problem(
        rule="netlist-bound",
        message=f"The deck expands to more than {deck.bounds.elements:,} elements and instances; "
        "none of it is judged.",
        remedy="Review its subcircuits one by one, or raise elements in [bounds] if this is meant.",
        location=line.location,
    )


def unreadable(line: Line, reason: str) -> Problem:
    """A card that cannot be split into words."""
    name = line.text.split(None, 1)[0]
    return Problem(
        rule="netlist-card",
        message=f"The card {name} cannot be read: {reason}.",
        location=line.location,
        designators=(name,),
    )


def doubled(name: str, line: Line, first: Line) -> Problem:
    """A designator that an earlier card has."""
    return Problem(
        rule="netlist-duplicate",
        message=f"{name} stands twice: on line {first.number} and on line {line.number}. "
        "The first one counts.",
        remedy="Give one of them another designator.",
        location=line.location,
        designators=(name,),
    )


def misfit(call: Instance, definition: Scope, prefix: str) -> Problem:
    """A call with more or fewer nets than its subcircuit has ports."""
    return Problem(
        rule="netlist-node-count",
        message=f"{call.designator} gives {counted(len(call.nets), 'net')} to the "
        f"subcircuit {definition.name}, which has {counted(len(definition.ports), 'port')}.",
        remedy="Compare the card with the .subckt line.",
        location=call.location,
        designators=(prefix + call.designator,),
    )


def unasked(parameter: str, call: Instance, definition: Scope, prefix: str) -> Problem:
    """A parameter that a call gives and its subcircuit never asks for: mostly a misspelling."""
    has = ", ".join(definition.defaults)
    return Problem(
        rule="netlist-parameter",
        message=f"{prefix}{call.designator} gives the parameter {parameter}, which the subcircuit "
        f"{definition.name} does not use.",
        remedy=f"Its parameters are {has}." if has else "It has no parameters.",
        location=call.location,
        designators=(prefix + call.designator,),
        severity="minor",
    )


def calls_itself(call: Instance, definition: Scope, prefix: str) -> Problem:
    """A subcircuit inside itself."""
    return Problem(
        rule="netlist-card",
        message=f"The subcircuit {definition.name} calls itself (at {prefix}{call.designator}); "
        "it is left out.",
        location=call.location,
        designators=(prefix + call.designator,),
    )


def too_deep(call: Instance, definition: Scope, prefix: str, most: int) -> Problem:
    """Subcircuits inside subcircuits, more than the bound allows."""
    return Problem(
        rule="netlist-bound",
        message=f"The subcircuit {definition.name} is nested deeper than {most} (at {prefix}"
        f"{call.designator}); it is left out.",
        remedy="Raise subcircuit-depth in [bounds] if this is meant.",
        location=call.location,
        designators=(prefix + call.designator,),
    )
