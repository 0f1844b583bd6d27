"""What a stage that switches can be asked for at most, where its output is not followed.

The output of a comparator or an oscillator stands at one of its limits. Resistors straight at it
bound its current whatever lies behind them: a base, a lamp, a timing capacitor. Where the bound is
inside what the device gives, nothing need be simulated.
"""

from railguard.analysis.rail import Supply
from railguard.analysis.recognise import Amplifier
from railguard.analysis.stage import Current
from railguard.analysis.surroundings import Ways
from railguard.devices.model import Device

_TAKE_NOTHING = {"M": (1,), "J": (1,), "S": (2, 3), "E": (2, 3), "G": (2, 3)}
"""Places of pins that draw no direct current: gates, control pins."""


def most_current(amplifier: Amplifier, ways: Ways, supply: Supply) -> float | None:
    """Return the most an output can be asked for by the resistors at it, A; None: no bound.

    Their other ends are taken to stay between the stage's own rails, as those of a base, a gate,
    a hysteresis resistor or a timing capacitor do.
    """
    if supply.total is None or supply.total <= 0:
        return None
    amps = 0.0
    for element in ways.around.get(amplifier.output, ()):
        if element.kind == "R" and element.value and element.value > 0:
            amps += supply.total / element.value
        elif element.kind == "C":
            continue  # no direct current
        elif amplifier.output in _drawing(element.kind, element.nets):
            return None
    return amps


def _drawing(kind: str, nets: tuple[str, ...]) -> tuple[str, ...]:
    idle = _TAKE_NOTHING.get(kind, ())
    return tuple(net for place, net in enumerate(nets) if place not in idle)


def is_given(amps: float | None, current: Current) -> bool:
    """Tell whether a device is known to give a current in both directions."""
    return amps is not None and all(
        bound.best is not None and amps <= bound.best for bound in (current.source, current.sink)
    )


def most_heat(device: Device | None, supply: Supply, amps: float | None) -> float | None:
    """Return the power of a channel whose output stands at a limit, at most, W.

    Quiescent power, and the current at the largest drop to a rail that is listed (else all of the
    supply).
    """
    iq = device.supply_current.best if device is not None else None
    if device is None or iq is None or amps is None or supply.total is None:
        return None
    points = (*device.swing_high, *device.swing_low)
    drops = [d for p in points for d in (p.typical, p.guaranteed) if d is not None]
    return supply.total * iq + amps * min(max(drops, default=supply.total), supply.total)
