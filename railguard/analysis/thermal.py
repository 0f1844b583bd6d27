"""Heat: quiescent power, the output stage at its worst, and the junction."""

import re
from collections.abc import Callable, Iterable
from functools import lru_cache

import msgspec

from railguard.analysis.rail import Supply
from railguard.analysis.stage import Case, Current, Output, Stage
from railguard.devices.model import Device
from railguard.settings.model import Settings

ROOM = 25.0
"""Degrees Celsius where no ambient is stated."""


def hottest(settings: Settings) -> float:
    """Return the upper end of the stated ambient range, degrees Celsius."""
    return settings.ambient[1] if settings.ambient is not None else ROOM


def dissipation(
    device: Device | None,
    supply: Supply,
    output: Output,
    current: Current,
    load: float | None,
) -> float | None:
    """Return one channel's power, W: quiescent plus the output stage at its worst level.

    None where the quiescent current, the rails or the output's range are not known.

    Source  TI OPA548 SBOS070D, power dissipation; Intersil FN6377
    """
    iq = device.supply_current.best if device is not None else None
    low, high, level = output.demand.low, output.demand.high, output.level
    if iq is None or supply.positive is None or supply.negative is None or supply.total is None:
        return None
    if low is None or high is None or level is None or current.demand_source is None:
        return None
    positive, negative = supply.positive, supply.negative
    slope = 1.0 / load if load else 0.0
    # amperes = rest + slope * volts: the power is a parabola on each side of no current.
    rest = (current.source.level or 0.0) - slope * level
    ends = [min(max(end, negative), positive) for end in (low, high)]
    tops = [(rail - rest / slope) / 2 for rail in (positive, negative)] if slope else []
    between = [volts for volts in tops if ends[0] < volts < ends[1]]

    def power(volts: float) -> float:
        amps = rest + slope * volts
        return ((positive if amps > 0 else negative) - volts) * amps

    return supply.total * iq + max(power(volts) for volts in (*ends, *between))


DOUBLING = 10.0
"""Kelvin in which the bias current of a field-effect input doubles: S. Franco, 3rd ed., ex. 5.3."""


FIELD_EFFECT = frozenset({"jfet", "cmos", "bifet", "fet"})
"""Technologies of inputs whose bias current is a leakage."""


def bias_current(device: Device, settings: Settings) -> float:
    """Return the worst bias current over the stated ambient range, A; 0 where none is listed.

    The sheet's own value over temperature counts where it is listed; else that of a field-effect
    input doubles every 10 K above 25 degrees Celsius.
    """
    at_room, ambient = device.bias_current.best or 0.0, hottest(settings)
    if ambient <= ROOM:
        return at_room
    if device.bias_current.hot is not None:
        return max(device.bias_current.hot, at_room)
    if device.technology.lower() not in FIELD_EFFECT:
        return at_room
    return float(at_room * 2 ** ((ambient - ROOM) / DOUBLING))


def offset_current(device: Device, settings: Settings) -> float | None:
    """Return the worst difference of the bias currents, A; it grows with heat as they do.

    None where the sheet lists none, or one that is no smaller than the bias current itself.
    """
    listed, bias = device.offset_current.best, device.bias_current.best
    if listed is None or not bias or listed >= bias:
        return None
    return listed * bias_current(device, settings) / bias


def package_heat(
    stages: Iterable[Stage], own: Callable[[Stage], float | None]
) -> dict[str, float | None]:
    """Return the power of each package, W: all its channels at their worst together.

    own  of one channel
    None where one of them is not known. A channel that is not in the netlist counts as idle.
    """
    heat: dict[str, float | None] = {}
    for stage in stages:
        before, more = heat.get(stage.package, 0.0), own(stage)
        heat[stage.package] = None if before is None or more is None else before + more
    return heat


def at_ends(supply: Supply) -> tuple[Supply, Supply] | None:
    """Return a stage's supply where its rails are nearest together, and farthest apart."""
    positive, negative = supply.positive_worst, supply.negative_worst
    if positive.low is None or positive.high is None:
        return None
    if negative.low is None or negative.high is None:
        return None
    return (
        msgspec.structs.replace(supply, positive=positive.low, negative=negative.high),
        msgspec.structs.replace(supply, positive=positive.high, negative=negative.low),
    )


PINS = {1: (5, 8), 2: (8, 10), 4: (14, 16)}
"""Fewest and most pins of the cases that hold so many amplifiers."""
_METAL_CAN_PINS = 8
_PINS = re.compile(r"(?<!\d)-?(\d+)$")


def case_of(device: Device | None, channels: int | None, text: str) -> Case | None:
    """Return the case whose thermal resistance counts; None where none is listed.

    The one the card names; else, of those that hold so many amplifiers, the one with the highest
    resistance, since a netlist seldom says more.

    channels  amplifiers in the package; None: not known
    text      of the card and its value, where a footprint may stand
    """
    if device is None or not device.theta:
        return None
    written = _letters(text)
    named = [c for c in device.theta if _letters(c) in written]
    low, high = PINS.get(channels or 0, (0, 10_000))
    holding = [c for c in device.theta if low <= _pins_of(c) <= high]
    chosen = named or holding or [*device.theta]
    name = max(chosen, key=lambda c: device.theta[c])
    return Case(name, device.theta[name])


@lru_cache(maxsize=1024)
def _letters(text: str) -> str:
    return re.sub(r"[^A-Z0-9]", "", text.upper())


def _pins_of(case: str) -> int:
    found = _PINS.search(case)
    return _METAL_CAN_PINS if found is None or case.startswith("TO-") else int(found[1])


def junction(case: Case | None, watts: float | None, settings: Settings) -> float | None:
    """Return the junction temperature at the hottest ambient, degrees Celsius."""
    if case is None or watts is None:
        return None
    return hottest(settings) + case.resistance * watts
