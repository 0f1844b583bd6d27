"""Definitions to a flat circuit: every instance expanded, every net named once.

Which subcircuits stay closed (devices, not sheets) is told by a predicate over plain values, so
that this room needs no catalogue.
"""

import re
from collections.abc import Callable, Iterable, Mapping
from typing import cast

from railguard.circuit.bind import bind
from railguard.circuit.calls import closed as closed_call
from railguard.circuit.calls import pin_names
from railguard.circuit.card import Names, UnboundError
from railguard.circuit.expressions import ExpressionError, Function, evaluate
from railguard.circuit.model import (
    GROUND,
    Circuit,
    Control,
    Directive,
    Element,
    Instance,
    Model,
    Subcircuit,
)
from railguard.circuit.plain import plain_element
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
    expander.scope(Environment(found.top, None, {}), "", (), 0, frozenset())
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


Bound = tuple[Element, ...] | Instance
"""What a card was bound to: elements, or a subcircuit call; nothing where it cannot be read."""


class Environment:
    """What an instance sees: parameters it is given, its own, those outside its definition.

    Instances that are called alike share one, and with it what their cards were bound to.

    multiplier  how many of the instance stand in parallel
    bound       cards by number, as every instance of this environment reads them

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
        self._outer = outer
        self._values = dict(given)
        self._caller = caller
        self._busy: list[str] = []

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
        found = self._known.get(text)
        if found is None:
            found = self._known[text] = evaluate(unquoted(text), self.look, self.functions)
        return found


class _Nets(dict[str, str]):
    """How the nets of one instance are spelled: as written inside to as named in the circuit.

    What is not there yet is worked out once; pins that are not connected are a new net each time.
    """

    def __init__(
        self, known: Iterable[tuple[str, str]], expander: "_Expander", prefix: str
    ) -> None:
        super().__init__(known)
        self._expander = expander
        self._prefix = prefix

    def __missing__(self, name: str) -> str:
        key = name.casefold()
        made = self.get(key)
        if made is None:
            made = self._expander.net(name, key, self._prefix)
            if name[0] == "?":
                return made
            self[key] = made
        self[name] = made
        return made


class _Expander:
    def __init__(self, deck: Deck, closed: Closed, globals_: tuple[str, ...]) -> None:
        self.deck = deck
        self.elements: list[Element] = []
        self.models: dict[str, Model] = {}
        self.problems: list[Problem] = []
        self.grounded = False
        self._closed = closed
        self._devices: dict[tuple[int, str], bool] = {}
        self._globals = {name.casefold(): name for name in globals_}
        self._unconnected = 0
        self._over = False

    def scope(
        self,
        environment: Environment,
        prefix: str,
        ports: Iterable[tuple[str, str]],
        depth: int,
        active: frozenset[int],
    ) -> None:
        """Expand one instance of an environment's scope."""
        scope = environment.scope
        nets = _Nets(ports, self, prefix)
        names = Names(scope, environment, prefix)
        if scope.models:
            self._take_models(scope, environment, prefix)
        most = self.deck.bounds.elements
        elements, kept, fixed, first = self.elements, environment.bound, scope.bound, scope.first
        alone = environment.multiplier == 1.0
        for number, line in enumerate(scope.cards):
            if len(elements) >= most:
                self._bound(f"more than {most:,} elements", line)
                return
            bound = kept.get(number) or (fixed.get(number) if alone else None)
            if bound is None:
                element = plain_element(line) if alone else None
                if (
                    element is None
                    or first.setdefault(element.designator.casefold(), line) is not line
                ):
                    bound = self._bind(names, number, line)
                else:
                    bound = fixed[number] = (element,)
            if type(bound) is Instance:
                self._instance(bound, environment, prefix, nets, depth, active)
            else:
                for element in cast("tuple[Element, ...]", bound):
                    self._add(element, nets, prefix)

    def _bind(self, names: Names, number: int, line: Line) -> Bound:
        """Give a card its roles, and keep them where every instance that shares them finds them.

        What is wrong with a card is told once, for the first instance it is met in.
        """
        scope = names.scope
        names.asked = False
        try:
            bound = bind(names, scope.items(number, line), line)
        except CardError as error:
            names.problems.append(self._card(line, error.reason))
            bound = ()
        except UnboundError as error:
            names.problems.append(error.problem)
            bound = (error.element,) if error.element is not None else ()
        if bound:
            name = bound.designator if isinstance(bound, Instance) else bound[0].designator
            first = scope.first.setdefault(name.casefold(), line)
            if first is not line:
                names.problems[:] = [self._double(name, line, first)]
                bound, names.asked = (), False
        if names.problems:
            if number not in scope.told:
                scope.told.add(number)
                self.problems += names.problems
            names.problems.clear()
        if names.asked or names.environment.multiplier != 1.0:
            names.environment.bound[number] = bound
        else:
            scope.bound[number] = bound
        return bound

    def _card(self, line: Line, reason: str) -> Problem:
        name = line.text.split(None, 1)[0]
        return Problem(
            rule="netlist-card",
            message=f"The card {name} cannot be read: {reason}.",
            location=line.location,
            designators=(name,),
        )

    def _double(self, name: str, line: Line, first: Line) -> Problem:
        return Problem(
            rule="netlist-duplicate",
            message=f"{name} stands twice: on line {first.number} and on line {line.number}. "
            "The first one counts.",
            remedy="Give one of them another designator.",
            location=line.location,
            designators=(name,),
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

    def net(self, name: str, key: str, prefix: str) -> str:
        """Return the name in the circuit of a net that an instance meets first.

        key  the name as nets are compared
        """
        if key in _GROUNDS:
            self.grounded = True
            return GROUND
        if _NO_CONNECT.match(name):
            self._unconnected += 1
            # Every such pin is its own net, even where the export spells them alike.
            return f"{name} ({self._unconnected})" if name[0] == "?" else prefix + name
        if key in self._globals or key.startswith("$g_"):
            return self._globals.setdefault(key, name)
        return prefix + name

    def _add(self, element: Element, nets: _Nets, prefix: str) -> None:
        resolved = tuple(map(nets.__getitem__, element.nets))
        control = element.control
        if control is not None and (control.nets or control.element):
            control = Control(
                control.gain,
                tuple(map(nets.__getitem__, control.nets)),
                prefix + control.element if control.element else "",
                control.text,
            )
        elif not prefix and resolved == element.nets:
            self.elements.append(element)
            return
        self.elements.append(
            Element(
                kind=element.kind,
                designator=prefix + element.designator,
                nets=resolved,
                value=element.value,
                model=element.model,
                control=control,
                source=element.source,
                parameters=element.parameters,
                text=element.text,
                ports=element.ports,
                pin_notes=element.pin_notes,
                fitted=element.fitted,
                location=element.location,
            )
        )

    def _take_models(self, scope: Scope, environment: Environment, prefix: str) -> None:
        for key, (name, word, items, line) in scope.models.items():
            values = _numbers(items, environment)
            self.models.setdefault(
                prefix.casefold() + key, Model(name, word, values, line.location)
            )

    def _is_device(self, name: str, definition: Scope) -> bool:
        """Tell whether calls of a subcircuit stay closed; asked once for each."""
        key = definition.key, name
        found = self._devices.get(key)
        if found is None:
            notes = pin_names(definition.notes, len(definition.ports))
            found = self._closed(name, definition.ports, notes, definition.calls)
            self._devices[key] = found
        return found

    def _instance(
        self,
        instance: Instance,
        environment: Environment,
        prefix: str,
        nets: _Nets,
        depth: int,
        active: frozenset[int],
    ) -> None:
        definition = environment.scope.subcircuit(instance.model.casefold())
        if definition is None:
            self._add(closed_call(instance, (), ()), nets, prefix)
            return
        ports = definition.ports
        if self._is_device(instance.model, definition):
            self._add(closed_call(instance, ports, definition.notes), nets, prefix)
            return
        given = instance.nets
        if len(given) != len(ports):
            if not len(ports) - len(definition.optional) <= len(given) <= len(ports):
                self._add(closed_call(instance, ports, ()), nets, prefix)
                self._misfit(instance, definition, prefix)
                return
            given += tuple([definition.optional[p] for p in ports[len(given) :]])
        key = definition.key
        if key in active or depth >= self.deck.bounds.subcircuit_depth:
            self._too_deep(instance, definition, prefix, key in active)
            return
        self.scope(
            environment.of_call(definition, instance),
            f"{prefix}{instance.designator}.",
            zip(definition.keys, map(nets.__getitem__, given), strict=True),
            depth + 1,
            active | {key},
        )

    def _misfit(self, instance: Instance, definition: Scope, prefix: str) -> None:
        self.problems.append(
            Problem(
                rule="netlist-node-count",
                message=f"{instance.designator} gives {len(instance.nets)} nets to the subcircuit "
                f"{definition.name}, which has {len(definition.ports)} ports.",
                remedy="Compare the card with the .subckt line.",
                location=instance.location,
                designators=(prefix + instance.designator,),
            )
        )

    def _too_deep(self, instance: Instance, definition: Scope, prefix: str, itself: bool) -> None:
        why = "calls itself" if itself else "is nested deeper than the bound allows"
        self.problems.append(
            Problem(
                rule="netlist-card" if itself else "netlist-bound",
                message=f"The subcircuit {definition.name} {why} (at {prefix}"
                f"{instance.designator}); it is left out.",
                location=instance.location,
                designators=(prefix + instance.designator,),
            )
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
