"""What binding a card needs at hand: its scope, its parameters, and where problems go."""

from typing import TYPE_CHECKING, cast

from railguard.circuit.expressions import ExpressionError
from railguard.circuit.model import Element
from railguard.circuit.scopes import Scope, text_of
from railguard.circuit.waveforms import FUNCTIONS
from railguard.deck.cards import Call, Group, Items
from railguard.deck.lines import Line
from railguard.deck.numbers import read_number
from railguard.notices import Problem

if TYPE_CHECKING:
    from railguard.circuit.flatten import Environment


class UnboundError(Exception):
    """A card that could not be given its roles; `element` keeps its nets in the circuit."""

    def __init__(self, problem: Problem, element: Element | None) -> None:
        self.problem = problem
        self.element = element
        super().__init__(problem.message)


class Names:
    """One instance of a scope while its cards are bound.

    prefix    of hierarchical designators: "" or `X1.X2.`
    problems  what was met so far
    asked     True once anything was looked up that another instance may see otherwise
    """

    def __init__(self, scope: Scope, environment: "Environment", prefix: str) -> None:
        """Take what one instance of a scope sees."""
        self.scope = scope
        self.environment = environment
        self.prefix = prefix
        self.problems: list[Problem] = []
        self.asked = False

    def names_model(self, words: list[str], start: int) -> bool:
        """Tell whether one of the words from `start` on is a visible model."""
        return any(self.scope.model(w.casefold()) is not None for w in words[start:])

    def number(self, text: str, letter: str = "") -> float | None:
        """Return the value of a word: a number, an expression in braces, a parameter's name."""
        if text[:1] in ("{", "'", '"'):
            try:
                return self.evaluate(text)
            except ExpressionError:
                return None
        found = read_number(text, letter)
        if found is not None:
            return found.value
        return self.parameter(text) if text.isidentifier() else None

    def parameter(self, name: str) -> float | None:
        """Return a parameter's value; None where there is none of that name."""
        self.asked = True
        try:
            return self.environment.look(name.lower())
        except ExpressionError:
            return None

    def evaluate(self, text: str) -> float:
        """Return an expression's value as this instance sees it.

        Raises  ExpressionError
        """
        self.asked = True
        return self.environment.evaluate(text)

    def evaluated(self, text: str, name: str, line: Line) -> tuple[float | None, bool]:
        """Return an expression's value and whether only a simulation gives it one."""
        try:
            return self.evaluate(text), False
        except ExpressionError as error:
            if error.behavioural:
                return None, True
            rule = "netlist-parameter" if "not defined" in error.reason else "netlist-expression"
            self.problems.append(
                Problem(
                    rule=rule,
                    message=f"The value {text} of {self.prefix}{name} has no number: {error}.",
                    remedy="Give it a value.",
                    location=line.location,
                    designators=(self.prefix + name,),
                )
            )
            return None, False

    def unbound(self, items: Items, line: Line, rule: str, why: str) -> UnboundError:
        """Make the error of a card that cannot be read; its nets stay in the circuit."""
        name = text_of(items[0])
        words = [i for i in items[1:] if isinstance(i, str)]
        nets = tuple(w for w in words if read_number(w) is None or w == "0")
        element = (
            Element(
                kind="opaque", designator=name, nets=nets, text=" ".join(words),
                location=line.location,
            )
            if nets
            else None
        )  # fmt: skip
        return UnboundError(
            Problem(
                rule=rule,
                message=f"The card {self.prefix}{name} cannot be read: {why}.",
                remedy="Correct the card; its nets count as leaving the sheet until then.",
                location=line.location,
                designators=(self.prefix + name,),
            ),
            element,
        )

    def nodes(
        self, items: Items, count: int, line: Line, words: str
    ) -> tuple[tuple[str, ...], Items]:
        """Take a card's nodes off; a group in parentheses counts as its members."""
        plain = items[1 : count + 1]
        if len(plain) == count and all(type(item) is str for item in plain):
            return cast("tuple[str, ...]", plain), items[count + 1 :]
        nets: list[str] = []
        rest = list(items[1:])
        while rest and len(nets) < count:
            item = rest[0]
            if isinstance(item, Group) and all(isinstance(i, str) for i in item.items):
                rest[:1] = list(item.items)
                continue
            if not isinstance(item, str):
                break
            nets.append(item)
            rest.pop(0)
        if len(nets) < count:
            raise self.unbound(
                items, line, "netlist-node-count",
                f"{words} has {count} nodes; found {len(nets)}",
            )  # fmt: skip
        return tuple(nets), tuple(rest)

    def trap(
        self, name: str, rule: str, text: str, why: str, likely: float | None,
        spice: float | None, unit: str, line: Line,
    ) -> None:  # fmt: skip
        """Note a value that SPICE reads otherwise than meant."""
        at = line.text.find(text)
        self.problems.append(
            Problem(
                rule=rule,
                message=f"The value {text} of {self.prefix}{name}: {why}.",
                location=line.at(max(at, 0), len(text)),
                designators=(self.prefix + name,),
                spice_value=spice,
                likely_value=likely,
                unit=unit,
            )
        )


def flat(items: Items) -> list[str]:
    """Return the plain words of some items, groups opened, assignments left out."""
    words: list[str] = []
    for item in items:
        if isinstance(item, str):
            words.append(item)
        elif isinstance(item, Group):
            words += flat(item.items)
        elif isinstance(item, Call):
            words += [item.name, *flat(item.items)] if item.name not in FUNCTIONS else []
    return words
