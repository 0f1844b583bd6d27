"""Where a loop closes, and what tolerances do to it: bandwidth, phase margin, loop gain.

The derivatives of its transmission (`transmission`) choose a corner; the corner itself is solved.
Where a quantity turns round inside a tolerance its extreme lies inside the box: the triangle under
the derivative, from its zero to the corner, is added.
"""

from collections.abc import Mapping

import msgspec
import numpy as np

from railguard.analysis.bound import Range
from railguard.analysis.deviations import Off
from railguard.analysis.equations import Real
from railguard.analysis.network import Network
from railguard.analysis.sensitivity import TAIL
from railguard.analysis.stamping import gain_bandwidth, open_loop_gain
from railguard.analysis.transmission import Moved, Solved, Transmission
from railguard.analysis.vertices import inside

TOGETHER = 0.05
"""Natural logarithm of the ratio of frequencies up to which one factorisation serves both."""
NEAR = 0.15
"""The same up to which a loop is followed from where it was solved, to second order."""
MOST_TRIES = 5
MOST_TURNS = 3
"""Corners tried for one end of a quantity: each where the derivatives at the last one point."""
FLAT = 1e-3
"""A loop gain that falls by less than this per neper of frequency crosses one nowhere exactly."""


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
        solved = Solved(network, off, hertz)
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
        self._solved: dict[float, Solved] = {}

    def at(self, k: int, hertz: float) -> InBand | None:
        """Return the ends of amplifier number `k` at a frequency; None where it has no loop."""
        if hertz not in self._solved:
            self._solved[hertz] = Solved(self._network, self._off, hertz)
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


class _Crossed(msgspec.Struct, frozen=True):
    """A loop where its gain is one.

    hertz   the frequency; radians: the phase of T there
    later   derivative of ln f to each share; turn: of the phase, radians
    """

    hertz: float
    radians: float
    later: Real
    turn: Real


def _crossed(loop: Transmission, moved: Moved, corner: int) -> _Crossed | float | None:
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


def _followed(loop: Transmission, moved: Moved, corner: int, shares: Real) -> _Crossed | None:
    """Return where a loop closes at one corner, solved anew where that is far."""
    found = _crossed(loop, moved, corner)
    for _ in range(MOST_TRIES):
        if not isinstance(found, float):
            return found
        solved = loop.solved
        there = Solved(solved.network, solved.off, solved.hertz * float(np.exp(found)))
        again = there.loop(loop.k)
        if again is None:
            return None
        loop = again
        found = _crossed(loop, loop.moved(shares[None, :]), 0)
    return None


def _closing(solved: Solved, k: int, seen: Seen) -> Closing | None:
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


def _ends(loop: Transmission, nominal: _Crossed, pulls: Real, speeds: int) -> list[float] | None:
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
            reached += inside(pulls[e], there, shares[place])
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


def _in_band(loop: Transmission) -> InBand:
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
                max(
                    sign * float(reached.real - value) + inside(start, sign * end, share),
                    inside(-sign * end, -start, share),  # the same from nominal's side
                )
                for sign, reached, start, end, share in zip(
                    (1.0, -1.0) * 2, moved.value, pulls, moved.gradient.real, shares, strict=True
                )
            ]
        )
        # Where it turns round on the way, the corner of the other way may be the further one.
        turned = moved.value.real[[1, 0, 3, 2]] - value
        sums = np.maximum(sums, np.array([1.0, -1.0, 1.0, -1.0]) * turned)
    more, less, up, down = (float(v) for v in sums)
    speed = gain_bandwidth(amplifier) or np.inf
    bare = -float(np.log(np.hypot(1.0 / open_loop_gain(amplifier), hertz / speed)))
    return InBand(
        loop_gain=_range(np.exp(value - less), np.exp(value + more)),
        noise_gain=_range(np.exp(bare - value - up), np.exp(bare - value + down)),
    )
