"""The circuit as equations: modified nodal analysis, (G + sC) x = b.

Unknowns are the voltages of all nets but ground, then one current for each branch whose voltage
is defined: V, E and H sources, inductors, amplifier outputs. An amplifier with one pole is the row

    v(out) (1/A0 + s / 2 pi GBW) - (v(in+) - v(in-)) = Vos

so that the whole network stays linear in s, its output current is an unknown of its own, and its
offset is an entry of b. Currents of branches count from the first net through the branch to the
second; an amplifier's current counts as flowing out of it into its net.
"""

from collections.abc import Iterable, Mapping, Sequence
from functools import cached_property
from types import MappingProxyType
from typing import NamedTuple

import msgspec
import numpy as np
import numpy.typing as npt

from railguard.analysis.recognise import Amplifier
from railguard.analysis.sets import Sets
from railguard.circuit.model import GROUND, Element

Real = npt.NDArray[np.float64]
Complex = npt.NDArray[np.complex128]
Entries = list[tuple[int, int, float]]

UNSTAMPED = frozenset({"open", "ic", "opaque", "X", "K"})
"""Kinds that stand in no equation: two nets do not meet in them."""
OPEN_LOOP_GAIN = 2e5
"""DC open-loop gain of an amplifier whose data sheet's is not in the catalogue: common practice."""
WINDING_OHMS = 1e-3
"""Resistance given to an inductor or a link, so that two in parallel stay solvable at DC."""
LEAK_SIEMENS = 1e-12
"""Ties a net without DC path to ground, so that the rest can be solved. Its level means nothing."""


class Stamp(msgspec.Struct, frozen=True):
    """An element that stands in G or C: between rows `a` and `b` (-1: ground), SI value.

    kind  "R" (value is siemens), "C" (farad) or "L" (henry; `a` is then its branch row)
    """

    designator: str
    kind: str
    a: int
    b: int
    value: float


class Branch(msgspec.Struct, frozen=True):
    """A row of x that is a current."""

    designator: str
    kind: str
    row: int
    nets: tuple[str, str]


class Injection(msgspec.Struct, frozen=True):
    """Something from outside: a voltage or a current that b can carry.

    row    for a voltage source: its branch row (b[row] = volts)
    nets   for a current: amperes leave nets[0] and enter nets[1] inside the source
    """

    name: str
    row: int
    a: int
    b: int

    def into(self, b: Complex, value: complex) -> None:
        """Add `value` volts or amperes of this injection to a right-hand side, in place."""
        if self.row >= 0:
            b[self.row] += value
            return
        if self.a >= 0:
            b[self.a] -= value
        if self.b >= 0:
            b[self.b] += value


class Parasitics(msgspec.Struct, frozen=True):
    """What an amplifier adds to its own loop: farads at the inverting input, ohms at the output."""

    input_farads: float
    output_ohms: float


class Columns(NamedTuple):
    """Two matrices of one shape by column (CSC), their entries at the same places.

    g, c    values, shape (entries,)
    rows    of each entry, ascending in its column
    starts  place of each column's first entry, and the number of entries
    """

    g: Real
    c: Real
    rows: npt.NDArray[np.int32]
    starts: npt.NDArray[np.int32]


class _Passive(NamedTuple):
    """What a network holds before its amplifiers are stamped: the same however they are taken."""

    branches: list[Branch]
    stamps: list[Stamp]
    injections: dict[str, Injection]
    conflicts: list[tuple[str, ...]]
    held: Sets
    g: Entries
    c: Entries


class Network:
    """G, C and the way from names to rows.

    g, c        matrices, shape (unknowns, unknowns)
    stamps      the elements with a tolerance, for sensitivities
    injections  by source designator
    outputs     amplifier designator -> its branch row
    floating    nets whose DC level nothing defines
    conflicts   designators left out because their voltage contradicts others (loops of sources)
    """

    def __init__(
        self,
        elements: Iterable[Element],
        amplifiers: Sequence[Amplifier],
        forced: frozenset[str] = frozenset(),
        extra: "Mapping[str, Parasitics]" = MappingProxyType({}),
    ) -> None:
        """Stamp everything.

        forced  amplifiers whose output is a plain source: those without a working loop
        extra   input capacitance and output resistance by amplifier
        """
        self.rows: dict[str, int] = {}
        self.branches: list[Branch] = []
        self.stamps: list[Stamp] = []
        self.injections: dict[str, Injection] = {}
        self.outputs: dict[str, int] = {}
        self.conflicts: list[tuple[str, ...]] = []
        self._g: Entries = []
        self._c: Entries = []
        self.amplifiers = tuple(amplifiers)
        self.forced = forced
        kept = [e for e in elements if e.fitted]
        self._held = Sets()
        amplifier_elements = {id(a.element) for a in amplifiers}
        for element in kept:
            if element.kind in UNSTAMPED or id(element) in amplifier_elements:
                continue
            steering = element.control.nets if element.control is not None else ()
            for net in (*element.nets, *steering):
                self._row(net)
        for amplifier in amplifiers:
            pins = (amplifier.plus, amplifier.minus, amplifier.output)
            for net in (*pins, amplifier.positive, amplifier.negative):
                if net:
                    self._row(net)
        self.net_count = len(self.rows)
        self._next = self.net_count
        self._later = []
        for element in kept:
            if id(element) in amplifier_elements:
                continue
            if element.kind in ("F", "H"):
                self._later.append(element)
            else:
                self._stamp(element)
        self._passive = self._state()
        self._stamp_active(extra)
        self.size = max(self._next, 1)
        self.floating, self._leaks = self._find_floating()
        self._g += self._leaks

    def again(
        self,
        forced: frozenset[str] = frozenset(),
        extra: "Mapping[str, Parasitics]" = MappingProxyType({}),
    ) -> "Network":
        """Return the network of the same elements with its amplifiers taken otherwise."""
        other = Network.__new__(Network)
        other.rows, other.net_count = self.rows, self.net_count
        other.amplifiers, other.forced = self.amplifiers, forced
        other._later, other._passive = self._later, self._passive
        state = self._passive
        other.branches, other.stamps = [*state.branches], [*state.stamps]
        other.injections, other.outputs = dict(state.injections), {}
        other.conflicts, other._held = [*state.conflicts], state.held.copy()
        other._g, other._c = [*state.g], [*state.c]
        other._next = self.net_count + len(state.branches)
        other._stamp_active(extra)
        other.size = self.size
        # What conducts at DC is the same however an amplifier is taken.
        other.floating, other._leaks = self.floating, self._leaks
        other._g += self._leaks
        return other

    def _state(self) -> "_Passive":
        return _Passive(
            [*self.branches],
            [*self.stamps],
            dict(self.injections),
            [*self.conflicts],
            self._held.copy(),
            [*self._g],
            [*self._c],
        )

    def _stamp_active(self, extra: "Mapping[str, Parasitics]") -> None:
        for amplifier in self.amplifiers:
            self._stamp_amplifier(
                amplifier, amplifier.designator in self.forced, extra.get(amplifier.designator)
            )
        for element in self._later:
            self._stamp_current_controlled(element)
        if not self._next:  # everything is tied to ground: one unknown, zero, keeps the algebra
            self._g.append((0, 0, 1.0))

    @cached_property
    def g(self) -> Real:
        """The conductances, dense."""
        return _dense(self._g, self.size)

    @cached_property
    def c(self) -> Real:
        """The capacitances and inductances, dense."""
        return _dense(self._c, self.size)

    @cached_property
    def columns(self) -> Columns:
        """G and C by column, for sparse solving at any frequency."""
        size, count = self.size, len(self._g)
        rows, columns, values = (np.array(part) for part in zip(*self._g, *self._c, strict=True))
        places, at = np.unique(columns * size + rows, return_inverse=True)
        return Columns(
            g=np.bincount(at[:count], values[:count], len(places)).astype(np.float64),
            c=np.bincount(at[count:], values[count:], len(places)).astype(np.float64),
            rows=(places % size).astype(np.int32),
            starts=np.searchsorted(places // size, np.arange(size + 1)).astype(np.int32),
        )

    def entries(self) -> tuple[Entries, Entries]:
        """Return G and C as (row, column, value) entries, those of one place to be added up."""
        return self._g, self._c

    def row(self, net: str) -> int:
        """Return the row of a net's voltage; -1 for ground or a net nobody is on."""
        return -1 if net == GROUND else self.rows.get(net, -1)

    def has(self, net: str) -> bool:
        """Tell whether a net exists."""
        return net == GROUND or net in self.rows

    def right_hand_side(self, drives: Iterable[tuple[str, complex]]) -> Complex:
        """Return b for some (injection, volts or amperes), shape (unknowns,)."""
        b = np.zeros(self.size, dtype=np.complex128)
        for name, value in drives:
            if name in self.injections:
                self.injections[name].into(b, value)
        return b

    def _row(self, net: str) -> int:
        if net == GROUND:
            return -1
        return self.rows.setdefault(net, len(self.rows))

    def _branch(self, designator: str, kind: str, a: str, b: str) -> int | None:
        """Add a branch whose voltage is defined; None where its two nets are already held."""
        if kind != "L" and not self._held.join(a, b):
            self.conflicts.append((designator, a, b))
            return None
        row = self._next
        self._next += 1
        self.branches.append(Branch(designator, kind, row, (a, b)))
        for net, sign in ((a, 1.0), (b, -1.0)):
            at = self.row(net)
            if at >= 0:
                self._g.append((at, row, sign))
                self._g.append((row, at, sign))
        return row

    def _conductance(self, designator: str, a: str, b: str, siemens: float, kind: str) -> None:
        i, j = self.row(a), self.row(b)
        if i == j:
            return
        target = self._g if kind == "R" else self._c
        for p, q, sign in ((i, i, 1.0), (j, j, 1.0), (i, j, -1.0), (j, i, -1.0)):
            if p >= 0 and q >= 0:
                target.append((p, q, sign * siemens))
        self.stamps.append(Stamp(designator, kind, i, j, siemens))

    def _stamp(self, element: Element) -> None:
        nets = element.nets
        match element.kind:
            case "R" if element.value is not None:
                ohms = element.value if abs(element.value) > WINDING_OHMS else WINDING_OHMS
                self._conductance(element.designator, nets[0], nets[1], 1.0 / ohms, "R")
            case "link" if len(nets) >= 2:
                ohms = max(element.value or 0.0, WINDING_OHMS)
                self._conductance(element.designator, nets[0], nets[1], 1.0 / ohms, "R")
            case "C" if element.value is not None:
                self._conductance(element.designator, nets[0], nets[1], element.value, "C")
            case "L":
                row = self._branch(element.designator, "L", nets[0], nets[1])
                if row is not None:
                    henry = element.value or 0.0
                    self._g.append((row, row, -WINDING_OHMS))
                    self._c.append((row, row, -henry))
                    self.stamps.append(Stamp(element.designator, "L", row, row, henry))
            case "V" | "battery":
                row = self._branch(element.designator, "V", nets[0], nets[1])
                if row is not None:
                    self.injections[element.designator] = Injection(element.designator, row, -1, -1)
            case "I":
                self.injections[element.designator] = Injection(
                    element.designator, -1, self.row(nets[0]), self.row(nets[1])
                )
            case "E":
                self._stamp_voltage_controlled(element)
            case "G":
                self._stamp_transconductance(element)
            case "B" if "v" in element.parameters or element.text[:1].lower() == "v":
                row = self._branch(element.designator, "V", nets[0], nets[1])
                if row is not None:
                    self.injections[element.designator] = Injection(element.designator, row, -1, -1)
            case _:
                pass

    def _stamp_voltage_controlled(self, element: Element) -> None:
        row = self._branch(element.designator, "E", element.nets[0], element.nets[1])
        control = element.control
        if row is None:
            return
        self.injections[element.designator] = Injection(element.designator, row, -1, -1)
        if control is None or control.gain is None or len(control.nets) != 2:
            return
        for net, sign in zip(control.nets, (-1.0, 1.0), strict=True):
            at = self.row(net)
            if at >= 0:
                self._g.append((row, at, sign * control.gain))

    def _stamp_transconductance(self, element: Element) -> None:
        control = element.control
        if control is None or control.gain is None or len(control.nets) != 2:
            return
        for net, out in zip(element.nets, (1.0, -1.0), strict=False):
            i = self.row(net)
            for sense, sign in zip(control.nets, (1.0, -1.0), strict=True):
                j = self.row(sense)
                if i >= 0 and j >= 0:
                    self._g.append((i, j, out * sign * control.gain))

    def _stamp_current_controlled(self, element: Element) -> None:
        control = element.control
        sensed = next(
            (b.row for b in self.branches if control and b.designator == control.element), None
        )
        if element.kind == "H":
            row = self._branch(element.designator, "H", element.nets[0], element.nets[1])
            if row is None:
                return
            self.injections[element.designator] = Injection(element.designator, row, -1, -1)
            if control is not None and control.gain is not None and sensed is not None:
                self._g.append((row, sensed, -control.gain))
            return
        if control is None or control.gain is None or sensed is None:
            return
        for net, sign in zip(element.nets, (1.0, -1.0), strict=False):
            at = self.row(net)
            if at >= 0:
                self._g.append((at, sensed, sign * control.gain))

    def _stamp_amplifier(
        self, amplifier: Amplifier, forced: bool, parasitics: "Parasitics | None"
    ) -> None:
        out = self.row(amplifier.output)
        if out < 0 or not self._held.join(amplifier.output, GROUND):
            self.conflicts.append((amplifier.designator, amplifier.output, GROUND))
            return
        row = self._next
        self._next += 1
        self.branches.append(Branch(amplifier.designator, "A", row, (amplifier.output, GROUND)))
        self.outputs[amplifier.designator] = row
        self._g.append((out, row, -1.0))
        self.injections[amplifier.designator] = Injection(amplifier.designator, row, -1, -1)
        if forced:
            self._g.append((row, out, 1.0))
            return
        inverse_gain = 1.0 / open_loop_gain(amplifier)
        self._g.append((row, out, inverse_gain))
        gbw = gain_bandwidth(amplifier)
        integration = 1.0 / (2 * np.pi * gbw) if gbw else 0.0
        if integration:
            self._c.append((row, out, integration))
        if parasitics is not None:
            self._g.append((row, row, parasitics.output_ohms * inverse_gain))
            self._c.append((row, row, parasitics.output_ohms * integration))
            minus = self.row(amplifier.minus)
            if minus >= 0:
                self._c.append((minus, minus, parasitics.input_farads))
        for net, sign in ((amplifier.plus, -1.0), (amplifier.minus, 1.0)):
            at = self.row(net)
            if at >= 0:
                self._g.append((row, at, sign))

    def _find_floating(self) -> tuple[frozenset[str], Entries]:
        """Return the nets without a DC way to ground, and the entries that tie them down."""
        sets = Sets()
        for branch in self.branches:
            sets.join(*branch.nets)
        names = {row: net for net, row in self.rows.items()} | {-1: GROUND}
        for stamp in self.stamps:
            if stamp.kind == "R":
                sets.join(names[stamp.a], names[stamp.b])
        home = sets.find(GROUND)
        groups: dict[str, list[str]] = {}
        for net in self.rows:
            root = sets.find(net)
            if root != home:
                groups.setdefault(root, []).append(net)
        tied = [self.rows[nets[0]] for nets in groups.values()]
        leaks = [(row, row, LEAK_SIEMENS) for row in tied]
        return frozenset(net for nets in groups.values() for net in nets), leaks


def open_loop_gain(amplifier: Amplifier) -> float:
    """Return an amplifier's DC open-loop gain, V/V."""
    if amplifier.gain is not None:
        return amplifier.gain
    device = amplifier.match.device
    if device is None:
        return OPEN_LOOP_GAIN
    return device.open_loop_gain.typical or device.open_loop_gain.guaranteed or OPEN_LOOP_GAIN


def gain_bandwidth(amplifier: Amplifier) -> float | None:
    """Return an amplifier's gain-bandwidth product, hertz; typical, as a bandwidth is drawn."""
    device = amplifier.match.device
    if device is None:
        return None
    listed = device.gain_bandwidth
    return listed.typical if listed.typical is not None else listed.guaranteed


def _dense(entries: Entries, size: int) -> Real:
    matrix = np.zeros((size, size))
    if entries:
        i, j, v = zip(*entries, strict=True)
        np.add.at(matrix, (np.array(i), np.array(j)), np.array(v))
    return matrix
