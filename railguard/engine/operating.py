"""A design in ngspice: what its op-amps really do, non-linear devices included.

Every op-amp is our own macromodel with typical figures; everything else is written from the parsed
circuit. Two uses: stages whose numbers rest on a device the built-in solver does not follow get
them from here, and findings on range and current are confirmed or refuted.
"""

from collections.abc import Mapping

import msgspec
import numpy as np
from numpy.typing import NDArray

from railguard.analysis.stage import Design, Range
from railguard.devices.catalogue import Catalogue
from railguard.engine.bench import Bench, bench_of
from railguard.engine.ladder import Found, climb
from railguard.engine.process import Engine
from railguard.engine.rawfile import Plot


class Simulated(msgspec.Struct, frozen=True):
    """What one amplifier did, V and A; ranges are empty where no run of its signals settled.

    current  out of the output pin
    plus     at its non-inverting input
    apart    largest voltage between its inputs: a few millivolts while its loop works
    meets    False where the run was too short for its tones to meet at their worst
    """

    output: Range
    current: Range
    level: float
    plus: Range = Range()
    apart: float | None = None
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
    stages = {name: _simulated(name, bench, found) for name in bench.amplifiers}
    return Simulation(stages, bench.remarks)


def _simulated(name: str, bench: Bench, found: Found) -> Simulated:
    level = float(found.levels[bench.output(name)])
    if found.waves is None:
        return Simulated(Range(), Range(), level)
    waves = found.waves
    kept = waves.real("time") >= bench.settled
    plus, minus = (_volts(waves, node)[kept] for node in bench.inputs(name))
    return Simulated(
        output=_range(_volts(waves, bench.output(name))[kept]),
        current=_range(waves.current(bench.sensed(name))[kept]),
        level=level,
        plus=_range(plus),
        apart=float(np.max(np.abs(plus - minus))),
        meets=bench.meets,
    )


def _volts(waves: Plot, node: str) -> NDArray[np.float64]:
    return waves.voltage(node)


def _range(values: NDArray[np.float64]) -> Range:
    return Range(float(np.min(values)), float(np.max(values)))
