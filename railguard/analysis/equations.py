"""The equations of a circuit while they are written down: their rows, and the entries of G and C.

A net has a row for its voltage; a branch whose voltage is defined (V, E and H sources, inductors,
amplifier outputs) one for its current, which counts from its first net through it to the second.
"""

import msgspec
import numpy as np
import numpy.typing as npt

from railguard.analysis.sets import Sets
from railguard.circuit.model import GROUND

Real = npt.NDArray[np.float64]
Complex = npt.NDArray[np.complex128]
Entries = list[tuple[int, int, float]]


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


class Equations:
    """Rows and entries, filled element by element.

    rows        net -> row
    branches    rows that are currents
    stamps      the elements with a tolerance, for sensitivities
    injections  by source designator
    outputs     amplifier designator -> its branch row
    conflicts   designators left out because their voltage contradicts others (loops of sources)
    g, c        entries of the two matrices, those of one place to be added up
    """

    def __init__(self) -> None:
        """Begin with nothing: nets first (`add_net`), then all else."""
        self.rows: dict[str, int] = {}
        self.branches: list[Branch] = []
        self.stamps: list[Stamp] = []
        self.injections: dict[str, Injection] = {}
        self.outputs: dict[str, int] = {}
        self.conflicts: list[tuple[str, ...]] = []
        self.g: Entries = []
        self.c: Entries = []
        self._held = Sets()

    def copy(self) -> "Equations":
        """Return equations that go on from here by themselves; the nets are the same."""
        other = Equations()
        other.rows = self.rows
        other.branches, other.stamps = [*self.branches], [*self.stamps]
        other.injections, other.outputs = dict(self.injections), dict(self.outputs)
        other.conflicts, other._held = [*self.conflicts], self._held.copy()
        other.g, other.c = [*self.g], [*self.c]
        return other

    @property
    def size(self) -> int:
        """Unknowns so far."""
        return len(self.rows) + len(self.branches)

    def add_net(self, net: str) -> None:
        """Give a net its row."""
        if net != GROUND:
            self.rows.setdefault(net, len(self.rows))

    def row(self, net: str) -> int:
        """Return the row of a net's voltage; -1 for ground or a net nobody is on."""
        return -1 if net == GROUND else self.rows.get(net, -1)

    def hold(self, designator: str, kind: str, a: str, b: str) -> int | None:
        """Add a branch that defines a voltage; None where its two nets are already held."""
        if kind != "L" and not self._held.join(a, b):
            self.conflicts.append((designator, a, b))
            return None
        row = self.size
        self.branches.append(Branch(designator, kind, row, (a, b)))
        return row

    def branch(self, designator: str, kind: str, a: str, b: str) -> int | None:
        """Add such a branch whose current its two nets take part in."""
        row = self.hold(designator, kind, a, b)
        if row is None:
            return None
        for net, sign in ((a, 1.0), (b, -1.0)):
            at = self.row(net)
            if at >= 0:
                self.g.append((at, row, sign))
                self.g.append((row, at, sign))
        return row

    def source(self, designator: str, kind: str, a: str, b: str) -> int | None:
        """Add a branch whose voltage something from outside sets."""
        row = self.branch(designator, kind, a, b)
        if row is not None:
            self.injections[designator] = Injection(designator, row, -1, -1)
        return row

    def conductance(self, designator: str, kind: str, a: str, b: str, value: float) -> None:
        """Add an element between two nets: siemens of an "R", farad of a "C"."""
        i, j = self.row(a), self.row(b)
        if i == j:
            return
        target = self.g if kind == "R" else self.c
        for p, q, sign in ((i, i, 1.0), (j, j, 1.0), (i, j, -1.0), (j, i, -1.0)):
            if p >= 0 and q >= 0:
                target.append((p, q, sign * value))
        self.stamps.append(Stamp(designator, kind, i, j, value))
