"""What binding a card needs at hand: its scope, its parameters, and where problems go."""

import re
from typing import TYPE_CHECKING, cast

from railguard.circuit.expressions import ExpressionError
from railguard.circuit.model import Element
from railguard.circuit.scopes import Scope
from railguard.circuit.waveforms import FUNCTIONS
from railguard.circuit.written import text_of
from railguard.deck.cards import Assignment, Call, Group, Items
from railguard.deck.lines import Line
from railguard.deck.numbers import read_number
from railguard.notices import Problem

if TYPE_CHECKING:
    from railguard.circuit.environment import Environment


COUNTS = ("no", "one", "two", "three", "four", "five", "six", "seven")
"""Small numbers as they stand in a sentence."""


class UnboundError(Exception):
    """A card that could not be given its roles; `element` keeps its nets in the circuit."""

    def __init__(self, problem: Problem, element: Element | None) -> None:
        self.problem = problem
        self.element = element
        super().__init__(problem.message)


_READ_OTHERWISE = re.compile(r"(?i)\^|\*\*|mil")
_READINGS = (
    ("chain", re.compile(r"(?:\^|\*\*)[^-+*/,()]*(?:\^|\*\*)"),
     "a power of a power is worked out from the left, as ngspice does, elsewhere from the right."),
    ("caret", re.compile(r"\^"),
     "^ is a power here and in ngspice, an exclusive or in other programs; ** is a power in all."),
    ("mil", re.compile(r"(?i)\d\s*mil\b"),
     "mil is a thousandth of an inch here; ngspice reads it as milli inside braces."),
)  # fmt: skip
"""Expressions that other SPICE programs read otherwise: a key, how they are known, what differs."""


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
        self._other_readings(text, name, line)
        try:
            return self.evaluate(text), False
        except ExpressionError as error:
            if error.behavioural:
                return None, True
            named = "not defined" in error.reason or "rests on itself" in error.reason
            rule = "netlist-parameter" if named else "netlist-expression"
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

    def _other_readings(self, text: str, name: str, line: Line) -> None:
        """Say what other SPICE programs make of an expression, once for the deck."""
        if _READ_OTHERWISE.search(text) is None:
            return
        for kind, pattern, words in _READINGS:
            if pattern.search(text) and kind not in self.environment.deck_wide:
                self.environment.deck_wide.add(kind)
                self.told("netlist-other-dialect", f"{text} of {name}: {words}", line, name)

    def unbound(self, items: Items, line: Line, rule: str, why: str) -> UnboundError:
        """Make the error of a card that cannot be read; its nets stay in the circuit."""
        name = text_of(items[0])
        words = [i for i in items[1:] if isinstance(i, str)]
        nets = tuple(
            w
            for w in words
            if (read_number(w) is None or w == "0") and self.scope.model(w.casefold()) is None
        )
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
        self, items: Items, count: int, line: Line, words: str, behind: str = ""
    ) -> tuple[tuple[str, ...], Items]:
        """Take a card's nodes off; a group in parentheses counts as its members.

        words   what the card is: "resistor R7"
        behind  what stands behind its nodes, or ""
        """
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
            found = f"found {COUNTS[len(nets)]} node{'s' if len(nets) != 1 else ''}"
            if rest and isinstance(rest[0], Assignment):
                found += f"; no net's name holds an equals sign ({text_of(rest[0])})"
            more = f" and {behind}" if behind else ""
            raise self.unbound(
                items, line, "netlist-node-count",
                f"{words} has {COUNTS[count]} nodes{more}; {found}",
            )  # fmt: skip
        return tuple(nets), tuple(rest)

    def told(self, rule: str, message: str, line: Line, name: str, remedy: str = "") -> None:
        """Note something about an element."""
        self.problems.append(
            Problem(
                rule=rule, message=message, remedy=remedy, location=line.location,
                designators=(self.prefix + name,),
            )
        )  # fmt: skip

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


def unread(line: Line) -> tuple[Element, ...]:
    """Keep the nets of a card that cannot be split, so that nothing on them looks unconnected."""
    words = re.split(r"[=(){}'\"]", line.text, maxsplit=1)[0].replace(",", " ").split()
    nets = tuple(w for w in words[1:] if w == "0" or read_number(w) is None)
    if not nets:
        return ()
    return (
        Element(
            kind="opaque", designator=words[0], nets=nets, text=line.text, location=line.location
        ),
    )


def counted(count: int, noun: str) -> str:
    """Return "two nodes", "one net", "12 ports"."""
    return f"{COUNTS[count] if count < len(COUNTS) else count} {noun}{'s' if count != 1 else ''}"
