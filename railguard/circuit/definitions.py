"""What a deck defines, as the flat circuit keeps it: subcircuits as written, models in numbers."""

from railguard.circuit.environment import Environment
from railguard.circuit.expressions import ExpressionError
from railguard.circuit.model import Subcircuit
from railguard.circuit.scopes import Scope
from railguard.circuit.written import text_of
from railguard.deck.cards import Assignment, Items
from railguard.deck.numbers import read_number


def subcircuits_of(top: Scope) -> dict[str, Subcircuit]:
    """Return every definition by its lower-cased name, outer ones before inner ones."""
    kept: dict[str, Subcircuit] = {}
    queue = [top]
    while queue:
        scope = queue.pop(0)
        for name, inner in scope.subcircuits.items():
            kept.setdefault(
                name,
                Subcircuit(
                    inner.name,
                    inner.ports,
                    tuple(line.text for line in inner.cards),
                    inner.notes,
                    inner.header.location if inner.header else None,
                ),
            )
            queue.append(inner)
    return kept


def numbers_of(items: Items, environment: Environment) -> dict[str, float]:
    """Return the parameters of a `.model` card that are numbers, lower-cased names, SI."""
    values: dict[str, float] = {}
    for item in items:
        if isinstance(item, Assignment):
            text = text_of(item.value)
            number = read_number(text)
            if number is not None:
                values[item.key] = number.spice
            else:
                try:
                    values[item.key] = environment.evaluate(text)
                except ExpressionError:
                    continue  # a string, or known only to a simulation
        elif not isinstance(item, str) and hasattr(item, "items"):
            values.update(numbers_of(item.items, environment))
    return values
