"""The figures an op-amp's macromodel is made of, taken from its data sheet.

Typical figures, as a macromodel shows a typical device. What the data sheet does not say is taken
from common practice, and each such figure is named.
"""

import msgspec

from railguard.analysis.available import (
    PRACTICE_DROP,
    PRACTICE_DROP_RAIL_TO_RAIL,
    current_reach,
    input_reach,
)
from railguard.analysis.stamping import OPEN_LOOP_GAIN
from railguard.devices.model import Device, Figure, SwingPoint
from railguard.devices.swing import drop

HIGHEST_GAIN = 1e6
"""An open-loop gain above this makes operating points harder to find and tells nothing more."""
PRACTICE_BANDWIDTH = 1e6
"""Hertz, for a device nobody lists: common practice, no source."""
SLEW_PER_BANDWIDTH = 0.5
"""Volts: slew rate over gain-bandwidth of a general-purpose op-amp; common practice, no source."""
PRACTICE_OUTPUT_OHMS = 60.0
"""Open-loop output resistance of a general-purpose op-amp: common practice, no source."""
PRACTICE_SUPPLY_CURRENT = 1e-3
"""A, quiescent: common practice, no source."""
BIPOLAR_INPUT_OHMS = 2e6
OTHER_INPUT_OHMS = 1e12
"""Between the inputs, where bipolar and where not: common practice, no source."""
PRACTICE_INPUT_FARADS = 2e-12
"""Common practice, no source."""
LEAST_SATURATION_OHMS = 1.0
"""An output stage never gets nearer to a voltage source than this: it keeps the model solvable."""


class Figures(msgspec.Struct, frozen=True, kw_only=True):
    """What a macromodel is made of, SI.

    slew                   V/s
    input_low, input_high  end of the input range, V above the negative and above the positive
                           rail; None: no limit
    drop_high, drop_low    distance the output keeps from each rail without load, V
    ohms_high, ohms_low    how much more of it per ampere
    source, sink           largest output current, A
    bias                   current into each input, A
    """

    gain: float = OPEN_LOOP_GAIN
    bandwidth: float = PRACTICE_BANDWIDTH
    slew: float = SLEW_PER_BANDWIDTH * PRACTICE_BANDWIDTH
    input_low: float | None = None
    input_high: float | None = None
    drop_high: float = PRACTICE_DROP[0]
    drop_low: float = PRACTICE_DROP[0]
    ohms_high: float = LEAST_SATURATION_OHMS
    ohms_low: float = LEAST_SATURATION_OHMS
    source: float = 0.02
    sink: float = 0.02
    output_ohms: float = PRACTICE_OUTPUT_OHMS
    input_ohms: float = OTHER_INPUT_OHMS
    input_farads: float = PRACTICE_INPUT_FARADS
    supply_current: float = PRACTICE_SUPPLY_CURRENT
    offset: float = 0.0
    bias: float = 0.0


def figures_of(
    device: Device | None,
    positive: float,
    negative: float,
    *,
    offset: bool = False,
    gain: float | None = None,
) -> tuple[Figures, tuple[str, ...]]:
    """Work out a macromodel's figures for a device on its rails.

    device    None: one that nobody lists
    positive, negative  its rails, V: swing and input range are taken at this supply
    offset    True: with typical offset; a demand is worked out without it
    gain      open-loop gain that the netlist itself states

    Returns the figures, and a phrase for each that was assumed.
    """
    given = _Given(device)
    total = positive - negative
    bandwidth = given.figure("gain_bandwidth", PRACTICE_BANDWIDTH, "gain-bandwidth 1 MHz")
    high, low = given.swing(True, total), given.swing(False, total)
    top, bottom = (given.input_end(upper, positive, negative) for upper in (True, False))
    bipolar = device is not None and device.technology == "bipolar"
    # An input range that takes in the negative rail has PNP inputs: their current flows out.
    outward = bipolar and bottom is not None and bottom <= 0
    bias = given.figure("bias_current", 0.0, "no bias current")
    listed_gain = given.figure("open_loop_gain", OPEN_LOOP_GAIN, "open-loop gain 2e5")
    figures = Figures(
        gain=min(gain or listed_gain, HIGHEST_GAIN),
        bandwidth=bandwidth,
        slew=given.figure(
            "slew_rate", SLEW_PER_BANDWIDTH * bandwidth, "slew rate 0.5 V/us for each MHz"
        ),
        input_low=bottom,
        input_high=top,
        drop_high=high[0],
        ohms_high=high[1],
        drop_low=low[0],
        ohms_low=low[1],
        source=given.current(True),
        sink=given.current(False),
        output_ohms=given.figure(
            "output_resistance", PRACTICE_OUTPUT_OHMS, "output resistance 60 ohm"
        ),
        input_ohms=BIPOLAR_INPUT_OHMS if bipolar else OTHER_INPUT_OHMS,
        input_farads=given.figure("input_capacitance", PRACTICE_INPUT_FARADS, "2 pF at the inputs"),
        supply_current=given.figure(
            "supply_current", PRACTICE_SUPPLY_CURRENT, "quiescent current 1 mA"
        ),
        offset=given.figure("offset_voltage", 0.0, "no offset") if offset else 0.0,
        bias=-bias if outward else bias,
    )
    return figures, tuple(dict.fromkeys(given.assumed))


class _Given:
    """Reads a device's figures and notes what had to be assumed."""

    def __init__(self, device: Device | None) -> None:
        self.device = device
        self.assumed: list[str] = []

    def figure(self, field: str, fallback: float, phrase: str) -> float:
        figure: Figure = getattr(self.device, field) if self.device is not None else Figure()
        value = figure.typical if figure.typical is not None else figure.guaranteed
        if value is not None and value > 0:
            return value
        self.assumed.append(phrase)
        return fallback

    def current(self, source: bool) -> float:
        reach = current_reach(self.device, source)
        if "practice" in (reach.typical_basis, reach.guaranteed_basis):
            self.assumed.append("output current")
        most = reach.typical if reach.typical is not None else reach.guaranteed
        return most if most else 0.0

    def input_end(self, upper: bool, positive: float, negative: float) -> float | None:
        """Return the end of the input range from its rail, V."""
        reach = input_reach(self.device, positive, negative, upper)
        end = reach.typical if reach.typical is not None else reach.guaranteed
        if end is None:
            self.assumed.append(f"inputs up to and beyond the {'upper' if upper else 'lower'} rail")
            return None
        return end - (positive if upper else negative)

    def swing(self, upper: bool, total: float) -> tuple[float, float]:
        """Return the drop to a rail without load, V, and how much more per ampere, ohm."""
        device = self.device
        points: tuple[SwingPoint, ...] = ()
        if device is not None:
            points = device.swing_high if upper else device.swing_low
        most = self.current(upper)
        loaded = min(max((point.amps for point in points), default=0.0), most) or most / 2
        ends = [self._drop(points, amps, total) for amps in (0.0, loaded)]
        if ends[0] is None or ends[1] is None:
            self.assumed.append(f"swing to the {'upper' if upper else 'lower'} rail")
            rail_to_rail = device is not None and device.rail_to_rail_output
            free = (PRACTICE_DROP_RAIL_TO_RAIL if rail_to_rail else PRACTICE_DROP)[0]
            return (ends[0] if ends[0] is not None else free), free / most
        slope = (ends[1] - ends[0]) / loaded
        return ends[0], max(slope, LEAST_SATURATION_OHMS)

    @staticmethod
    def _drop(points: tuple[SwingPoint, ...], amps: float, total: float) -> float | None:
        found = drop(points, amps, total)
        return found.typical if found.typical is not None else found.guaranteed
