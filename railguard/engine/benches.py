"""The benches an op-amp's macromodel is put on, and the elements round it.

Every bench runs on plus and minus half the supply, so that mid-supply is ground; the amplifier's
pins are the nets of `PINS`. Loads and holds go to mid-supply: some models deliver thousands of
amperes into a rail.
"""

from collections.abc import Sequence

import msgspec
import numpy as np
from numpy.typing import NDArray

from railguard.circuit.model import GROUND, Control, Element
from railguard.circuit.sources import Pulse, Source
from railguard.engine.process import Engine
from railguard.engine.rawfile import Plot
from railguard.engine.requests import OperatingPoint, Request, SmallSignal, Sweep, Transient
from railguard.engine.specimen import PINS, Specimen
from railguard.engine.write import Written, write
from railguard.errors import EngineError

OVERDRIVE = 0.05
"""V between the inputs that drives the output to its limit."""
CLOSE = 0.05
"""V an output may be off its input in a follower before the pins are doubted."""
SERVO_ERROR = 0.01
"""V the output may move while the inputs move together, before the input range is left."""
BEYOND = 0.6
"""V beyond each rail that the inputs are swept."""
LOADS = (1e6, 10e3, 2e3, 600.0)
"""Ohms to mid-supply; the first counts as no load."""
HUGE = 1e9
"""Henry and farad that close a loop at DC and open it at every frequency looked at."""
STRAY_OHMS = 1e15
"""From every node to ground: a model's own gain node may stand at a tenth of a teraohm."""
LOWEST, HIGHEST = 1e-3, 1e11
"""Hertz, of the open-loop sweep."""

Floats = NDArray[np.float64]


class Bench(msgspec.Struct, frozen=True):
    """A macromodel on a supply, ready to be run.

    supply  total, V
    """

    specimen: Specimen
    engine: Engine
    supply: float

    @property
    def rail(self) -> float:
        """The positive rail, V from mid-supply; the negative one is its negative."""
        return self.supply / 2

    def run(self, around: Sequence[Element], request: Request) -> tuple[Plot, Written]:
        """Run one analysis with some elements round the amplifier.

        Raises:
            EngineError: ngspice failed, or its operating point is only a guess.
        """
        rails = (volts("SP", "v+", GROUND, self.rail), volts("SN", "v-", GROUND, -self.rail))
        written = write(
            (*self.specimen.elements, *rails, *around),
            self.specimen.models,
            self.specimen.placed,
            self.specimen.bodies,
            {"rshunt": STRAY_OHMS},
        )
        if written.left_out:
            first = written.left_out[0]
            raise EngineError(f"{first.designator} of the model cannot be simulated: {first.text}.")
        done = self.engine.run(written.text, request)
        if done.fallback:
            raise EngineError("ngspice found no operating point it can vouch for.")
        return done.plots[0], written

    def point(self, *around: Element) -> "Reading":
        """Run the operating point."""
        return Reading(*self.run(around, OperatingPoint()))


class Reading(msgspec.Struct, frozen=True):
    """A plot, read by circuit names."""

    plot: Plot
    written: Written

    def level(self, net: str) -> Floats:
        """Return a net's voltage to mid-supply, shape (points,)."""
        return self.plot.voltage(self.written.nodes[net])

    def current(self, source: str) -> Floats:
        """Return the current into the first net of a voltage source, shape (points,), A."""
        return self.plot.current(self.written.sources[source])


def volts(
    name: str, plus: str, minus: str, level: float, probe: bool = False, wave: Pulse | None = None
) -> Element:
    """Return a voltage source; `probe`: a small-signal volt stands on it."""
    source = Source(dc=level, ac=(1.0, 0.0) if probe else None, wave=wave)
    return Element(kind="V", designator=name, nets=(plus, minus), source=source)


def part(kind: str, name: str, first: str, second: str, value: float) -> Element:
    """Return a resistor, inductor or capacitor."""
    return Element(kind=kind, designator=name, nets=(first, second), value=value)


def follower(bench: Bench) -> dict[str, float]:
    """Measure offset, bias and supply current with the output tied to the inverting input.

    Raises:
        EngineError: the output does not follow: the pins are others than taken.
    """
    read = bench.point(volts("IN", "in+", GROUND, 0.0), volts("FB", "out", "in-", 0.0))
    offset = float(read.level("out")[0])
    if abs(offset) > CLOSE:
        raise EngineError(
            f"as a follower the output stands {offset:.3g} V from its input; are the pins "
            f"{', '.join(PINS)} in the order taken?"
        )
    plus, minus = -float(read.current("IN")[0]), float(read.current("FB")[0])
    return {
        "offset_voltage": abs(offset),
        # The offset itself drives a current through the model's input resistance; in the mean of
        # both pins that cancels.
        "bias_current": abs(plus + minus) / 2,
        "supply_current": -float(read.current("SP")[0]),
    }


def swing(bench: Bench, ohms: float, upwards: bool) -> tuple[float, float, float]:
    """Return drop to the rail (V), output current (A) and that rail's current (A) at one load."""
    sign = 1.0 if upwards else -1.0
    read = bench.point(
        volts("IN", "in+", GROUND, sign * OVERDRIVE),
        volts("REF", "in-", GROUND, 0.0),
        part("R", "RL", "out", GROUND, ohms),
    )
    reached = sign * float(read.level("out")[0])
    rail_current = -sign * float(read.current("SP" if upwards else "SN")[0])
    return bench.rail - reached, reached / ohms, rail_current


def held(bench: Bench, upwards: bool) -> float:
    """Return the current the output gives while it is held at mid-supply, A."""
    sign = 1.0 if upwards else -1.0
    read = bench.point(
        volts("IN", "in+", GROUND, sign * OVERDRIVE),
        volts("REF", "in-", GROUND, 0.0),
        volts("HOLD", "out", GROUND, 0.0),
    )
    return sign * float(read.current("HOLD")[0])


def open_loop(bench: Bench) -> tuple[Floats, Floats]:
    """Return frequency (Hz) and open-loop gain (V/V), both shape (points,)."""
    around = (
        volts("IN", "in+", GROUND, 0.0, probe=True),
        part("L", "LC", "out", "in-", HUGE),
        part("C", "CO", "in-", GROUND, HUGE),
    )
    plot, written = bench.run(around, SmallSignal(20, LOWEST, HIGHEST))
    response = {net: plot.vectors[f"v({written.nodes[net]})"] for net in ("in+", "in-", "out")}
    gain = np.abs(response["out"] / (response["in+"] - response["in-"]))
    return plot.real("frequency"), np.asarray(gain, dtype=np.float64)


def step(bench: Bench, amplitude: float, edge: float, stop: float) -> tuple[Floats, Floats]:
    """Return time (s) and output (V) of a follower stepped from -amplitude up and back down.

    The edge is slow against the slewing, so that nothing feeds through the input capacitance.
    """
    wave = Pulse(-amplitude, amplitude, stop * 0.05, edge, edge, stop * 0.45, stop * 2)
    around = (
        volts("IN", "in+", GROUND, -amplitude, wave=wave),
        volts("FB", "out", "in-", 0.0),
    )
    plot, written = bench.run(around, Transient(stop / 2000, stop))
    return plot.real("time"), plot.voltage(written.nodes["out"])


def common_mode(bench: Bench, upwards: bool) -> tuple[Floats, Floats]:
    """Return input level and servo error, both V and shape (points,), inputs moving together.

    The feedback shifts the output by the input's own level, so that it stays at mid-supply and its
    swing does not pass for an input limit. The sweep starts at mid-supply and ends beyond one
    rail: from beyond a rail some models come back in a state of their own.
    """
    span = (bench.rail + BEYOND) * (1.0 if upwards else -1.0)
    shift = Control(gain=1.0, nets=("in+", GROUND))
    around = (
        volts("IN", "in+", GROUND, 0.0),
        Element(kind="E", designator="SHIFT", nets=("in-", "out"), control=shift),
    )
    _, written = bench.run(around, OperatingPoint())
    source = written.sources["IN"]
    plot, written = bench.run(around, Sweep(source, 0.0, span, span / 1200))
    return plot.voltage(written.nodes["in+"]), plot.voltage(written.nodes["out"])
