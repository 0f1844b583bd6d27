"""Where a loop closes, and what tolerances do to it: bandwidth, phase margin, loop gain.

With z the voltage between an amplifier's inputs per unit in its own row, its loop transmission is
T = -z / (1 + z) (as in `solve.return_ratios`); one forward and one adjoint solution give the
derivative of ln T to every element and to frequency. The derivatives choose a corner; the corner
itself is solved, by a change of low rank to the factorisation at hand, so its value is exact and
not of first order. Where a quantity turns round inside a tolerance its extreme lies inside the
box: the triangle under the derivative, from its zero to the corner, is added.

Source  d(M^-1) = -M^-1 dM M^-1; change of low rank: Sherman, Morrison and Woodbury
"""

from collections.abc import Mapping

import msgspec
import numpy as np
import numpy.typing as npt

from railguard.analysis.bound import Range
from railguard.analysis.deviations import Off
from railguard.analysis.network import Complex, Network, Real, gain_bandwidth, open_loop_gain
from railguard.analysis.solve import DENSE_LIMIT, factor

TOGETHER = 0.05
"""Natural logarithm of the ratio of frequencies up to which one factorisation serves both."""
NEAR = 0.15
"""The same up to which a loop is followed from where it was solved, to second order."""
MOST_TRIES = 5
TAIL = 1e-3
"""Share of an excursion its smallest parts may make together: they count to first order."""
MOST_TURNS = 3
"""Corners tried for one end of a quantity: each where the derivatives at the last one point."""
FLAT = 1e-3
"""A loop gain that falls by less than this per neper of frequency crosses one nowhere exactly."""

Index = npt.NDArray[np.int64]


class Seen(msgspec.Struct, frozen=True):
    """What a sweep shows of where a loop closes.

    margin  phase margin, degrees, whole turns included
    sure    True where no figure that is not listed decides it, so that its ends have a meaning
    """

    hertz: float
    margin: float
    sure: bool


class Closing(msgspec.Struct, frozen=True):
    """Where a loop closes, hertz, and its phase margin there, degrees, each with its ends.

    bare_worst  hertz with the amplifier's own gain-bandwidth product as it is: what its network
                alone does
    """

    hertz: float
    margin: float
    hertz_worst: Range = Range()
    margin_worst: Range = Range()
    bare_worst: Range = Range()


class InBand(msgspec.Struct, frozen=True):
    """The ends of a loop's gain and of its noise gain at one frequency."""

    loop_gain: Range
    noise_gain: Range


def closings(network: Network, off: Off, seen: Mapping[int, Seen]) -> dict[int, Closing]:
    """Return where loops close, by index of the amplifier."""
    found = {}
    for hertz, members in _groups({k: sight.hertz for k, sight in seen.items()}).items():
        solved = _Solved(network, off, hertz)
        for k in members:
            with _beyond_numbers():
                closing = _closing(solved, k, seen[k])
            if closing is not None:
                found[k] = closing
    return found


def _beyond_numbers() -> np.errstate:
    """Let what is beyond all numbers be none, in silence: `_range` leaves it out."""
    return np.errstate(all="ignore")


def _range(low: float, high: float) -> Range:
    """Return a range; an empty one where an end is no number."""
    low, high = float(low), float(high)
    return Range(low, high) if np.isfinite(low) and np.isfinite(high) else Range()


class Bands:
    """The ends of loop gain and noise gain at frequencies, each factored once."""

    def __init__(self, network: Network, off: Off) -> None:
        """Take the network the loops are looked at in, and what moves them."""
        self._network, self._off = network, off
        self._solved: dict[float, _Solved] = {}

    def at(self, k: int, hertz: float) -> InBand | None:
        """Return the ends of amplifier number `k` at a frequency; None where it has no loop."""
        if hertz not in self._solved:
            self._solved[hertz] = _Solved(self._network, self._off, hertz)
        with _beyond_numbers():
            loop = self._solved[hertz].loop(k)
            return None if loop is None else _in_band(loop)


def _groups(hertz: Mapping[int, float]) -> dict[float, list[int]]:
    """Return the amplifiers whose loops close near one another, by the lowest one's frequency."""
    groups: dict[float, list[int]] = {}
    first = 0.0
    for k, own in sorted(hertz.items(), key=lambda item: item[1]):
        if not first or np.log(own / first) > TOGETHER:
            first = own
            groups[first] = []
        groups[first].append(k)
    return groups


class _Moved(msgspec.Struct, frozen=True):
    """ln T of one loop at some shares: its value and derivatives.

    value            ln T, shape (corners,)
    first, second    its derivatives to the logarithm of frequency
    gradient         its derivative to each share, shape (corners, parameters)
    """

    value: Complex
    first: Complex
    second: Complex
    gradient: Complex


class _Solved:
    """A network factored at one frequency."""

    def __init__(self, network: Network, off: Off, hertz: float) -> None:
        self.network, self.off, self.hertz = network, off, hertz
        self.s = 2j * np.pi * hertz
        self.factor = factor(network, hertz)
        # A coefficient's factor: 1 for a conductance, s for what stores energy.
        self.unit = np.where(off.storing, self.s, 1.0)

    def loop(self, k: int) -> "_Loop | None":
        """Return one amplifier's loop; None where it has none."""
        amplifier = self.network.amplifiers[k]
        row = self.network.outputs.get(amplifier.designator, -1)
        if row < 0 or amplifier.designator in self.network.forced:
            return None
        return _Loop(self, k, row)

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


class _Loop:
    """One amplifier's loop at one frequency, and what moves it."""

    def __init__(self, solved: _Solved, k: int, row: int) -> None:
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

    def moved(self, shares: Real) -> _Moved:
        """Return the loop with its parameters off by some shares, shape (corners, parameters).

        What moves it least counts to first order, all else exactly.
        """
        solved, off = self.solved, self.solved.off
        pulls = self.nominal.gradient[0] * shares
        picks, rest = _weighty(np.abs(pulls).max(axis=0, initial=0.0))
        left, right, second = off.left[picks], off.right[picks], off.second[picks]
        change = off.change(shares)[:, picks]
        coefficient = change * solved.unit[picks]
        storage = np.where(off.storing[picks], change, 0.0)
        u, w = _across(self._a, left)[0], _across(self._x, right, second)[0]
        entering = _patterns(left, solved.network.size)
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
    ) -> _Moved:
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
        return _Moved(np.log(-z / (1.0 + z)), along, bend, gradient)


def _weighty(weight: Real) -> tuple[Index, Index]:
    """Return the parameters that make up a sum but for its tail, and those in the tail."""
    order = np.argsort(-weight)
    left_over = weight.sum() - np.cumsum(weight[order])
    kept = int(np.count_nonzero(left_over > TAIL * weight.sum())) + 1
    return order[:kept], order[kept:]


def _patterns(rows: Index, size: int) -> Complex:
    """Return plus one and minus one at each pair of rows, shape (size, pairs)."""
    columns = np.zeros((size + 1, len(rows)), dtype=np.complex128)
    pairs = np.arange(len(rows))
    columns[rows[:, 0], pairs] = 1.0
    columns[rows[:, 1], pairs] -= 1.0
    return columns[:size]


class _Crossed(msgspec.Struct, frozen=True):
    """A loop where its gain is one.

    hertz   the frequency; radians: the phase of T there
    later   derivative of ln f to each share; turn: of the phase, radians
    """

    hertz: float
    radians: float
    later: Real
    turn: Real


def _crossed(loop: _Loop, moved: _Moved, corner: int) -> _Crossed | float | None:
    """Return where a loop's gain is one; the way there, in nepers, where that is far; or None."""
    value, first, second = moved.value[corner], moved.first[corner], moved.second[corner]
    if first.real > -FLAT or not np.isfinite(value):
        return None
    # ln |T| is followed to second order: the root nearest to where it was solved.
    root = first.real**2 - 2.0 * second.real * value.real
    shift = -2.0 * value.real / (first.real - np.sqrt(root)) if root >= 0 else None
    if shift is None or abs(shift) > NEAR:
        return float(np.clip(-value.real / first.real, -1.0, 1.0))
    slope = first + second * shift
    gradient = moved.gradient[corner]
    later = -gradient.real / slope.real
    return _Crossed(
        hertz=loop.solved.hertz * float(np.exp(shift)),
        radians=float((value + first * shift + second * shift**2 / 2).imag),
        later=later,
        turn=gradient.imag + slope.imag * later,
    )


def _followed(loop: _Loop, moved: _Moved, corner: int, shares: Real) -> _Crossed | None:
    """Return where a loop closes at one corner, solved anew where that is far."""
    found = _crossed(loop, moved, corner)
    for _ in range(MOST_TRIES):
        if not isinstance(found, float):
            return found
        solved = loop.solved
        there = _Solved(solved.network, solved.off, solved.hertz * float(np.exp(found)))
        again = there.loop(loop.k)
        if again is None:
            return None
        loop = again
        found = _crossed(loop, loop.moved(shares[None, :]), 0)
    return None


def _closing(solved: _Solved, k: int, seen: Seen) -> Closing | None:
    loop = solved.loop(k)
    if loop is None:
        return None
    off = solved.off
    nominal = _followed(loop, loop.nominal, 0, np.zeros(len(off.value)))
    if nominal is None:
        return None
    margin = 180.0 + float(np.degrees(nominal.radians))
    margin += 360.0 * round((seen.margin - margin) / 360.0)
    own = off.own == k
    pulls = [nominal.later, -nominal.later]
    if own.any():
        bare = np.where(own, 0.0, nominal.later)
        pulls += [bare, -bare]
    speeds = len(pulls)
    pulls += [nominal.turn, -nominal.turn] if seen.sure else []
    ends = _ends(loop, nominal, np.array(pulls), speeds)
    if ends is None:
        return Closing(nominal.hertz, margin)
    hertz = [nominal.hertz * float(np.exp(way)) for way in ends[:speeds]]
    return Closing(
        hertz=nominal.hertz,
        margin=margin,
        hertz_worst=_range(hertz[1], hertz[0]),
        margin_worst=_range(*(margin + float(np.degrees(ends[e])) for e in (-1, -2)))
        if seen.sure
        else Range(),
        bare_worst=_range(hertz[-1], hertz[-2]),
    )


def _ends(loop: _Loop, nominal: _Crossed, pulls: Real, speeds: int) -> list[float] | None:
    """Return how far quantities of a loop move over all that may be off: up and down, by turns.

    pulls    their derivatives at nominal, shape (quantities, parameters), one line for the way up
             and its negative for the way down; what is zero stays as it is
    speeds   how many of the lines are of ln f; the others are of the phase
    returns  nepers and radians; None where a loop stops closing on the way
    """
    off = loop.solved.off
    signs = [1.0 if e % 2 == 0 else -1.0 for e in range(len(pulls))]
    if speeds == len(pulls) and (sums := off.steady(pulls)) is not None:
        return [float(sign * way) for sign, way in zip(signs, sums, strict=True)]
    best, toward = [0.0] * len(pulls), pulls.copy()
    todo = list(range(len(pulls)))
    for _ in range(MOST_TURNS):
        shares = off.corner(toward[todo])
        moved = loop.moved(shares)
        again = []
        for place, e in enumerate(todo):
            corner = _followed(loop, moved, place, shares[place])
            if corner is None:
                return None
            reached, there = _told(corner, nominal, speed=e < speeds)
            reached, there = signs[e] * reached, np.where(pulls[e] == 0, 0.0, signs[e] * there)
            reached += _inside(pulls[e], there, shares[place])
            # A share that now pulls the other way may be better off at its other end.
            back = float((np.abs(there) * (off.most - off.least))[there * shares[place] < 0].sum())
            if reached > best[e] and back > TAIL * reached:
                again.append(e)
                toward[e] = there
            best[e] = max(best[e], reached)
        todo = again
        if not todo:
            break
    return [sign * way for sign, way in zip(signs, best, strict=True)]


def _told(corner: _Crossed, nominal: _Crossed, *, speed: bool) -> tuple[float, Real]:
    """Return how far ln f, or the phase, is from nominal, and its derivatives there."""
    if speed:
        return float(np.log(corner.hertz / nominal.hertz)), corner.later
    turned = corner.radians - nominal.radians
    return turned - 2 * np.pi * round(turned / (2 * np.pi)), corner.turn


def _inside(start: Real, end: Real, shares: Real) -> float:
    """Return how far a quantity rises above a corner it was led to, where it turned on the way.

    start, end  its derivatives to every share, at nominal and at the corner
    """
    turned = (start * shares > 0) & (end * shares < 0)
    if not turned.any():
        return 0.0
    up, down = np.abs(start[turned]), np.abs(end[turned])
    return float((0.5 * down * np.abs(shares[turned]) * down / (up + down)).sum())


def _in_band(loop: _Loop) -> InBand:
    """Return the ends of |T| and of |A| / |T| at the loop's own frequency."""
    off, hertz = loop.solved.off, loop.solved.hertz
    amplifier = loop.solved.network.amplifiers[loop.k]
    own = off.own == loop.k
    value, pull = float(loop.nominal.value[0].real), loop.nominal.gradient[0].real
    # Its own product stands in A alone: the noise gain is what the network makes of it.
    alone = np.where(own, 0.0, pull)
    pulls = np.array([pull, -pull, alone, -alone])
    sums = off.steady(pulls)
    if sums is None:
        shares = off.corner(pulls)
        moved = loop.moved(shares)
        sums = np.array(
            [
                max(sign * float(reached.real - value) + _inside(start, sign * end, share), 0.0)
                for sign, reached, start, end, share in zip(
                    (1.0, -1.0) * 2, moved.value, pulls, moved.gradient.real, shares, strict=True
                )
            ]
        )
    more, less, up, down = (float(v) for v in sums)
    speed = gain_bandwidth(amplifier) or np.inf
    bare = -float(np.log(np.hypot(1.0 / open_loop_gain(amplifier), hertz / speed)))
    return InBand(
        loop_gain=_range(np.exp(value - less), np.exp(value + more)),
        noise_gain=_range(np.exp(bare - value - up), np.exp(bare - value + down)),
    )
