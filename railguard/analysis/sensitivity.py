"""How an answer moves with each element: one forward and one adjoint solution tell all of them.

For y = c.x with M x = b, one adjoint row a = c.M^-1 gives the derivative to every element:
dy/dln R = g (a_i - a_j)(x_i - x_j), dy/dln C = -sC (a_i - a_j)(x_i - x_j), and for a coil, whose
current is an unknown of its own, dy/dln L = sL a_k x_k.
"""

from collections.abc import Iterable

import msgspec
import numpy as np
import numpy.typing as npt

from railguard.analysis.equations import Complex, Real, Stamp

Index = npt.NDArray[np.int64]


TAIL = 1e-3
"""Share of an excursion its smallest parts may make together: they count to first order."""
_STORAGE = {"R": 0.0, "C": -1.0, "L": 1.0}


class Elements(msgspec.Struct, frozen=True):
    """Elements that may be off, each a pair of rows in the equations.

    first, second  rows, shape (elements,); -1: ground, or no second row
    conductance    siemens of a resistor, else zero
    storage        minus farad of a capacitor, henry of a coil, else zero
    """

    names: tuple[str, ...]
    first: Index
    second: Index
    conductance: Real
    storage: Real

    @classmethod
    def of(cls, stamps: Iterable[Stamp]) -> "Elements":
        """Collect elements from where they stand in a network's matrices."""
        stamps = tuple(stamps)
        return cls(
            names=tuple(s.designator for s in stamps),
            first=np.array([s.a for s in stamps], dtype=np.int64),
            second=np.array([-1 if s.kind == "L" else s.b for s in stamps], dtype=np.int64),
            conductance=np.array([s.value if s.kind == "R" else 0.0 for s in stamps]),
            storage=np.array([_STORAGE[s.kind] * s.value for s in stamps]),
        )

    def __len__(self) -> int:
        """Return how many there are."""
        return len(self.names)

    def pulls(self, adjoint: Complex, x: Complex, s: complex) -> Complex:
        """Return the derivative of some quantities to the logarithm of each element's value.

        adjoint  their rows of M^-1, shape (quantities, unknowns)
        x        the solution, shape (unknowns,); or one for each quantity
        s        complex frequency, 1/s
        returns  shape (quantities, elements)
        """
        factor = self.conductance + s * self.storage
        return np.asarray(self.across(adjoint) * (self.across(np.atleast_2d(x)) * factor))

    def across(self, vectors: Complex) -> Complex:
        """Return each vector's difference across each element, shape (vectors, elements)."""
        count, size = vectors.shape
        grounded = np.zeros((count, size + 1), dtype=vectors.dtype)
        grounded[:, :size] = vectors
        return np.asarray(grounded[:, self.first] - grounded[:, self.second])


def weighty(weight: Real) -> tuple[Index, Index]:
    """Return the parameters that make up a sum but for its tail, and those in the tail."""
    heavy = weight * len(weight) > TAIL * weight.sum()
    return np.flatnonzero(heavy), np.flatnonzero(~heavy)


def patterns(first: Index, second: Index, size: int) -> Complex:
    """Return plus one at the first and minus one at the second rows, shape (size, pairs)."""
    columns = np.zeros((size + 1, len(first)), dtype=np.complex128)
    pairs = np.arange(len(first))
    columns[first, pairs] = 1.0
    columns[second, pairs] -= 1.0
    return columns[:size]
