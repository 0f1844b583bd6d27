"""Definitions to a flat circuit: every instance expanded, every net named once.

Which subcircuits stay closed (devices, not sheets) is told by a predicate over plain values, so
that this room needs no catalogue.
"""

import re
from collections.abc import Callable, Mapping

import msgspec

from railguard.circuit.bind import Instance, bind, pin_names
from railguard.circuit.card import Names, UnboundError
from railguard.circuit.expressions import ExpressionError, Function, evaluate
from railguard.circuit.model import GROUND, Circuit, Directive, Element, Model, Subcircuit
from railguard.circuit.scopes import Scope, sort_deck, text_of, unquoted
from railguard.deck.cards import Assignment, CardError, Items
from railguard.deck.files import Deck
from railguard.deck.lines import Line
from railguard.deck.numbers import read_number
from railguard.notices import Problem

Closed = Callable[[str, tuple[str, ...], tuple[str, ...], bool], bool]
"""closed(name, ports, notes, calls) is true for a device.

notes  pin names of a connection comment beside the header; calls: it calls other subcircuits
"""

_GROUNDS = frozenset({"0", "gnd"})
_NO_CONNECT = re.compile(r"(?i)^(\?.*|nc_\d+|unconnected-.*|no_connect.*)$")


def nothing_closed(name: str, ports: tuple[str, ...], notes: tuple[str, ...], calls: bool) -> bool:
    """Expand everything."""
    del name, ports, notes, calls
    return False


def flatten(deck: Deck, closed: Closed = nothing_closed) -> Circuit:
    """Expand a deck into one flat circuit.

    closed  asked for every subcircuit that is called; true keeps its instances as one element
    """
    if not deck.readable:
        return Circuit(
            path=deck.path, problems=deck.problems, readable=False, files=deck.files,
            sha256=deck.sha256,
        )  # fmt: skip
    found = sort_deck(deck)
    expander = _Expander(deck, closed, found.globals)
    expander.scope(found.top, "", {}, Environment(found.top, None, {}), 0, 1.0, frozenset())
    problems = [*deck.problems, *found.problems, *expander.problems]
    if not expander.elements and not problems:
        problems.append(
            Problem(
                rule="netlist-unreadable",
                message=f"{deck.path} holds no element cards: it is no netlist, or only a library.",
                remedy="Point at the netlist that uses it.",
            )
        )
    elif expander.elements and not expander.grounded:
        problems.append(_no_ground(expander))
    return Circuit(
        path=deck.path,
        title=deck.title,
        elements=tuple(expander.elements),
        models=expander.models,
        subcircuits=_subcircuits(found.top),
        analyses=found.analyses,
        directives=tuple(Directive(text, place) for text, place in deck.directives),
        globals=found.globals,
        problems=tuple(problems),
        remarks=deck.remarks,
        sha256=deck.sha256,
        files=deck.files,
        texts=deck.texts,
    )


def _no_ground(expander: "_Expander") -> Problem:
    counts: dict[str, int] = {}
    for element in expander.elements:
        for net in element.nets:
            if re.search(r"(?i)gnd|ground|vss|com|(^|[^a-z])0v", net):
                counts[net] = counts.get(net, 0) + 1
    best = max(counts, key=lambda net: counts[net], default="")
    hint = f' The likely one is "{best}": rename it 0.' if best else " Name the return net 0."
    return Problem(
        rule="netlist-ground",
        message="No card touches ground (net 0 or GND), so no level can be told.",
        remedy=hint.strip(),
        nets=(best,) if best else (),
    )


def _subcircuits(top: Scope) -> dict[str, Subcircuit]:
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


class Environment:
    """Parameters visible in one instance: given by the instance, its own, its definition's outer.

    Where that fails, the caller's are looked through: some SPICE programs do, so decks rely on it.
    """

    def __init__(
        self, scope: Scope, outer: "Environment | None", given: Mapping[str, float],
        caller: "Environment | None" = None,
    ) -> None:  # fmt: skip
        self._scope = scope
        self._outer = outer
        self._values = dict(given)
        self._caller = caller
        self._busy: set[str] = set()

    def of(self, scope: Scope | None) -> "Environment | None":
        """Return the environment of the scope a definition stands in: the nearest one outwards."""
        at: Environment | None = self
        while at is not None and at._scope is not scope:
            at = at._outer or at._caller
        return at

    @property
    def functions(self) -> Mapping[str, Function]:
        """Functions defined here and outside."""
        outer = self._outer.functions if self._outer is not None else {}
        return {**outer, **self._scope.functions} if self._scope.functions else outer

    def look(self, name: str) -> float:
        """Return a parameter's value.

        Raises  ExpressionError
        """
        if name in self._values:
            return self._values[name]
        own = self._scope.parameters.get(name)
        text = own[0] if own is not None else self._scope.defaults.get(name)
        if text is not None:
            if name in self._busy:
                chain = " -> ".join([*sorted(self._busy), name])
                raise ExpressionError(f"the parameter {name} rests on itself ({chain})")
            self._busy.add(name)
            try:
                value = self.evaluate(text)
            finally:
                self._busy.discard(name)
            self._values[name] = value
            return value
        for other in (self._outer, self._caller):
            if other is not None:
                try:
                    return other.look(name)
                except ExpressionError as error:
                    if "is not defined" not in error.reason:
                        raise
        raise ExpressionError(f"{name} is not defined")

    def evaluate(self, text: str) -> float:
        """Return an expression's value.

        Raises  ExpressionError
        """
        return evaluate(unquoted(text), self.look, self.functions)


class _Expander:
    def __init__(self, deck: Deck, closed: Closed, globals_: tuple[str, ...]) -> None:
        self.deck = deck
        self.closed = closed
        self.elements: list[Element] = []
        self.models: dict[str, Model] = {}
        self.problems: list[Problem] = []
        self.grounded = False
        self._globals = {name.casefold(): name for name in globals_}
        self._unconnected = 0
        self._over = False

    def scope(
        self,
        scope: Scope,
        prefix: str,
        ports: dict[str, str],
        environment: Environment,
        depth: int,
        multiplier: float,
        active: frozenset[str],
    ) -> None:
        nets = dict(ports)
        names = Names(scope, environment, prefix, multiplier)
        self._take_models(scope, environment, prefix)
        seen: dict[str, Line] = {}
        for number, line in enumerate(scope.cards):
            if len(self.elements) >= self.deck.bounds.elements:
                self._bound(f"more than {self.deck.bounds.elements:,} elements", line)
                return
            try:
                bound = bind(names, scope.items(number), line)
            except CardError as error:
                self._card(line, error.reason)
                continue
            except UnboundError as error:
                self.problems.append(error.problem)
                if error.element is not None:
                    self._add(error.element, nets, prefix)
                continue
            self.problems += names.taken()
            name = bound[0].designator if isinstance(bound, list) else bound.designator
            key = name.casefold()
            if key in seen:
                self._double(name, line, seen[key])
                continue
            seen[key] = line
            if isinstance(bound, Instance):
                self._instance(bound, scope, prefix, nets, environment, depth, multiplier, active)
            else:
                for element in bound:
                    self._add(element, nets, prefix)

    def _card(self, line: Line, reason: str) -> None:
        name = line.text.split(None, 1)[0]
        self.problems.append(
            Problem(
                rule="netlist-card",
                message=f"The card {name} cannot be read: {reason}.",
                location=line.location,
                designators=(name,),
            )
        )

    def _double(self, name: str, line: Line, first: Line) -> None:
        self.problems.append(
            Problem(
                rule="netlist-duplicate",
                message=f"{name} stands twice: on line {first.location.line} and on line "
                f"{line.location.line}. The first one counts.",
                remedy="Give one of them another designator.",
                location=line.location,
                designators=(name,),
            )
        )

    def _bound(self, what: str, line: Line) -> None:
        if not self._over:
            self._over = True
            self.problems.append(
                Problem(
                    rule="netlist-bound",
                    message=f"The deck expands to {what}; the rest is not read.",
                    remedy="Raise the bound if this is meant.",
                    location=line.location,
                )
            )

    def net(self, name: str, nets: dict[str, str], prefix: str) -> str:
        """Return the one spelling of a net as seen from an instance."""
        key = name.casefold()
        found = nets.get(key)
        if found is not None:
            return found
        if key in _GROUNDS:
            self.grounded = True
            made = GROUND
        elif _NO_CONNECT.match(name):
            self._unconnected += 1
            # Every such pin is its own net, even where the export spells them alike.
            return f"{name} ({self._unconnected})" if name.startswith("?") else prefix + name
        elif key in self._globals or key.startswith("$g_"):
            made = self._globals.setdefault(key, name)
        else:
            made = prefix + name
        nets[key] = made
        return made

    def _add(self, element: Element, nets: dict[str, str], prefix: str) -> None:
        resolved = tuple([self.net(n, nets, prefix) for n in element.nets])
        if GROUND in resolved:
            self.grounded = True
        control = element.control
        if control is not None and (control.nets or control.element):
            control = msgspec.structs.replace(
                control,
                nets=tuple([self.net(n, nets, prefix) for n in control.nets]),
                element=prefix + control.element if control.element else "",
            )
        if not prefix and control is element.control and resolved == element.nets:
            self.elements.append(element)
            return
        self.elements.append(
            msgspec.structs.replace(
                element, designator=prefix + element.designator, nets=resolved, control=control
            )
        )

    def _take_models(self, scope: Scope, environment: Environment, prefix: str) -> None:
        for key, (name, word, items, line) in scope.models.items():
            values = _numbers(items, environment)
            self.models.setdefault(
                prefix.casefold() + key, Model(name, word, values, line.location)
            )

    def _instance(
        self,
        instance: Instance,
        scope: Scope,
        prefix: str,
        nets: dict[str, str],
        environment: Environment,
        depth: int,
        multiplier: float,
        active: frozenset[str],
    ) -> None:
        definition = scope.subcircuit(instance.model.casefold())
        ports = definition.ports if definition is not None else ()
        if definition is None or self.closed(
            instance.model, ports, pin_names(definition.notes, len(ports)), definition.calls
        ):
            notes = instance.notes or (definition.notes if definition is not None else ())
            self._add(instance.element(ports, notes), nets, prefix)
            return
        given = list(instance.nets)
        needed = len(ports) - len(definition.optional)
        if not needed <= len(given) <= len(ports):
            self._add(instance.element(ports, ()), nets, prefix)
            self.problems.append(
                Problem(
                    rule="netlist-node-count",
                    message=f"{instance.designator} gives {len(given)} nets to the subcircuit "
                    f"{definition.name}, which has {len(ports)} ports.",
                    remedy="Compare the card with the .subckt line.",
                    location=instance.location,
                    designators=(prefix + instance.designator,),
                )
            )
            return
        key = f"{id(definition)}"
        if key in active or depth >= self.deck.bounds.subcircuit_depth:
            rule = "netlist-bound" if key not in active else "netlist-card"
            why = "calls itself" if key in active else "is nested deeper than the bound allows"
            self.problems.append(
                Problem(
                    rule=rule,
                    message=f"The subcircuit {definition.name} {why} (at {prefix}"
                    f"{instance.designator}); it is left out.",
                    location=instance.location,
                    designators=(prefix + instance.designator,),
                )
            )
            return
        given += [definition.optional[p] for p in ports[len(given) :]]
        inner = {
            port.casefold(): self.net(net, nets, prefix)
            for port, net in zip(ports, given, strict=True)
        }
        values = dict(instance.parameters)
        outer = environment.of(definition.parent)
        self.scope(
            definition,
            f"{prefix}{instance.designator}.",
            inner,
            Environment(definition, outer, values, environment),
            depth + 1,
            multiplier * instance.multiplier,
            active | {key},
        )


def _numbers(items: Items, environment: Environment) -> dict[str, float]:
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
            values.update(_numbers(item.items, environment))
    return values
