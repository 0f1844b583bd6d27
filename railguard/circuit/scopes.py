"""Scopes: what one subcircuit, or the top level, defines, and which cards it holds."""

from functools import cached_property

from railguard.circuit.expressions import Function
from railguard.circuit.model import Element, Instance
from railguard.deck.cards import Items, behavioural_items, items_of
from railguard.deck.lines import Line


class Scope:
    """What one subcircuit (or the top level) defines.

    cards  its element cards; `bound` by number, what those are that every instance reads alike
    first  by case-folded designator, the first card of that name
    told   numbers of cards whose problems have been told
    key    a number no other scope has
    """

    def __init__(self, name: str, header: Line | None, parent: "Scope | None") -> None:
        self.name = name
        self.header = header
        self.parent = parent
        self.ports: tuple[str, ...] = ()
        self.optional: dict[str, str] = {}
        self.defaults: dict[str, str] = {}
        self.cards: list[Line] = []
        self.parameters: dict[str, tuple[str, Line]] = {}
        self.functions: dict[str, Function] = {}
        self.models: dict[str, tuple[str, str, Items, Line]] = {}
        self.subcircuits: dict[str, Scope] = {}
        self.notes: tuple[str, ...] = ()
        self.bound: dict[int, tuple[Element, ...] | Instance] = {}
        self.first: dict[str, Line] = {}
        self.told: set[int] = set()
        self.key = id(self)
        self._items: dict[int, Items] = {}

    def items(self, number: int, line: Line) -> Items:
        """Return the items of card `number`, split once however often the scope is expanded.

        Raises  CardError
        """
        found = self._items.get(number)
        if found is None:
            text = line.text
            found = behavioural_items(text) if text[0] in "bB" else None
            found = self._items[number] = items_of(text) if found is None else found
        return found

    @cached_property
    def keys(self) -> tuple[str, ...]:
        """The ports as nets are compared."""
        return tuple(port.casefold() for port in self.ports)

    @cached_property
    def calls(self) -> bool:
        """Tell whether a card of this scope calls a subcircuit."""
        return any(line.text[0] in "xX" for line in self.cards)

    def asks_for(self, parameter: str) -> bool:
        """Tell whether a parameter is in the header or anywhere in the body, inner headers too."""
        if parameter in self.defaults or parameter in self.parameters:
            return True
        texts = [line.text for line in self.cards]
        texts += [text for text, _ in self.parameters.values()]
        texts += [line.text for _, _, _, line in self.models.values()]
        texts += [function.body for function in self.functions.values()]
        if any(parameter in text.lower() for text in texts):
            return True
        return any(inner.asks_for(parameter) for inner in self.subcircuits.values())

    def subcircuit(self, name: str) -> "Scope | None":
        """Find a definition from here outwards."""
        scope: Scope | None = self
        while scope is not None:
            if name in scope.subcircuits:
                return scope.subcircuits[name]
            scope = scope.parent
        return None

    def model(self, name: str) -> tuple[str, str, Items, Line] | None:
        """Find a model card from here outwards: name, type word, parameters, card."""
        scope: Scope | None = self
        while scope is not None:
            if name in scope.models:
                return scope.models[name]
            scope = scope.parent
        return None
