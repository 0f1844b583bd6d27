"""A family in words: one row per figure, for the command and for reports.

A value not read in the named document is marked, so that nobody takes memory for a data sheet.
"""

from collections.abc import Iterator

import msgspec

from railguard.devices.layout import FIGURES
from railguard.devices.model import Device, Figure, SwingPoint
from railguard.units import si
from railguard.words import Basis

MARKS: dict[Basis, str] = {
    "catalogue": "",
    "memory": "†",
    "practice": "‡",
    "user": "",
    "netlist": "",
    "assumed": "‡",
}
LEGEND = (
    ("†", "from memory, not read in the document"),
    ("‡", "common practice for the package, not a maker's figure"),
)

_UNITS = {
    "input_low": "V",
    "input_high": "V",
    "source_current": "A",
    "sink_current": "A",
    "short_circuit": "A",
    "gain_bandwidth": "Hz",
    "slew_rate": "V/s",
    "open_loop_gain": "",
    "stable_gain": "",
    "bias_current": "A",
    "offset_current": "A",
    "offset_voltage": "V",
    "supply_current": "A",
    "voltage_noise": "V/√Hz",
    "current_noise": "A/√Hz",
    "load_capacitance": "F",
    "input_capacitance": "F",
    "output_resistance": "Ω",
    "differential_input": "V",
    "feedback_resistor": "Ω",
}

_LABELS = {
    "input_low": "input low, from V-",
    "input_high": "input high, from V+",
    "source_current": "current sourced",
    "sink_current": "current sunk",
    "gain_bandwidth": "gain-bandwidth",
    "stable_gain": "smallest noise gain",
    "load_capacitance": "capacitive load",
    "differential_input": "differential input",
    "supply_current": "supply per amplifier",
    "feedback_resistor": "feedback resistor",
}
"""What is not its own name with blanks; V+ and V- are the supply pins."""


class Row(msgspec.Struct, frozen=True):
    """One figure in words; "" where a value is not known."""

    label: str
    typical: str = ""
    guaranteed: str = ""
    hot: str = ""
    condition: str = ""


def rows(device: Device) -> tuple[Row, ...]:
    """Return what is known of a family, in the order a reviewer asks for it."""
    return (
        *_supply_rows(device),
        *_figure_rows(device, FIGURES[:2]),
        *_swing_rows("drop to V+", device.swing_high),
        *_swing_rows("drop to V-", device.swing_low),
        *_figure_rows(device, FIGURES[2:]),
        *_other_rows(device),
    )


def facts(device: Device) -> str:
    """Return technology and behaviour in one line."""
    found = [device.technology] if device.technology else []
    if device.feedback == "current":
        found.append("current feedback")
    if device.phase_reversal is not None:
        found.append("reverses phase" if device.phase_reversal else "no phase reversal")
    if device.rail_to_rail_input:
        found.append("rail-to-rail input")
    if device.rail_to_rail_output:
        found.append("rail-to-rail output")
    return ", ".join(found)


def legend(device: Device) -> tuple[tuple[str, str], ...]:
    """Return the marks that occur in a family's rows, with their meaning."""
    text = "".join("".join(msgspec.structs.astuple(row)) for row in rows(device))
    return tuple(entry for entry in LEGEND if entry[0] in text)


def _marked(value: float | None, unit: str, basis: Basis) -> str:
    if value is None:
        return ""
    return (si(value, unit) or "0") + MARKS[basis]


def _supply_rows(device: Device) -> Iterator[Row]:
    basis = device.supply_basis
    low = _marked(device.supply_low, "V", basis.get("low", "memory"))
    high = _marked(device.supply_high, "V", basis.get("high", "memory"))
    if low or high:
        yield Row("total supply", guaranteed=" to ".join(filter(None, (low, high))))
    if device.supply_absolute is not None:
        absolute = _marked(device.supply_absolute, "V", basis.get("absolute", "memory"))
        yield Row("absolute maximum", guaranteed=absolute)


def _figure_rows(device: Device, names: tuple[str, ...]) -> Iterator[Row]:
    for name in names:
        figure: Figure = getattr(device, name)
        if figure.typical is None and figure.guaranteed is None:
            continue
        unit = _UNITS[name]
        yield Row(
            label=_LABELS.get(name, name.replace("_", " ")),
            typical=_marked(figure.typical, unit, figure.typical_basis),
            guaranteed=_marked(figure.guaranteed, unit, figure.guaranteed_basis),
            hot=_marked(figure.hot, unit, figure.guaranteed_basis),
            condition=figure.condition,
        )
        if name == "input_high" and device.input_reach is not None:
            reach = si(device.input_reach, "V")
            yield Row("input reach", condition=f"works {reach} above the negative rail")


def _swing_rows(label: str, points: tuple[SwingPoint, ...]) -> Iterator[Row]:
    """Put the typical and guaranteed value of one test back into one row."""
    tests: dict[tuple[str, float | None], dict[str, str]] = {}
    for point in points:
        row = tests.setdefault((point.condition, point.supply), {"typical": "", "guaranteed": ""})
        row["typical"] += _marked(point.typical, "V", point.typical_basis)
        row["guaranteed"] += _marked(point.guaranteed, "V", point.guaranteed_basis)
    for (condition, _supply), row in tests.items():
        yield Row(label, row["typical"], row["guaranteed"], condition=condition)


def _other_rows(device: Device) -> Iterator[Row]:
    if device.temperature is not None:
        cold, hot = device.temperature
        yield Row("temperature range", condition=f"{cold:g} to {hot:g} °C")
    if device.theta:
        mark = MARKS[device.theta_basis]
        listed = (f"{package} {value:g}{mark}" for package, value in device.theta.items())
        yield Row("junction to ambient", condition=f"{', '.join(listed)} K/W")
