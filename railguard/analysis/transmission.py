"""One amplifier's loop transmission at one frequency, its derivatives, and how it moves.

With z the voltage between an amplifier's inputs per unit in its own row, its loop transmission is
T = -z / (1 + z) (as in `solve.return_ratios`); one forward and one adjoint solution give the
derivative of ln T to every element and to frequency. At other values it is solved by a change of
low rank to the factorisation at hand, so that it is exact and not of first order.

Source  d(M^-1) = -M^-1 dM M^-1; change of low rank: Sherman, Morrison and Woodbury
"""

import msgspec
import numpy as np
import numpy.typing as npt

from railguard.analysis.deviations import Off
from railguard.analysis.equations import Complex, Real
from railguard.analysis.network import Network
from railguard.analysis.sensitivity import patterns, weighty
from railguard.analysis.solve import DENSE_LIMIT, factor

Index = npt.NDArray[np.int64]


class Moved(msgspec.Struct, frozen=True):
    """ln T of one loop at some shares: its value and derivatives.

    value            ln T, shape (corners,)
    first, second    its derivatives to the logarithm of frequency
    gradient         its derivative to each share, shape (corners, parameters)
    """

    value: Complex
    first: Complex
    second: Complex
    gradient: Complex


class Solved:
    """A network factored at one frequency."""

    def __init__(self, network: Network, off: Off, hertz: float) -> None:
        """Factor it; `off` says what may be off in it."""
        self.network, self.off, self.hertz = network, off, hertz
        self.s = 2j * np.pi * hertz
        self.factor = factor(network, hertz)
        # A coefficient's factor: 1 for a conductance, s for what stores energy.
        self.unit = np.where(off.storing, self.s, 1.0)

    def loop(self, k: int) -> "Transmission | None":
        """Return one amplifier's loop; None where it has none."""
        amplifier = self.network.amplifiers[k]
        row = self.network.outputs.get(amplifier.designator, -1)
        if row < 0 or amplifier.designator in self.network.forced:
            return None
        return Transmission(self, k, row)

    def stored(self, x: Complex) -> Complex:
        """Return C x of some solutions, shape (solutions, unknowns)."""
        if self.network.size <= DENSE_LIMIT:
            return np.asarray(x @ self.network.c.T)
        out = np.zeros(x.shape, dtype=np.complex128)
        for row, column, value in self.network.entries()[1]:
            out[:, row] += value * x[:, column]
        return out


def _across(vectors: Complex, at: Index, second: Real | float = -1.0) -> Complex:
    """Return what each vector has at the first rows, and `second` times at the second ones.

    returns  shape (vectors, parameters)
    """
    padded = np.concatenate([vectors, np.zeros((len(vectors), 1))], axis=1)
    return np.asarray(padded[:, at[:, 0]] + second * padded[:, at[:, 1]])


class Transmission:
    """One amplifier's loop at one frequency, and what moves it.

    nominal  ln T with every parameter at its value
    """

    def __init__(self, solved: Solved, k: int, row: int) -> None:
        """Take amplifier number `k`, whose own row is `row`."""
        network, off = solved.network, solved.off
        self.solved, self.k = solved, k
        amplifier = network.amplifiers[k]
        unit = np.zeros(network.size, dtype=np.complex128)
        unit[row] = 1.0
        self._x = solved.factor.forward(unit)[None, :]
        rows = solved.factor.adjoint([network.row(amplifier.plus), network.row(amplifier.minus)])
        self._a = (rows[0] - rows[1])[None, :]
        self._z = self._a[:, row]
        stored = solved.stored(self._x)
        again = solved.factor.forward(stored.T).T
        none = np.zeros((1, len(off.value)))
        self.nominal = self._derived(self._x, self._a, self._z, none, stored, solved.stored(again))

    def moved(self, shares: Real) -> Moved:
        """Return the loop with its parameters off by some shares, shape (corners, parameters).

        What moves it least counts to first order, all else exactly.
        """
        solved, off = self.solved, self.solved.off
        pulls = self.nominal.gradient[0] * shares
        picks, rest = weighty(np.abs(pulls).max(axis=0, initial=0.0))
        left, right, second = off.left[picks], off.right[picks], off.second[picks]
        change = off.change(shares)[:, picks]
        coefficient = change * solved.unit[picks]
        storage = np.where(off.storing[picks], change, 0.0)
        u, w = _across(self._a, left)[0], _across(self._x, right, second)[0]
        entering = patterns(left[:, 0], left[:, 1], solved.network.size)
        forward = solved.factor.forward(entering)
        leaving = solved.factor.adjoint([int(row) for row in right.ravel()])
        back = leaving[0::2] + second[:, None] * leaving[1::2]
        # (M + U D W')^-1 = N - N U Q W' N with Q = (1 + D W' N U)^-1 D and N = M^-1.
        unity = np.eye(len(picks))
        system = unity + coefficient[:, :, None] * _across(back, left)[None, :, :]
        try:
            rank = np.linalg.solve(system, coefficient[:, :, None] * unity)
        except np.linalg.LinAlgError:  # a corner without an answer
            rank = np.full(system.shape, np.nan, dtype=np.complex128)
        x = self._x - (rank @ w) @ forward.T
        a = self._a - (u @ rank) @ back
        z = self._z - (u @ rank) @ w
        stored = solved.stored(x) + (storage * _across(x, right, second)) @ entering.T
        again = solved.factor.forward(stored.T).T
        again = again - np.einsum("ekl,el->ek", rank, stored @ back.T) @ forward.T
        curved = solved.stored(again) + (storage * _across(again, right, second)) @ entering.T
        moved = self._derived(x, a, z, shares, stored, curved)
        return msgspec.structs.replace(moved, value=moved.value + pulls[:, rest].sum(axis=1))

    def _derived(
        self, x: Complex, a: Complex, z: Complex, shares: Real, stored: Complex, curved: Complex
    ) -> Moved:
        """Return ln T and its derivatives.

        x, a    forward and adjoint solution of each corner, shape (corners, unknowns)
        z       volts between the inputs, shape (corners,)
        stored  C x of each corner; curved: C M^-1 C x
        """
        off, s = self.solved.off, self.solved.s
        scale = z * (1.0 + z)
        # dz/ds = -a C x, and d2z/ds2 = 2 a C M^-1 C x.
        first, second = -(a * stored).sum(axis=1) / scale, 2 * (a * curved).sum(axis=1) / scale
        along = s * first
        bend = s * s * (second - first * first * (1.0 + 2.0 * z)) + along
        gradient = -_across(a, off.left) * _across(x, off.right, off.second) / scale[:, None]
        gradient = gradient * off.slope(shares) * self.solved.unit
        return Moved(np.log(-z / (1.0 + z)), along, bend, gradient)
