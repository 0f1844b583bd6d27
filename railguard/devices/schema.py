"""What no op-amp can be: checks that find a slip of sign, unit or column in a device table.

Run by the tests over the whole catalogue, and on every table of the user's own.
"""

import re
from collections.abc import Iterable, Iterator
from itertools import pairwise
from math import isinf

from railguard.devices.layout import FamilyTable
from railguard.devices.match import spell_out
from railguard.devices.model import Device, Figure, SwingPoint

_MAXIMA = ("bias_current", "offset_current", "offset_voltage", "supply_current", "input_low")
"""Figures whose guaranteed value is the larger one."""

_MINIMA = (
    "input_high",
    "source_current",
    "sink_current",
    "short_circuit",
    "gain_bandwidth",
    "slew_rate",
    "open_loop_gain",
)
"""Figures whose guaranteed value is the smaller one."""

SCALES: dict[str, tuple[float, float, str]] = {
    "input_low": (-50.0, 15.0, "V above the negative rail"),
    "input_high": (-15.0, 50.0, "V above the positive rail"),
    "source_current": (10e-6, 20.0, "A"),
    "sink_current": (10e-6, 20.0, "A"),
    "short_circuit": (50e-6, 30.0, "A"),
    "gain_bandwidth": (1e3, 20e9, "Hz"),
    "slew_rate": (100.0, 50e9, "V/s"),
    "open_loop_gain": (300.0, 1e9, "V/V"),
    "stable_gain": (1.0, 1000.0, "V/V"),
    "bias_current": (1e-17, 1e-3, "A"),
    "offset_current": (1e-17, 1e-3, "A"),
    "offset_voltage": (1e-8, 0.1, "V"),
    "supply_current": (100e-9, 1.0, "A"),
    "voltage_noise": (100e-12, 10e-6, "V/√Hz"),
    "current_noise": (1e-17, 1e-9, "A/√Hz"),
    "load_capacitance": (1e-12, 1e-3, "F"),
    "input_capacitance": (10e-15, 1e-9, "F"),
    "output_resistance": (0.01, 1e6, "Ω"),
    "differential_input": (0.1, 200.0, "V"),
    "feedback_resistor": (10.0, 1e5, "Ω"),
}
"""The widest range each figure has been sold in, in its SI unit, with room: outside it the unit
was mistaken (3 for 3 MHz, 18 for 18 nV)."""

_SLEW_PER_BANDWIDTH = (0.005, 2000.0)
"""V: the ratio of slew rate to gain-bandwidth product runs from bipolar to current-on-demand."""

_NAME = re.compile(r"[A-Z][A-Z0-9]*(?:\[[A-Z0-9]+\][A-Z0-9]*)*(?:-[0-9])?")


def faults(device: Device) -> tuple[str, ...]:
    """Return what makes a device impossible, each in a few words; empty: nothing found."""
    return (
        *_supply_faults(device),
        *_scale_faults(device),
        *_order_faults(device),
        *_swing_faults(device),
        *_other_faults(device),
    )


def table_faults(table: FamilyTable) -> tuple[str, ...]:
    """Return what a table of the shipped catalogue lacks besides."""
    found = []
    if table.source is None or not table.source.title or not table.source.publisher:
        found.append("no data sheet with title and publisher is named")
    if not any(table.names.values()):
        found.append("no order code leads to it")
    found += [
        f"the name {name} is no order code"
        for bases in table.names.values()
        for name in bases
        if not _NAME.fullmatch(name)
    ]
    if not table.conditions:
        found.append("the conditions of its figures are not said")
    return tuple(found)


def shared_names(tables: Iterable[FamilyTable]) -> tuple[str, ...]:
    """Return every order code that two families, or two channel counts, lay claim to."""
    owners: dict[str, str] = {}
    found = []
    for table in tables:
        for channels, bases in table.names.items():
            for base in bases:
                for name in spell_out(base):
                    owner = f"{table.family} with {channels} channels"
                    if name in owners:
                        found.append(f"{name} leads to {owners[name]} and to {owner}")
                    owners[name] = owner
    return tuple(found)


def _supply_faults(device: Device) -> Iterator[str]:
    low, high, absolute = device.supply_low, device.supply_high, device.supply_absolute
    for name, value in (("lowest", low), ("highest", high), ("absolute maximum", absolute)):
        if value is not None and not 0.5 <= value <= 500.0:
            yield f"its {name} supply is {value:g} V"
    if low is not None and high is not None and low >= high:
        yield f"its lowest supply, {low:g} V, is not below its highest, {high:g} V"
    if high is not None and absolute is not None and high > absolute:
        yield f"its highest supply, {high:g} V, is above its absolute maximum, {absolute:g} V"


def _scale_faults(device: Device) -> Iterator[str]:
    for name, (least, most, unit) in SCALES.items():
        figure: Figure = getattr(device, name)
        for value in (figure.typical, figure.guaranteed, figure.hot):
            unlimited = name == "load_capacitance" and value is not None and isinf(value)
            if value is not None and not least <= value <= most and not unlimited:
                yield (
                    f"{_words(name)} of {value:g} {unit} is outside {least:g} to {most:g} {unit}, "
                    "the unit may be mistaken"
                )
    slew, bandwidth = device.slew_rate.best, device.gain_bandwidth.best
    if slew and bandwidth:
        least, most = _SLEW_PER_BANDWIDTH
        if not least <= slew / bandwidth <= most:
            yield f"slew rate {slew:g} V/s and bandwidth {bandwidth:g} Hz do not go together"


def _order_faults(device: Device) -> Iterator[str]:
    """Find guaranteed values that are better than the typical or than the hot one."""
    for name in (*_MAXIMA, *_MINIMA):
        figure: Figure = getattr(device, name)
        sign = 1.0 if name in _MAXIMA else -1.0
        chain = [figure.typical, figure.guaranteed, figure.hot]
        known = [value for value in chain if value is not None]
        if any(sign * better > sign * worse for better, worse in pairwise(known)):
            yield f"{_words(name)}: the guaranteed value is better than the typical one"


def _swing_faults(device: Device) -> Iterator[str]:
    for side, points in (("positive", device.swing_high), ("negative", device.swing_low)):
        for point in points:
            yield from _point_faults(device, side, point)
            if any(_better(point, other) for other in points):
                yield (
                    f"the drop to the {side} rail at {point.amps:g} A: the guaranteed value is "
                    "better than the typical one"
                )
    for high in device.swing_high:
        for low in device.swing_low:
            if high.supply and high.supply == low.supply:
                left = high.supply - (high.guaranteed or 0.0) - (low.guaranteed or 0.0)
                if left <= 0.0:
                    yield f"on {high.supply:g} V nothing is left between its output limits"


def _better(guaranteed: SwingPoint, typical: SwingPoint) -> bool:
    """Tell whether one test's guaranteed drop is below its typical one."""
    same = (guaranteed.condition, guaranteed.supply) == (typical.condition, typical.supply)
    if not same or guaranteed.guaranteed is None or typical.typical is None:
        return False
    return guaranteed.guaranteed < typical.typical


def _point_faults(device: Device, side: str, point: SwingPoint) -> Iterator[str]:
    where = f"the drop to the {side} rail at {point.amps:g} A"
    if point.typical is None and point.guaranteed is None:
        yield f"{where} has no value"
    supply = point.supply or device.supply_high
    for value in (point.typical, point.guaranteed):
        if value is not None and (value < 0.0 or (supply is not None and value >= supply)):
            yield f"{where} is {value:g} V, outside its supply"
    if not 0.0 <= point.amps <= SCALES["source_current"][1]:
        yield f"{where}: that current is outside what an op-amp gives"
    if point.supply and device.supply_absolute and point.supply > device.supply_absolute:
        yield f"{where} is listed at {point.supply:g} V, above the absolute maximum"


def _other_faults(device: Device) -> Iterator[str]:
    low, high = device.input_low.best, device.input_high.best
    window = (device.supply_high or 500.0) + (high or 0.0) - (low or 0.0)
    if window <= 0.0:
        yield "no input level is legal at its highest supply"
    if device.temperature is not None:
        cold, hot = device.temperature
        if not -100.0 <= cold < hot <= 300.0:
            yield f"its temperature range is {cold:g} to {hot:g} °C"
    for package, resistance in device.theta.items():
        if not 0.2 <= resistance <= 1000.0:
            yield f"a thermal resistance of {resistance:g} K/W for {package}"


def _words(name: str) -> str:
    return name.replace("_", " ")
