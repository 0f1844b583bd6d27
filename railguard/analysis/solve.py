"""Solving (G + sC) x = b, forwards and adjoint, each factorisation used for everything.

Dense numpy up to a few hundred unknowns; above that scipy's sparse factorisation, imported only
then because the import alone costs as much as a whole review.
"""

from collections.abc import Iterator
from typing import Protocol

import numpy as np
import numpy.typing as npt
from numpy.lib.stride_tricks import sliding_window_view

from railguard.analysis.equations import Complex, Real
from railguard.analysis.network import Network
from railguard.errors import SolveError

DENSE_LIMIT = 250
"""Unknowns up to which a dense inverse is cheaper than a sparse factorisation."""


class Factor(Protocol):
    """One factorised matrix M = G + sC."""

    def forward(self, b: Complex) -> Complex:
        """Return M^-1 b; b of shape (unknowns,) or (unknowns, columns)."""
        ...

    def adjoint(self, rows: list[int]) -> Complex:
        """Return the rows of M^-1, shape (len(rows), unknowns); a row of -1 gives zeros."""
        ...


class _Dense:
    def __init__(self, matrix: Complex | Real) -> None:
        try:
            self._inverse = np.linalg.inv(matrix)
        except np.linalg.LinAlgError as error:
            raise SolveError("The circuit's equations have no single answer.") from error

    def forward(self, b: Complex) -> Complex:
        return np.asarray(self._inverse @ b, dtype=np.complex128)

    def adjoint(self, rows: list[int]) -> Complex:
        picked = np.zeros((len(rows), self._inverse.shape[1]), dtype=np.complex128)
        for place, row in enumerate(rows):
            if row >= 0:
                picked[place] = self._inverse[row]
        return picked


class _Sparse:
    def __init__(self, network: Network, s: complex) -> None:
        # scipy costs as much to import as the whole start-up; only large circuits need it.
        from scipy.sparse import csc_matrix
        from scipy.sparse.linalg import splu

        held = network.columns
        matrix = csc_matrix(
            (held.g + complex(s) * held.c, held.rows, held.starts),
            shape=(network.size, network.size),
        )
        self._size = network.size
        try:
            self._factor = splu(matrix)
        except RuntimeError as error:
            raise SolveError("The circuit's equations have no single answer.") from error

    def forward(self, b: Complex) -> Complex:
        return np.asarray(self._factor.solve(np.ascontiguousarray(b, dtype=np.complex128)))

    def adjoint(self, rows: list[int]) -> Complex:
        picks = np.zeros((self._size, len(rows)), dtype=np.complex128)
        for column, row in enumerate(rows):
            if row >= 0:
                picks[row, column] = 1.0
        return np.asarray(self._factor.solve(picks, "T")).T


def factor(network: Network, hertz: float) -> Factor:
    """Factor the network at one frequency; 0 is DC.

    Raises  SolveError: no single answer (the network ties floating nets down, so this means
            sources that contradict each other in a way a search through the nets does not see)
    """
    return factor_at(network, 2j * np.pi * hertz)


def factor_at(network: Network, s: complex) -> Factor:
    """Factor the network at one point of the complex frequency, 1/s. Raises as `factor`."""
    if network.size <= DENSE_LIMIT:
        real = s.imag == 0
        matrix = network.g + (s.real if real else s) * network.c if s else network.g
        return _Dense(np.asarray(matrix))
    return _Sparse(network, s)


STRETCH_ENTRIES = 400_000
"""Numbers held to take several steps at once: 3 MB."""
LONGEST_STRETCH = 64


class Stepper:
    """A linear transient in equal steps, many of them at once.

    A step is x' = A x + v d with A = M^-1 C/h and v = M^-1 b, so K steps from one state are K
    powers of A, worked out once, and the steps' own drives folded with A^k v.
    """

    def __init__(self, network: Network, seconds: float) -> None:
        """Factor M = G + C/h."""
        self._steady = factor(network, 0.0)
        # A step of h seconds is the matrix at s = 1/h.
        self._step = factor_at(network, 1.0 / seconds)
        self._entries = network.entries()[1]
        self._seconds = seconds
        self._size = network.size

    def _history(self) -> tuple[npt.NDArray[np.int64], Complex]:
        """Return the columns of C that are not empty, and those columns over the step's length."""
        kept = np.array(sorted({column for _, column, _ in self._entries}), dtype=np.int64)
        place = {int(column): k for k, column in enumerate(kept)}
        history = np.zeros((self._size, len(kept)), dtype=np.complex128)
        for row, column, value in self._entries:
            history[row, place[column]] += value / self._seconds
        return kept, history

    def steady(self, b: Real) -> Real:
        """Return the state that a standing right-hand side leads to."""
        return self._steady.forward(b.astype(np.complex128)).real

    def along(self, x: Real, b: Real, drive: Real) -> Iterator[Real]:
        """Yield the states one stretch of steps after the other, shape (steps, unknowns).

        x      state before the first step
        b      right-hand side for a drive of one
        drive  its value at each step
        """
        v = self._step.forward(b.astype(np.complex128)).real
        # Only what stores energy remembers: the other columns of A are zero.
        kept, history = self._history()
        advance = self._step.forward(history).real
        room = STRETCH_ENTRIES // max(self._size * max(len(kept), 1), 1)
        stretch = int(min(max(room, 1), LONGEST_STRETCH, len(drive)))
        powers, answers = [advance], [v]
        for _ in range(stretch - 1):
            answers.append(advance @ answers[-1][kept])
            powers.append(advance @ powers[-1][kept])
        stacked = np.concatenate(powers)
        response = np.array(answers)
        for start in range(0, len(drive), stretch):
            part = drive[start : start + stretch]
            count = len(part)
            own = (stacked[: count * self._size] @ x[kept]).reshape(count, self._size)
            # Row n is the sum of d[k] A^(n-k) v over the steps k up to n.
            padded = np.concatenate([np.zeros(count - 1), part])
            folded = sliding_window_view(padded, count)[:, ::-1] @ response[:count]
            states = own + folded
            yield states
            x = states[-1]


AT_ONCE = 16
"""Frequencies solved in one call: their matrices then fit a cache, and need no fresh memory."""


def _solved_at(
    network: Network, hertz: np.ndarray[tuple[int], np.dtype[np.float64]], b: Complex
) -> Complex:
    """Return (G + sC)^-1 b of a dense network, shape (frequencies, unknowns, columns).

    Raises  SolveError
    """
    omega = 2 * np.pi * hertz
    solved = np.empty((len(hertz), *b.shape), dtype=np.complex128)
    matrices = np.empty((min(AT_ONCE, len(hertz)), *network.g.shape), dtype=np.complex128)
    for start in range(0, len(hertz), AT_ONCE):
        some = omega[start : start + AT_ONCE, None, None]
        part = matrices[: len(some)]
        part.real = network.g
        np.multiply(some, network.c, out=part.imag)
        try:
            solved[start : start + AT_ONCE] = np.linalg.solve(part, b[None, :, :])
        except np.linalg.LinAlgError as error:
            raise SolveError("The circuit's equations have no single answer.") from error
    return solved


def return_ratios(network: Network, hertz: np.ndarray[tuple[int], np.dtype[np.float64]]) -> Complex:
    """Return each amplifier's own loop transmission A*beta, all others active.

    hertz    shape (frequencies,)
    returns  shape (frequencies, amplifiers): positive real is negative feedback. Zero for an
             amplifier that is forced.

    With z = (v+ - v-) per unit entry in an amplifier's row, breaking its loop by itself gives
    w = z / (1 + z) and A*beta = -w (Sherman-Morrison on the row).

    Source  H. W. Bode, Network Analysis and Feedback Amplifier Design, return ratio; from memory
    """
    rows = [network.outputs.get(a.designator, -1) for a in network.amplifiers]
    picks = np.zeros((network.size, len(rows)), dtype=np.complex128)
    for column, row in enumerate(rows):
        if row >= 0:
            picks[row, column] = 1.0
    columns = np.arange(len(rows))
    plus = np.array([network.row(a.plus) for a in network.amplifiers], dtype=np.int64)
    minus = np.array([network.row(a.minus) for a in network.amplifiers], dtype=np.int64)
    if network.size <= DENSE_LIMIT:
        solved = _solved_at(network, hertz, picks)
        z = np.where(plus >= 0, solved[:, plus, columns], 0.0)
        z = z - np.where(minus >= 0, solved[:, minus, columns], 0.0)
    else:
        z = np.zeros((len(hertz), len(rows)), dtype=np.complex128)
        for place, f in enumerate(hertz):
            x = factor(network, float(f)).forward(picks)
            z[place] = np.where(plus >= 0, x[plus, columns], 0.0)
            z[place] -= np.where(minus >= 0, x[minus, columns], 0.0)
    # A loop whose break leaves nothing to solve has no transmission of its own.
    rest = 1.0 + z
    result = np.where(rest == 0, 0.0, -z / np.where(rest == 0, 1.0, rest))
    idle = [
        r < 0 or a.designator in network.forced
        for r, a in zip(rows, network.amplifiers, strict=True)
    ]
    result[:, idle] = 0.0
    return np.asarray(result)
