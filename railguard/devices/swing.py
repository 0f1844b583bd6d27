"""How far an output stays from a rail, as a function of the current it gives.

A data sheet lists the drop at a few loads; between them the drop is a straight line, which is
what a saturated transistor and an emitter resistor both come to over a small range.
"""

from collections.abc import Callable, Iterable
from functools import lru_cache
from itertools import pairwise
from typing import NamedTuple

from railguard.devices.model import SwingPoint
from railguard.words import Basis

LIGHT = 10e-6
"""Up to this current a figure listed without load still holds, A (microamperes)."""

FOLLOWER_DROP = 0.5
"""A drop above this at a test load holds one junction at least, V: half of it stays at no load."""


class Drop(NamedTuple):
    """The distance to a rail at one output current, V; None: not known.

    condition  the data-sheet points it rests on, in words
    """

    typical: float | None
    typical_basis: Basis
    guaranteed: float | None
    guaranteed_basis: Basis
    condition: str


class _Known(NamedTuple):
    amps: float
    drop: float
    basis: Basis
    condition: str


NOTHING = 1e-12
"""A; what arithmetic leaves of no current."""


def drop(points: Iterable[SwingPoint], amps: float, supply: float | None = None) -> Drop:
    """Return the drop to a rail while the output gives `amps` (A, not negative) at that rail.

    Typical and guaranteed figures are two separate curves. Each is made monotone (a heavier load
    never drops less), is linear between two listed points, flat below the lightest, and beyond
    the heaviest goes on with the last slope, marked as from memory. A curve known at one point
    only goes on with the steepest slope listed at another supply, else as a line from the origin,
    or from half its drop where that drop holds a junction. A curve known without load only says
    nothing above microamperes.

    `supply` (total, V) picks the points tested nearest to it where a sheet lists several supplies;
    a figure taken from another supply than half to twice the actual one counts as from memory.
    """
    return swing(tuple(points), supply).at(amps)


class Swing:
    """The two curves of one output at one supply, made once and read at many currents."""

    def __init__(self, points: tuple[SwingPoint, ...], supply: float | None) -> None:
        """Take the data sheet's points, and the total supply, V, as `drop` does."""
        self._typical = _Curve(points, supply, _typical)
        self._guaranteed = _Curve(points, supply, _guaranteed)

    def at(self, amps: float) -> Drop:
        """Return the drop to the rail at a current, A, as `drop` says."""
        amps = amps if amps > NOTHING else 0.0
        return _judged(self._typical.at(amps), self._guaranteed.at(amps))


@lru_cache(maxsize=256)
def swing(points: tuple[SwingPoint, ...], supply: float | None) -> Swing:
    """Return the curves of an output; those of one device are asked for stage after stage."""
    return Swing(points, supply)


def _judged(typical: _Known | None, guaranteed: _Known | None) -> Drop:
    if typical and guaranteed and guaranteed.drop < typical.drop:
        guaranteed = guaranteed._replace(drop=typical.drop, basis="memory")
    said = guaranteed or typical
    return Drop(
        typical.drop if typical else None,
        typical.basis if typical else "memory",
        guaranteed.drop if guaranteed else None,
        guaranteed.basis if guaranteed else "memory",
        said.condition if said else "",
    )


Side = Callable[[SwingPoint], tuple[float | None, Basis]]


def _typical(point: SwingPoint) -> tuple[float | None, Basis]:
    return point.typical, point.typical_basis


def _guaranteed(point: SwingPoint) -> tuple[float | None, Basis]:
    return point.guaranteed, point.guaranteed_basis


class _Curve:
    """One side's drop over current, made monotone, and the slope it goes on with."""

    def __init__(self, points: tuple[SwingPoint, ...], supply: float | None, side: Side) -> None:
        listed = tuple(point for point in points if side(point)[0] is not None)
        self._known = _curve(_at_supply(listed, supply), supply, side)
        self._slope: float | None = None
        if self._known and self._known[-1].amps > LIGHT:
            last, slope = self._known[-1], _last_slope(self._known)
            if slope is None:
                slope = _listed_slope(listed, side) or _scaled_slope(points, supply, last)
            self._slope = _single_slope(last) if slope is None else slope

    def at(self, amps: float) -> _Known | None:
        if not self._known:
            return None
        last = self._known[-1]
        if amps <= self._known[0].amps:
            return self._known[0]
        if amps > last.amps:
            return self._beyond(last, amps)
        left, right = next(pair for pair in pairwise(self._known) if amps <= pair[1].amps)
        share = (amps - left.amps) / (right.amps - left.amps)
        basis: Basis = "memory" if "memory" in (left.basis, right.basis) else right.basis
        between = left.drop + share * (right.drop - left.drop)
        return _Known(amps, between, basis, right.condition)

    def _beyond(self, last: _Known, amps: float) -> _Known | None:
        if self._slope is None:
            return last if amps <= LIGHT else None
        condition = f"carried on beyond {last.condition}" if last.condition else ""
        return _Known(amps, last.drop + self._slope * (amps - last.amps), "memory", condition)


def _at_supply(points: tuple[SwingPoint, ...], supply: float | None) -> tuple[SwingPoint, ...]:
    """Keep the points of the test supply nearest to the actual one, and those without any."""
    stated = {point.supply for point in points if point.supply}
    if supply is None or len(stated) < 2:
        return points
    best = min(stated, key=lambda volts: abs(volts - supply))
    return tuple(point for point in points if not point.supply or point.supply == best)


def _curve(points: tuple[SwingPoint, ...], supply: float | None, side: Side) -> list[_Known]:
    """Sort by current and let no heavier load drop less than a lighter one."""
    known = []
    for point in points:
        value, basis = side(point)
        near = supply is None or not point.supply or 0.5 <= supply / point.supply <= 2.0
        if value is not None:
            known.append(_Known(point.amps, value, basis if near else "memory", point.condition))
    curve: list[_Known] = []
    for entry in sorted(known, key=lambda item: (item.amps, item.drop)):
        if curve and curve[-1].drop > entry.drop:
            entry = entry._replace(drop=curve[-1].drop, basis=curve[-1].basis)
        if curve and curve[-1].amps == entry.amps:
            curve.pop()
        curve.append(entry)
    return curve


def _last_slope(curve: list[_Known]) -> float | None:
    if len(curve) < 2:
        return None
    left, right = curve[-2:]
    return (right.drop - left.drop) / (right.amps - left.amps)


def _listed_slope(points: tuple[SwingPoint, ...], side: Side) -> float | None:
    """Return the steepest slope between two points tested at one supply."""
    slopes = [
        slope
        for volts in {point.supply for point in points}
        if (slope := _last_slope(_curve(tuple(p for p in points if p.supply == volts), None, side)))
    ]
    return max(slopes, default=None)


def _scaled_slope(
    points: tuple[SwingPoint, ...], supply: float | None, last: _Known
) -> float | None:
    """Return the typical slope at this supply, in the ratio of the drop to the typical one."""
    listed = tuple(point for point in points if point.typical is not None)
    curve = _curve(_at_supply(listed, supply), supply, _typical)
    slope = _last_slope(curve)
    if slope is None or curve[0].drop <= 0.0:
        return None
    nearest = min(curve, key=lambda known: abs(known.amps - last.amps))
    return slope * max(last.drop / nearest.drop, 1.0)


def _single_slope(last: _Known) -> float:
    held = 0.5 if last.drop > FOLLOWER_DROP else 0.0
    return (1.0 - held) * last.drop / last.amps
