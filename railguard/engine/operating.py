"""A design in ngspice: what its op-amps really do, non-linear devices included.

Every op-amp is our own macromodel with typical figures; everything else is written from the parsed
circuit. Two uses: stages whose numbers rest on a device the built-in solver does not follow get
them from here, and findings on range and current are confirmed or refuted.
"""

from collections.abc import Mapping

import msgspec
import numpy as np
from numpy.typing import NDArray

from railguard.analysis.bound import Range
from railguard.analysis.stage import Design, Stage
from railguard.devices.catalogue import Catalogue
from railguard.engine.bench import Bench, bench_of
from railguard.engine.ladder import Found, climb
from railguard.engine.process import Engine
from railguard.engine.rawfile import Plot

APART = 0.02
"""V between the inputs from which an amplifier has stopped following; a working loop holds them
within a few millivolts."""
EVEN = 0.05
"""Share by which a noise gain may differ over the band and still tell what an output would do."""
AT_END = 0.02
"""Share of its range within which an output stands at an end of it."""


class Simulated(msgspec.Struct, frozen=True):
    """What one amplifier did, V and A; ranges are empty where no run of its signals settled.

    level    of the output at the operating point; where it would be, if something stops it there
    rest     of the non-inverting input there
    current  out of the output pin
    plus     at its non-inverting input
    apart    largest voltage between its inputs: a few millivolts while its loop works
    wanted   where its output would be if nothing stopped it; empty where its loop is not known or
             differs over the band
    meets    False where the run was too short for its tones to meet at their worst
    """

    output: Range
    current: Range
    level: float
    rest: float | None = None
    plus: Range = Range()
    apart: float | None = None
    wanted: Range = Range()
    meets: bool = True


class Simulation(msgspec.Struct, frozen=True):
    """What a design did in ngspice, by amplifier, and what the run does not show as it is.

    remarks  elements left out or given a stand-in model, figures that stood in
    """

    stages: Mapping[str, Simulated]
    remarks: tuple[str, ...]


def simulate(design: Design, catalogue: Catalogue, engine: Engine) -> Simulation:
    """Run a design: operating point, then a transient over its signals.

    Raises:
        EngineError: ngspice gave nothing that can be trusted; an operating point from its last
            resort counts as nothing.
    """
    bench = bench_of(design, catalogue)
    found = climb(bench, engine)
    gains = {stage.designator: _even_gain(stage) for stage in design.stages}
    stages = {name: _simulated(name, bench, found, gains.get(name)) for name in bench.amplifiers}
    return Simulation(stages, bench.remarks)


def _even_gain(stage: Stage) -> float | None:
    """Return the noise gain of a stage whose loop is the same from DC to the top of its band."""
    loop = stage.loop
    if "loop" in stage.unknown or loop.dc != "negative" or stage.use != "linear":
        return None
    if loop.noise_gain is None or loop.noise_gain_dc is None:
        return None
    even = abs(loop.noise_gain - loop.noise_gain_dc) <= EVEN * loop.noise_gain_dc
    return loop.noise_gain_dc if even else None


def _simulated(name: str, bench: Bench, found: Found, gain: float | None) -> Simulated:
    at_rest, held = (float(found.levels.get(node, 0.0)) for node in bench.inputs(name))
    level = float(found.levels[bench.output(name)])
    if gain is not None and abs(at_rest - held) > APART:
        level += gain * (at_rest - held)
    if found.waves is None:
        return Simulated(Range(), Range(), level, at_rest)
    waves = found.waves
    kept = waves.real("time") >= bench.settled
    plus, minus = (_volts(waves, node)[kept] for node in bench.inputs(name))
    output = _volts(waves, bench.output(name))[kept]
    return Simulated(
        output=_range(output),
        current=_range(waves.current(bench.sensed(name))[kept]),
        level=level,
        rest=at_rest,
        plus=_range(plus),
        apart=float(np.max(np.abs(plus - minus))),
        wanted=Range() if gain is None else _wanted(output, plus - minus, gain),
        meets=bench.meets,
    )


def _wanted(output: NDArray[np.float64], apart: NDArray[np.float64], gain: float) -> Range:
    """Return the range an output would cover if it could: its inputs are together then.

    Only where it stands at an end of its range: on an edge it is late, not short.
    """
    span = float(np.ptp(output))
    at_an_end = (output >= output.max() - AT_END * span) | (output <= output.min() + AT_END * span)
    stopped = at_an_end & (np.abs(apart) > APART)
    return _range(output + np.where(stopped, gain * apart, 0.0))


def _volts(waves: Plot, node: str) -> NDArray[np.float64]:
    return waves.voltage(node)


def _range(values: NDArray[np.float64]) -> Range:
    return Range(float(np.min(values)), float(np.max(values)))
