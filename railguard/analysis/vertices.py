"""The ends of an answer over the tolerances of elements, solved at the corners they lie in.

The derivatives (`sensitivity`) choose a corner. The answer there is solved by a change of low rank
to the factorisation at hand, so that it is exact and not of first order. Where it bends so much
that the derivatives at the corner point elsewhere, that corner is tried in turn; and where a
quantity turns round on the way its extreme lies inside the box: the triangle under the derivative,
from its zero to the corner, is added.

Source  change of low rank: Sherman, Morrison and Woodbury
"""

from collections.abc import Sequence

import msgspec
import numpy as np

from railguard.analysis.bound import Range
from railguard.analysis.equations import Complex, Real
from railguard.analysis.sensitivity import TAIL, Elements, patterns, weighty
from railguard.analysis.solve import Factor

MOST_TURNS = 3
"""Corners tried for one end: each where the derivatives at the last one point."""
STEADY = 0.0125
"""How far, against its way, a quantity may bend on the logarithms of what moves it to be followed
on them: its ends are then within a percent of the way."""
WIDE = 0.5
"""Natural logarithm: what moves further, as the rest of two alike does, is no product of powers."""
TINY = 1e-300


class Answer(msgspec.Struct, frozen=True):
    """One entry of a solution.

    signed   True: a level, which has a sign; else its magnitude counts
    adjoint  its row of M^-1, shape (unknowns,); factor M, factored at s, 1/s; x the solution
    weight   what the whole is per unit of it
    """

    adjoint: Complex
    factor: Factor
    x: Complex
    s: complex
    value: complex
    weight: float = 1.0
    signed: bool = False

    def told(self, values: Complex, pulls: Complex) -> tuple[Real, Real]:
        """Return the weighed sizes of values, and how derivatives of each move them.

        values  shape (corners,); pulls of shape (corners, elements)
        """
        if self.signed:
            return self.weight * values.real, self.weight * pulls.real
        sizes = np.abs(values)
        # A magnitude changes by what lies in its own direction.
        turns = np.conj(values) / np.maximum(sizes, TINY)
        return self.weight * sizes, self.weight * (turns[:, None] * pulls).real

    def aside(self, pulls: Complex, tolerances: Real) -> float:
        """Return how far tolerances move it at a right angle to itself, weighed."""
        if not self.s:
            return 0.0
        turn = np.conj(self.value) / max(abs(self.value), TINY)
        return self.weight * float(np.abs((turn * pulls).imag) @ tolerances)


def ends(elements: Elements, tolerances: Real, answers: Sequence[Answer]) -> Range:
    """Return the least and the most of the sum of some answers.

    tolerances  share each element may be off, shape (elements,)
    returns     an empty range where a corner has no answer
    """
    every = [(one, elements.pulls(one.adjoint[None, :], one.x, one.s)) for one in answers]
    told = [one.told(np.array([one.value]), pulls) for one, pulls in every]
    nominal = float(sum(sizes[0] for sizes, _ in told))
    slope = np.sum([slopes[0] for _, slopes in told], axis=0)
    aside = sum(one.aside(pulls[0], tolerances) for one, pulls in every)
    if (span := _steady(nominal, slope, aside, tolerances)) is not None:
        return span
    signs, most = np.array([-1.0, 1.0]), np.zeros(2)
    todo = np.arange(2)
    toward = signs[:, None] * slope
    for _ in range(MOST_TURNS):
        shares = np.sign(toward) * tolerances
        corners = [_Corners(elements, one, pulls[0], shares) for one, pulls in every]
        reached = signs[todo] * (np.sum([c.sizes for c in corners], axis=0) - nominal)
        if not np.isfinite(reached).all():
            return Range()
        if not any(one.s for one in answers):
            # Resistances alone: each moves a level one way over all of its tolerance.
            most = np.maximum(reached, 0.0)
            break
        toward = signs[todo, None] * np.sum([corner.slopes() for corner in corners], axis=0)
        start = signs[todo, None] * slope
        tops = reached + [inside(*each) for each in zip(start, toward, shares, strict=True)]
        most[todo] = np.maximum(most[todo], tops)
        again = ((np.abs(toward) * tolerances) * (toward * shares < 0)).sum(axis=1)
        again = again > TAIL * most[todo]
        todo, toward = todo[again], toward[again]
        if not len(todo):
            break
    low, high = (nominal + signs * most).tolist()
    return Range(low, high)


def _steady(nominal: float, slope: Real, aside: float, tolerances: Real) -> Range | None:
    """Return the ends of what is followed well enough on the logarithms of all shares, else None.

    On them a product of powers is a plane, and a sum of few such bends little while shares are
    small. What moves a magnitude at a right angle to it bends it by half its square.
    """
    if not nominal:
        return None
    pulls, down = slope / nominal, -np.log1p(-tolerances)
    up = np.log1p(tolerances)
    rising = np.where(pulls > 0, pulls * up, -pulls * down)
    falling = np.where(pulls > 0, pulls * down, -pulls * up)
    fall, rise = float(falling.sum()), float(rising.sum())
    if rise > WIDE or float(falling @ down) + (aside / nominal) ** 2 > STEADY * fall:
        return None
    low, high = nominal * float(np.exp(-fall)), nominal * float(np.exp(rise))
    return Range(min(low, high), max(low, high))


class _Corners:
    """An answer where elements are off by some shares; what moves it least to first order.

    sizes  of it, shape (corners,)
    """

    def __init__(self, elements: Elements, answer: Answer, pulls: Complex, shares: Real) -> None:
        """Solve; `pulls` are its derivatives at nominal, `shares` of shape (corners, elements)."""
        self._elements, self._answer, self._shares = elements, answer, shares
        moves = pulls * shares
        self._picks, rest = weighty(np.abs(moves).max(axis=0, initial=0.0))
        picks = self._picks
        off = shares[:, picks]
        change = -elements.conductance[picks] * off / (1.0 + off)
        change = change - answer.s * elements.storage[picks] * off
        self._entering = patterns(elements.first[picks], elements.second[picks], len(answer.x))
        # (M + U D U')^-1 = N - N U Q U' N with Q = (1 + D U' N U)^-1 D and N = M^-1.
        self._out = answer.factor.forward(self._entering)
        unity = np.eye(len(picks))
        system = unity + change[:, :, None] * (self._entering.T @ self._out)
        try:
            self._rank = np.linalg.solve(system, change[:, :, None] * unity)
        except np.linalg.LinAlgError:  # a corner without an answer
            self._rank = np.full(system.shape, np.nan, dtype=np.complex128)
        self._flow = self._rank @ (answer.x @ self._entering)
        self._values = answer.value - self._flow @ (answer.adjoint @ self._entering)
        self._values = self._values + moves[:, rest].sum(axis=1)
        self.sizes, _ = answer.told(self._values, moves)

    def slopes(self) -> Real:
        """Return the derivatives of the sizes to each element's share, there."""
        elements, answer, picks = self._elements, self._answer, self._picks
        x = answer.x - self._flow @ self._out.T
        rows = [*elements.first[picks].tolist(), *elements.second[picks].tolist()]
        leaving = answer.factor.adjoint(rows)
        back = leaving[: len(picks)] - leaving[len(picks) :]
        adjoint = answer.adjoint - ((answer.adjoint @ self._entering) @ self._rank) @ back
        pulls = elements.pulls(adjoint, x, answer.s)
        # What conducts goes with one over its resistance.
        bent = np.where(elements.conductance > 0, (1.0 + self._shares) ** -2, 1.0)
        return answer.told(self._values, pulls * bent)[1]


def inside(start: Real, end: Real, shares: Real) -> float:
    """Return how far a quantity rises above a corner it was led to, where it turned on the way.

    start, end  its derivatives to every share, at nominal and at the corner
    """
    turned = (start * shares > 0) & (end * shares < 0)
    if not turned.any():
        return 0.0
    up, down = np.abs(start[turned]), np.abs(end[turned])
    return float((0.5 * down * np.abs(shares[turned]) * down / (up + down)).sum())
