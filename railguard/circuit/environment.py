"""What an instance sees: its parameters and functions, and those outside its definition."""

from collections.abc import Mapping

from railguard.circuit.expressions import DEEPEST, ExpressionError, Function, Work, evaluate
from railguard.circuit.model import Element, Instance
from railguard.circuit.scopes import Scope
from railguard.circuit.written import unquoted

Bound = tuple[Element, ...] | Instance
"""What a card was bound to: elements, or a subcircuit call; nothing where it cannot be read."""


class Environment:
    """What an instance sees: parameters it is given, its own, those outside its definition.

    Instances that are called alike share one, and with it what their cards were bound to.

    multiplier  how many of the instance stand in parallel
    bound       cards by number, as every instance of this environment reads them
    deepest     parentheses inside parentheses of one expression
    deck_wide   what has been said once for the whole deck
    borrowed    (parameter, subcircuit) found only with a caller, in the whole deck
    work        what the expressions of the whole deck have cost

    Where a name is found nowhere outside, the caller's are looked through: some SPICE programs do,
    so decks rely on it.
    """

    def __init__(
        self, scope: Scope, outer: "Environment | None", given: Mapping[str, float],
        caller: "Environment | None" = None, multiplier: float = 1.0,
    ) -> None:  # fmt: skip
        self.scope = scope
        self.multiplier = multiplier
        self.bound: dict[int, Bound] = {}
        self._inner: dict[object, Environment] = {}
        self._known: dict[str, float] = {}
        self.deepest: int = caller.deepest if caller is not None else DEEPEST
        self.deck_wide: set[str] = caller.deck_wide if caller is not None else set()
        self.borrowed: set[tuple[str, str]] = caller.borrowed if caller is not None else set()
        self.work: Work = caller.work if caller is not None else Work()
        self._outer = outer
        self._values = dict(given)
        self._caller = caller
        self._busy: list[str] = []
        self._absent: set[str] = set()

    def of(self, scope: Scope | None) -> "Environment | None":
        """Return the environment of the scope a definition stands in: the nearest one outwards."""
        at: Environment | None = self
        while at is not None and at.scope is not scope:
            at = at._outer or at._caller
        return at

    def of_call(self, definition: Scope, call: Instance) -> "Environment":
        """Return the environment of a call from here; calls with the same parameters share one."""
        key = (definition.key, call.multiplier, *call.parameters.items())
        found = self._inner.get(key)
        if found is None:
            found = self._inner[key] = Environment(
                definition,
                self.of(definition.parent),
                call.parameters,
                self,
                self.multiplier * call.multiplier,
            )
        return found

    @property
    def functions(self) -> Mapping[str, Function]:
        """Functions defined here and outside."""
        outer = self._outer.functions if self._outer is not None else {}
        return {**outer, **self.scope.functions} if self.scope.functions else outer

    def look(self, name: str) -> float:
        """Return a parameter's value.

        Raises  ExpressionError
        """
        if name in self._values:
            return self._values[name]
        own = self.scope.parameters.get(name)
        text = own[0] if own is not None else self.scope.defaults.get(name)
        if text is not None:
            if name in self._busy:
                chain = " -> ".join([*self._busy[self._busy.index(name) :], name])
                raise ExpressionError(f"the parameter {name} rests on itself ({chain})")
            self._busy.append(name)
            try:
                value = self.evaluate(text)
            finally:
                self._busy.pop()
            self._values[name] = value
            return value
        # Each environment is asked for a name once: outwards and to the caller there are many ways.
        for other in (self._outer, self._caller) if name not in self._absent else ():
            if other is not None:
                try:
                    value = other.look(name)
                    if other is not self._outer:
                        self.borrowed.add((name, self.scope.name))
                    return value
                except ExpressionError as error:
                    if "is not defined" not in error.reason:
                        raise
        self._absent.add(name)
        raise ExpressionError(f"{name} is not defined")

    def evaluate(self, text: str) -> float:
        """Return an expression's value.

        Raises  ExpressionError
        """
        found = self._known.get(text)
        if found is None:
            found = self._known[text] = evaluate(
                unquoted(text), self.look, self.functions, self.deepest, self.work
            )
        return found
