"""How a stage is wired, as far as one drawing shows it: two input chains, feedback, loads.

From each input pin a chain of nodes runs to what drives it. From every node hang branches: to the
stage's own output (feedback), or to ground, a rail or another net (shunts). What fits neither is
named beside the drawing, so that nothing on a shown net is left out in silence.
"""

from collections import defaultdict
from collections.abc import Iterable

import msgspec

from railguard.analysis.stage import Design, Stage
from railguard.circuit.model import GROUND, Element

DRAWN_KINDS = frozenset({"R", "C", "L", "link", "D", "I", "V", "battery"})
"""Elements of two ends that have a symbol."""

LONGEST_BRANCH = 3
DEEPEST_CHAIN = 4
WIDEST_NODE = 6
MOST_LOADS = 3


class Branch(msgspec.Struct, frozen=True):
    """Elements in series from the net `start` to the net `end`."""

    elements: tuple[Element, ...]
    start: str
    end: str


class Node(msgspec.Struct, frozen=True):
    """One net of a chain. `onward` leads to the next node, or to the chain's source."""

    net: str
    feedback: tuple[Branch, ...] = ()
    shunts: tuple[Branch, ...] = ()
    onward: Branch | None = None


class Connection(msgspec.Struct, frozen=True):
    """One row of the connection list: an element, its value's element, the nets it stands on."""

    element: Element
    nets: tuple[str, ...]


class Wiring(msgspec.Struct, frozen=True, kw_only=True):
    """One stage as it is drawn.

    minus, plus  nodes from the pin outwards; the last may lead onward to `*_source`
    wired        True where the output is the inverting input's own net
    beside       what stands on a shown net and is not drawn, as `designator at net`
    around       every element on the stage's nets, for the connection list
    """

    minus: tuple[Node, ...]
    plus: tuple[Node, ...]
    minus_source: str
    plus_source: str
    wired: bool
    loads: tuple[Branch, ...]
    beside: tuple[str, ...]
    around: tuple[Connection, ...]


class Nets:
    """What stands on every net of a design; made once a design."""

    def __init__(self, design: Design) -> None:
        self.on: dict[str, list[Element]] = defaultdict(list)
        self.names = {stage.designator: stage.schematic for stage in design.stages}
        self.amplifiers = {name for p in design.packages for name in (p.designator, *p.channels)}
        self.rails = {rail.net for rail in design.rails}
        self.outputs = {stage.output.net for stage in design.stages}
        self.driven = set(self.outputs)
        for signal in design.settings.signals:
            self.driven.update(signal.between or (signal.name,))
        self.pins: dict[str, set[str]] = defaultdict(set)
        for stage in design.stages:
            for pin in (stage.inputs.plus, stage.inputs.minus):
                self.pins[pin.net].add(stage.designator)
        self.held = {GROUND}
        for element in design.circuit.elements:
            if not element.fitted:
                continue
            for net in dict.fromkeys(element.nets):
                self.on[net].append(element)
            source = element.kind in ("V", "E", "battery") and element.designator not in self.names
            if source and GROUND in element.nets[:2]:
                self.held.update(element.nets[:2])
                if _moves(element):  # a source that stands still is a supply or a reference
                    self.driven.update(net for net in element.nets[:2] if net != GROUND)

    def two_ended(self, net: str) -> list[Element]:
        """Return the drawable elements on a net that lead somewhere else."""
        return [
            e
            for e in self.on.get(net, ())
            if e.kind in DRAWN_KINDS and len(set(e.nets[:2])) == 2 and len(e.nets) == 2
        ]


def wiring(stage: Stage, nets: Nets) -> Wiring:
    """Return how one stage is wired."""
    walk = _Walk(stage, nets)
    minus, minus_source = walk.chain(stage.inputs.minus.net, other=stage.inputs.plus.net)
    plus, plus_source = walk.chain(stage.inputs.plus.net, other=stage.inputs.minus.net)
    loads = walk.loads()
    shown = [stage.output.net, *(node.net for node in (*minus, *plus))]
    return Wiring(
        minus=minus,
        plus=plus,
        minus_source=minus_source,
        plus_source=plus_source,
        wired=stage.inputs.minus.net == stage.output.net,
        loads=loads,
        beside=walk.beside(shown),
        around=_around(stage, nets, shown),
    )


def _around(stage: Stage, nets: Nets, shown: Iterable[str]) -> tuple[Connection, ...]:
    found: dict[str, Element] = {}
    local = [net for net in dict.fromkeys(shown) if net not in nets.held and net not in nets.rails]
    for net in (stage.output.net, stage.inputs.minus.net, stage.inputs.plus.net, *local):
        if net not in nets.held and net not in nets.rails:
            found.update((e.designator, e) for e in nets.on.get(net, ()))
    return tuple(Connection(e, e.nets) for e in found.values())


class _Walk:
    def __init__(self, stage: Stage, nets: Nets) -> None:
        self.stage = stage
        self.nets = nets
        self.out = stage.output.net
        self.used: set[str] = set()

    def is_end(self, net: str) -> bool:
        """Tell whether a chain ends here: the net is driven, held, or another stage's input."""
        if net in self.nets.held or net in self.nets.driven or net in self.nets.rails:
            return True
        return bool(self.nets.pins.get(net, set()) - {self.stage.designator})

    def branch(self, net: str, first: Element) -> Branch:
        """Follow an element, and what stands in series behind it, to the net where it ends."""
        elements, at = [first], _other(first, net)
        own = (self.stage.inputs.plus.net, self.stage.inputs.minus.net)
        while len(elements) < LONGEST_BRANCH and at not in own and not self.is_end(at):
            on_net = self.nets.on.get(at, [])
            onward = [e for e in self.nets.two_ended(at) if e is not elements[-1]]
            if len(on_net) != 2 or len(onward) != 1:
                break
            elements.append(onward[0])
            at = _other(onward[0], at)
        return Branch(tuple(elements), net, at)

    def free(self, net: str) -> list[Branch]:
        """Return the branches of a net that are not drawn yet."""
        return [
            self.branch(net, e) for e in self.nets.two_ended(net) if e.designator not in self.used
        ]

    def take(self, branches: Iterable[Branch]) -> None:
        for branch in branches:
            self.used.update(e.designator for e in branch.elements)

    def chain(self, pin: str, other: str) -> tuple[tuple[Node, ...], str]:
        """Follow an input pin outwards; return its nodes and the net that drives it, or ""."""
        nodes: list[Node] = []
        at = pin
        if pin == self.out or pin in self.nets.held or pin in self.nets.outputs:
            return (Node(pin),), ""  # what else stands there is not this stage's
        while True:
            branches = self.free(at)
            if len(branches) > WIDEST_NODE:
                nodes.append(Node(at))
                return tuple(nodes), ""
            feedback = tuple(b for b in branches if b.end == self.out)
            rest = [b for b in branches if b.end != self.out]
            onward = self.onward([b for b in rest if b.end != other])
            if at in self.nets.driven or at in self.nets.rails:
                onward = None
            shunts = tuple(b for b in rest if b is not onward)
            self.take((*feedback, *shunts, *((onward,) if onward else ())))
            nodes.append(Node(at, feedback, shunts, onward))
            if onward is None:
                return tuple(nodes), at if self.goes_further(at) else ""
            if len(nodes) == DEEPEST_CHAIN or not self.goes_on(onward.end):
                return tuple(nodes), onward.end
            at = onward.end

    def goes_further(self, net: str) -> bool:
        """Tell whether a chain's last net has more to it than is drawn, so that it needs a name."""
        drawn = self.used | self.nets.amplifiers
        if net in self.nets.driven or self.nets.pins.get(net, set()) - {self.stage.designator}:
            return True
        return any(e.designator not in drawn for e in self.nets.on.get(net, ()))

    def goes_on(self, net: str) -> bool:
        """Tell whether a net behind a chain's element is a node of its own."""
        own = (self.stage.inputs.plus.net, self.stage.inputs.minus.net, self.out)
        return net not in own and not self.is_end(net) and bool(self.free(net))

    def onward(self, branches: list[Branch]) -> Branch | None:
        """Return the branch that leads to what drives the node: never to ground or a level."""
        ranked = [(self.rank(b), i) for i, b in enumerate(branches)]
        best = min((pair for pair in ranked if pair[0] < _NO_SOURCE), default=None)
        return branches[best[1]] if best is not None else None

    def rank(self, branch: Branch) -> int:
        """Order branches by how likely they lead to the signal, the likeliest lowest."""
        end = branch.end
        if end == GROUND or end in self.nets.rails:
            return _NO_SOURCE
        if not self.is_end(end) and self.reaches_output(end):
            return 0
        if end in self.nets.driven:
            return 1
        return _NO_SOURCE if self.is_end(end) else 2

    def reaches_output(self, net: str) -> bool:
        return any(b.end == self.out for b in self.free(net))

    def loads(self) -> tuple[Branch, ...]:
        """Return what the output drives beyond its own network."""
        found = [b for b in self.free(self.out) if b.end not in (self.out,)]
        found.sort(key=lambda b: b.end != GROUND)
        taken = tuple(found[:MOST_LOADS])
        self.take(taken)
        return taken

    def beside(self, shown: Iterable[str]) -> tuple[str, ...]:
        """Name what stands on a shown net and is not drawn."""
        left: dict[str, None] = {}
        for net in dict.fromkeys(shown):
            ours = net == self.out or net not in self.nets.outputs
            if net in self.nets.held or net in self.nets.rails or not ours:
                continue
            names = [
                element.designator
                for element in self.nets.on.get(net, ())
                if element.designator not in self.used | self.nets.amplifiers
            ]
            names += [
                self.nets.names[other]
                for other in sorted(self.nets.pins.get(net, ()))
                if other != self.stage.designator
            ]
            left.update((f"{name} at {net}", None) for name in names)
        return tuple(left)


_NO_SOURCE = 9


def _moves(element: Element) -> bool:
    """Tell whether a source is a signal: it has a wave, or is the probe of a small-signal sweep."""
    source = element.source
    return source is not None and (source.wave is not None or source.ac is not None)


def _other(element: Element, net: str) -> str:
    return element.nets[1] if element.nets[0] == net else element.nets[0]
