"""What an amplifier can do: swing, current and input range from rails, data sheet and load.

Swing is a function of output current, and the current at the end of the swing is a function of
the swing, so the two are found together. A family without figures is judged by common practice:
rails one to two volts beyond the signal, a few milliamperes, and says so in its basis.
"""

from collections.abc import Callable

import msgspec

from railguard.devices.model import UNLISTED_CURRENT, Device, Figure, SwingPoint
from railguard.devices.swing import swing
from railguard.words import Basis

PRACTICE_DROP = (1.0, 2.0)
"""V from each rail, typical and worst, for a device nobody lists: common practice, no source."""
PRACTICE_DROP_RAIL_TO_RAIL = (0.1, 0.2)
"""The same for a device its maker calls rail-to-rail, no swing listed: common practice."""
PRACTICE_CURRENT = (5e-3, 2e-3)
"""A, typical and safe, for a small general-purpose op-amp: common practice, no source."""
USABLE_SHARE = 0.5
"""Share of the short-circuit current that is usable: common practice, no source."""
CARRIED_SUPPLY = 0.05
"""A guaranteed figure counts as carried when the supply differs by more than this share."""
_ROUNDS = 12


class Reach(msgspec.Struct, frozen=True):
    """How far a quantity can go on one side: typical and guaranteed, and where that is from."""

    typical: float | None
    guaranteed: float | None
    typical_basis: Basis
    guaranteed_basis: Basis
    condition: str = ""

    @property
    def best(self) -> float | None:
        """The guaranteed figure, or the typical one where none is guaranteed."""
        return self.guaranteed if self.guaranteed is not None else self.typical

    @property
    def best_basis(self) -> Basis:
        """Where `best` came from."""
        return self.guaranteed_basis if self.guaranteed is not None else self.typical_basis


def output_reach(
    device: Device | None,
    positive: float,
    negative: float,
    upper: bool,
    current_at: Callable[[float], float],
    rail_ohms: float = 0.0,
) -> Reach:
    """Return how far the output goes towards one rail.

    rail_ohms   resistance between the rail's source and the pin: the load current drops on it

    current_at  amperes the output must source (upper) or sink at a given output voltage; below
                zero counts as no load
    """
    points = () if device is None else (device.swing_high if upper else device.swing_low)
    rail = positive if upper else negative
    sign = -1.0 if upper else 1.0
    total = positive - negative
    if device is None or not points:
        rail_to_rail = device is not None and device.rail_to_rail_output
        near, far = PRACTICE_DROP_RAIL_TO_RAIL if rail_to_rail else PRACTICE_DROP
        return Reach(
            rail + sign * near, rail + sign * far, "practice", "practice", "common practice"
        )

    curves = swing(points, total)

    def settle(sure: bool) -> tuple[float | None, Basis, str]:
        # The end of the swing is where rail, drop and load line meet. The curves are straight
        # piecewise, so a secant meets them in a few turns.
        level, before = rail, None
        for _ in range(_ROUNDS):
            amps = max(current_at(level), 0.0)
            dropped = curves.at(amps)
            volts = dropped.guaranteed if sure else dropped.typical
            basis = dropped.guaranteed_basis if sure else dropped.typical_basis
            if volts is None:
                return None, basis, dropped.condition
            met = rail + sign * (min(volts, total) + rail_ohms * amps)
            gap = met - level
            if abs(gap) < 1e-6 * total:
                break
            slope = None if before is None else (gap - before[1]) / (level - before[0])
            before = level, gap
            level = level - gap / slope if slope is not None and slope < -0.5 else met
        return met, basis, dropped.condition

    typical, typical_basis, condition = settle(sure=False)
    guaranteed, guaranteed_basis, guaranteed_condition = settle(sure=True)
    if guaranteed is not None and carried(points, total):
        guaranteed_basis = "memory"
    return Reach(
        typical, guaranteed, typical_basis, guaranteed_basis, guaranteed_condition or condition
    )


def carried(points: tuple[SwingPoint, ...], total: float) -> bool:
    """Tell whether the swing was tested at a supply other than this one."""
    supplies = [p.supply for p in points if p.supply]
    return bool(supplies) and all(abs(s - total) > CARRIED_SUPPLY * s for s in supplies)


def current_reach(device: Device | None, source: bool) -> Reach:
    """Return the output current a device gives: typical, and known to be given.

    Where only a swing test's load or the short-circuit current is known, half the short-circuit
    current counts as usable by common practice: it is the point of gross distortion, no rating.
    """
    if device is None:
        return _practice_current()
    figure = device.source_current if source else device.sink_current
    short = device.short_circuit
    typical, basis = figure.typical, figure.typical_basis
    if typical is None and short.typical is not None:
        # Between what a test load draws and the short-circuit current nothing is listed.
        typical, basis = short.typical, short.typical_basis
    guaranteed, guaranteed_basis = figure.guaranteed, figure.guaranteed_basis
    listed = guaranteed is not None and not figure.condition.startswith(UNLISTED_CURRENT)
    if not listed and short.best is not None:
        usable = USABLE_SHARE * short.best
        if guaranteed is None or usable > guaranteed:
            guaranteed, guaranteed_basis = usable, "practice"
    if typical is None and guaranteed is None:
        return _practice_current()
    if typical is not None and guaranteed is not None and typical < guaranteed:
        typical, basis = guaranteed, guaranteed_basis
    return Reach(typical, guaranteed, basis, guaranteed_basis, figure.condition)


def _practice_current() -> Reach:
    typical, safe = PRACTICE_CURRENT
    return Reach(typical, safe, "practice", "practice", "common practice")


def input_reach(device: Device | None, positive: float, negative: float, upper: bool) -> Reach:
    """Return how far the inputs may go towards one rail; all None for an unknown device."""
    if device is None:
        return Reach(None, None, "practice", "practice")
    figure: Figure = device.input_high if upper else device.input_low
    rail = positive if upper else negative
    if upper and device.input_reach is not None:
        top = negative + device.input_reach
        return Reach(None, top, "memory", figure.guaranteed_basis, figure.condition)
    typical = None if figure.typical is None else rail + figure.typical
    guaranteed = None if figure.guaranteed is None else rail + figure.guaranteed
    return Reach(
        typical, guaranteed, figure.typical_basis, figure.guaranteed_basis, figure.condition
    )
