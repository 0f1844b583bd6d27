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

import numpy as np
import numpy.typing as npt

from railguard.analysis.equations import Branch, Complex, Entries, Equations, Injection, Real, Stamp
from railguard.analysis.recognise import Amplifier
from railguard.analysis.sets import Sets
from railguard.analysis.stamping import (
    Parasitics,
    stamp,
    stamp_amplifier,
    stamp_current_controlled,
)
from railguard.circuit.model import GROUND, Element

UNSTAMPED = frozenset({"open", "ic", "opaque", "X", "K"})
"""Kinds that stand in no equation: two nets do not meet in them."""
LEAK_SIEMENS = 1e-12
"""Ties a net without DC path to ground, so that the rest can be solved. Its level means nothing."""


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
    """What a network holds before its amplifiers are stamped: the same however they are taken.

    later  elements that a current controls, stamped when every branch has its row
    """

    equations: Equations
    amplifiers: tuple[Amplifier, ...]
    later: tuple[Element, ...]


class Network:
    """G, C and the way from names to rows.

    g, c        matrices, shape (unknowns, unknowns)
    rows        net -> row; the first `net_count` rows are nets, the others branches
    branches    rows that are currents
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
        extra: Mapping[str, Parasitics] = MappingProxyType({}),
    ) -> None:
        """Stamp everything.

        forced  amplifiers whose output is a plain source: those without a working loop
        extra   input capacitance and output resistance by amplifier
        """
        self._take(_passive(elements, tuple(amplifiers)), forced, extra)
        self.floating, self._leaks = _floating(self.rows, self.branches, self.stamps)
        self._g += self._leaks

    def again(
        self,
        forced: frozenset[str] = frozenset(),
        extra: Mapping[str, Parasitics] = MappingProxyType({}),
    ) -> "Network":
        """Return the network of the same elements with its amplifiers taken otherwise."""
        other = Network.__new__(Network)
        other._take(self._passive, forced, extra)
        # What conducts at DC is the same however an amplifier is taken.
        other.floating, other._leaks = self.floating, self._leaks
        other._g += self._leaks
        return other

    def _take(
        self, passive: _Passive, forced: frozenset[str], extra: Mapping[str, Parasitics]
    ) -> None:
        self._passive = passive
        self.amplifiers, self.forced = passive.amplifiers, forced
        equations = passive.equations.copy()
        for amplifier in passive.amplifiers:
            name = amplifier.designator
            stamp_amplifier(equations, amplifier, name in forced, extra.get(name))
        for element in passive.later:
            stamp_current_controlled(equations, element)
        if not equations.size:  # everything is tied to ground: one zero keeps the algebra
            equations.g.append((0, 0, 1.0))
        self.size = max(equations.size, 1)
        self.rows: dict[str, int] = equations.rows
        self.net_count = len(equations.rows)
        self.branches: list[Branch] = equations.branches
        self.stamps: list[Stamp] = equations.stamps
        self.injections: dict[str, Injection] = equations.injections
        self.outputs: dict[str, int] = equations.outputs
        self.conflicts: list[tuple[str, ...]] = equations.conflicts
        self._g, self._c = equations.g, equations.c

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
        return self.rows.get(net, -1)

    def right_hand_side(self, drives: Iterable[tuple[str, complex]]) -> Complex:
        """Return b for some (injection, volts or amperes), shape (unknowns,)."""
        b = np.zeros(self.size, dtype=np.complex128)
        for name, value in drives:
            if name in self.injections:
                self.injections[name].into(b, value)
        return b


def _passive(elements: Iterable[Element], amplifiers: tuple[Amplifier, ...]) -> _Passive:
    """Write down everything but amplifiers, and what a current controls."""
    equations, later = Equations(), []
    own = {id(a.element) for a in amplifiers}
    kept = [e for e in elements if e.fitted and id(e) not in own]
    for element in kept:
        if element.kind in UNSTAMPED:
            continue
        steering = element.control.nets if element.control is not None else ()
        for net in (*element.nets, *steering):
            equations.add_net(net)
    for amplifier in amplifiers:
        pins = (amplifier.plus, amplifier.minus, amplifier.output)
        for net in (*pins, amplifier.positive, amplifier.negative):
            if net:
                equations.add_net(net)
    for element in kept:
        if element.kind in ("F", "H"):
            later.append(element)
        else:
            stamp(equations, element)
    return _Passive(equations, amplifiers, tuple(later))


def _floating(
    rows: Mapping[str, int], branches: Iterable[Branch], stamps: Iterable[Stamp]
) -> tuple[frozenset[str], Entries]:
    """Return the nets without a DC way to ground, and the entries that tie them down."""
    sets = Sets()
    for branch in branches:
        sets.join(*branch.nets)
    names = {row: net for net, row in rows.items()} | {-1: GROUND}
    for element in stamps:
        if element.kind == "R":
            sets.join(names[element.a], names[element.b])
    home = sets.find(GROUND)
    groups: dict[str, list[str]] = {}
    for net in rows:
        root = sets.find(net)
        if root != home:
            groups.setdefault(root, []).append(net)
    tied = [rows[nets[0]] for nets in groups.values()]
    leaks = [(row, row, LEAK_SIEMENS) for row in tied]
    return frozenset(net for nets in groups.values() for net in nets), leaks


def _dense(entries: Entries, size: int) -> Real:
    matrix = np.zeros((size, size))
    if entries:
        i, j, v = zip(*entries, strict=True)
        np.add.at(matrix, (np.array(i), np.array(j)), np.array(v))
    return matrix
