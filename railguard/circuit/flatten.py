"""Definitions to a flat circuit: every instance expanded, every net named once.

Which subcircuits stay closed (devices, not sheets) is told by a predicate over plain values, so
that this room needs no catalogue.
"""

import gc
import re
from collections.abc import Callable, Iterable, Iterator
from contextlib import contextmanager
from typing import cast

from railguard.circuit import slips
from railguard.circuit.bind import bind
from railguard.circuit.calls import closed as closed_call
from railguard.circuit.calls import pin_names
from railguard.circuit.card import Names, UnboundError, unread
from railguard.circuit.definitions import numbers_of, subcircuits_of
from railguard.circuit.environment import Bound, Environment
from railguard.circuit.ground import ELSEWHERE, GROUNDS, likely_ground, no_ground, other_grounds
from railguard.circuit.model import (
    GROUND,
    Circuit,
    Control,
    Directive,
    Element,
    Instance,
    Model,
)
from railguard.circuit.plain import plain_card
from railguard.circuit.references import unsteered
from railguard.circuit.scopes import Scope
from railguard.circuit.sorter import Sorted, sort_deck
from railguard.circuit.told import not_drowned
from railguard.circuit.written import parameter_cycle
from railguard.deck.cards import CardError
from railguard.deck.files import Deck
from railguard.deck.lines import Line
from railguard.notices import Problem

Closed = Callable[[str, tuple[str, ...], tuple[str, ...], bool], bool]
"""closed(name, ports, notes, calls) is true for a device.

notes  pin names of a connection comment beside the header; calls: it calls other subcircuits
"""

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
    found, expander = _expanded(deck, closed, GROUNDS)
    problems = [*deck.problems]
    if expander.over is not None:
        # A circuit cut off somewhere is another circuit: judging it would say wrong things.
        return Circuit(
            path=deck.path, title=deck.title,
            problems=(*problems, slips.too_large(deck, expander.over)), remarks=deck.remarks,
            sha256=deck.sha256, files=deck.files, texts=deck.texts,
        )  # fmt: skip
    if not expander.elements and not (deck.problems or found.problems or expander.problems):
        problems.append(
            Problem(
                rule="netlist-unreadable",
                message=f"{deck.path} holds no element cards: it is no netlist, or only a library.",
                remedy="Point at the netlist that uses it.",
            )
        )
    elif expander.elements and not expander.grounded:
        likely = likely_ground(expander.elements)
        problems.append(no_ground(likely, expander.elements))
        if likely:
            # What is meant is plain enough to go on with, as with a value.
            found, expander = _expanded(deck, closed, GROUNDS | {likely.casefold()})
    problems += [*found.problems, *expander.problems, *expander.afterwards(found)]
    return Circuit(
        path=deck.path,
        title=deck.title,
        elements=tuple(expander.elements),
        models=expander.models,
        subcircuits=subcircuits_of(found.top),
        analyses=found.analyses,
        directives=tuple(Directive(text, place) for text, place in deck.directives),
        globals=found.globals,
        problems=not_drowned(problems),
        remarks=deck.remarks,
        sha256=deck.sha256,
        files=deck.files,
        texts=deck.texts,
    )


def _expanded(deck: Deck, closed: Closed, grounds: frozenset[str]) -> tuple[Sorted, "_Expander"]:
    with _nothing_to_collect():
        found = sort_deck(deck)
        expander = _Expander(deck, closed, found, grounds)
        expander.scope(expander.environment, "", (), 0, frozenset())
    return found, expander


@contextmanager
def _nothing_to_collect() -> Iterator[None]:
    """Keep Python from looking for garbage while a circuit grows.

    All of it stays, and each look goes through all there is: up to a fifth of the time.
    """
    was = gc.isenabled()
    gc.disable()
    try:
        yield
    finally:
        if was:
            gc.enable()


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
            if name[:1] == "?":
                return made
            self[key] = made
        self[name] = made
        return made


class _Expander:
    def __init__(self, deck: Deck, closed: Closed, found: Sorted, grounds: frozenset[str]) -> None:
        self.deck = deck
        self.environment = Environment(found.top, None, {})
        self.environment.deepest = deck.bounds.expression
        self.elements: list[Element] = []
        self.models: dict[str, Model] = {}
        self.problems: list[Problem] = []
        self.grounded = False
        self._closed = closed
        self._devices: dict[tuple[int, str], bool] = {}
        self._grounds = grounds
        self._aliases: list[str] = []
        self._globals = {name.casefold(): name for name in found.globals}
        self._joined = {a.casefold(): b for a, b in found.connected}
        self._told: set[tuple[int, str]] = set()
        self._unconnected = 0
        self._instances = 0
        self.over: Line | None = None

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
        names: Names | None = None
        if scope.models:
            self._take_models(scope, environment, prefix)
        most = self.deck.bounds.elements
        elements, kept, fixed, first = self.elements, environment.bound, scope.bound, scope.first
        alone = environment.multiplier == 1.0
        for number, line in enumerate(scope.cards):
            if len(elements) + self._instances >= most:
                self.over = self.over or line
                return
            bound = kept.get(number) or (fixed.get(number) if alone else None)
            if bound is None:
                plain = plain_card(line, scope) if alone else None
                if plain is None or first.setdefault(plain.designator.casefold(), line) is not line:
                    names = names or Names(scope, environment, prefix)
                    bound = self._bind(names, number, line)
                elif isinstance(plain, Instance):
                    bound = fixed[number] = plain
                else:
                    bound = fixed[number] = (plain,)
            if type(bound) is Instance:
                self._instance(bound, environment, prefix, nets, depth, active)
            else:
                for element in cast("tuple[Element, ...]", bound):
                    self._add(element, nets, prefix)

    def afterwards(self, found: Sorted) -> list[Problem]:
        """Return what can be said once everything is expanded."""
        problems: list[Problem] = []
        if self.grounded:
            problems += other_grounds(self._aliases, self.elements)
        problems += unsteered(self.elements)
        for name, subcircuit in sorted(self.environment.borrowed):
            problems.append(
                Problem(
                    rule="netlist-other-dialect",
                    message=f"The subcircuit {subcircuit} takes the parameter {name} from whoever "
                    "calls it, as in ngspice; other programs do not find it.",
                    remedy=f"Hand {name} over on the call.",
                )
            )
        chain = parameter_cycle({n: text for n, (text, _) in found.top.parameters.items()})
        if chain:
            problems.append(
                Problem(
                    rule="netlist-parameter",
                    message=f"The parameter {chain[0]} rests on itself ({' -> '.join(chain)}).",
                    remedy="Give one of them a number.",
                    location=found.top.parameters[chain[0]][1].location,
                )
            )
        return problems

    def _bind(self, names: Names, number: int, line: Line) -> Bound:
        """Give a card its roles, and keep them where every instance that shares them finds them.

        What is wrong with a card is told once, for the first instance it is met in.
        """
        scope = names.scope
        names.asked = False
        try:
            bound = bind(names, scope.items(number, line), line)
        except CardError as error:
            names.problems.append(slips.unreadable(line, error.reason))
            bound = unread(line)
        except UnboundError as error:
            names.problems.append(error.problem)
            bound = (error.element,) if error.element is not None else ()
        if bound:
            name = bound.designator if isinstance(bound, Instance) else bound[0].designator
            first = scope.first.setdefault(name.casefold(), line)
            if first is not line:
                names.problems[:] = [slips.doubled(name, line, first)]
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

    def net(self, name: str, key: str, prefix: str) -> str:
        """Return the name in the circuit of a net that an instance meets first.

        key  the name as nets are compared
        """
        if key in self._grounds:
            self.grounded = True
            return GROUND
        if key in ELSEWHERE and not prefix:
            self._aliases.append(name)
        if not prefix and key in self._joined and self._joined[key].casefold() != key:
            other = self._joined.pop(key)
            return self.net(other, other.casefold(), prefix)
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
            values = numbers_of(items, environment)
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
        self._instances += 1
        given = instance.nets
        if len(given) != len(ports):
            if not len(ports) - len(definition.optional) <= len(given) <= len(ports):
                self._add(closed_call(instance, ports, ()), nets, prefix)
                self.problems.append(slips.misfit(instance, definition, prefix))
                return
            given += tuple([definition.optional[p] for p in ports[len(given) :]])
        if instance.parameters and not definition.defaults.keys() >= instance.parameters.keys():
            self._unasked(instance, definition, prefix)
        key = definition.key
        if key in active or depth >= self.deck.bounds.subcircuit_depth:
            most = self.deck.bounds.subcircuit_depth
            self.problems.append(
                slips.calls_itself(instance, definition, prefix)
                if key in active
                else slips.too_deep(instance, definition, prefix, most)
            )
            return
        self.scope(
            environment.of_call(definition, instance),
            f"{prefix}{instance.designator}.",
            zip(definition.keys, map(nets.__getitem__, given), strict=True),
            depth + 1,
            active | {key},
        )

    def _unasked(self, instance: Instance, definition: Scope, prefix: str) -> None:
        """Say once which parameters of a call its subcircuit never asks for."""
        for name in instance.parameters:
            if name == "m" or (definition.key, name) in self._told or definition.asks_for(name):
                continue
            self._told.add((definition.key, name))
            self.problems.append(slips.unasked(name, instance, definition, prefix))
