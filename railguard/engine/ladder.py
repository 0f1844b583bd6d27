"""Operating points that can be trusted, and what to try before giving up.

ngspice's last resort for an operating point is a short transient whose end it passes off as one:
on op-amp circuits a guess. So whatever came that way is put aside. Tried in turn: the deck as it
is; the same with amplifiers that have no slew rate, which are easier to solve and stand at the same
levels; supplies that come up from zero in fine steps, where the end counts only if nothing moves
any more. Signals that were run from a guessed start count only where they have come to repeat.

Source  measured on 237 op-amp circuits: every wrong operating point came from the last resort
"""

from collections.abc import Mapping

import msgspec
import numpy as np

from railguard.engine.bench import PERIODS, Bench
from railguard.engine.process import Engine, Run
from railguard.engine.rawfile import Plot
from railguard.engine.requests import OperatingPoint, Transient
from railguard.errors import EngineError

RAMP_STEP, RAMP_STOP = 1e-6, 5e-3
"""Seconds; coarser steps ring by more than they may."""
LAST_SHARE = 0.2
STILL_VOLTS = 1e-3
"""How much an output may move over the last share of a ramp."""
REPEAT_SHARE, REPEAT_VOLTS = 0.02, 5e-3
"""How much of its span, and V, an output's range may change from one period to the next."""


class Found(msgspec.Struct, frozen=True):
    """What was found.

    levels  V by node at the operating point
    waves   of the transient over the signals; None where it did not come to repeat
    how     "as it is", "straight" or "ramp"
    """

    levels: Mapping[str, float]
    waves: Plot | None
    how: str


def climb(bench: Bench, engine: Engine) -> Found:
    """Find a bench's operating point and run its signals.

    Raises:
        EngineError: nothing gave an operating point that ngspice would stand by.
    """
    trouble: EngineError | None = None
    run: Run | None = None
    try:
        run = engine.run(bench.decks["limited"], OperatingPoint(), bench.request)
    except EngineError as error:
        trouble = error
    if run is not None and not run.fallback:
        point, waves = run.plots
        return Found(_levels(bench, point), waves, "as it is")
    waves_from_guess = run.plots[1] if run is not None else None
    repeated = waves_from_guess if waves_from_guess and _repeats(bench, waves_from_guess) else None
    for how, attempt in (("straight", _straight), ("ramp", _ramp)):
        try:
            levels = attempt(bench, engine)
        except EngineError as error:
            trouble = trouble or error
        else:
            if levels is not None:
                return Found(levels, repeated, how)
    why = f" {trouble}" if trouble is not None else ""
    raise EngineError(f"ngspice found no operating point it would stand by.{why}")


def _levels(bench: Bench, plot: Plot, place: int = 0) -> dict[str, float]:
    return {
        node: float(plot.voltage(node)[place])
        for node in dict.fromkeys(bench.output(name) for name in bench.amplifiers)
    }


def _straight(bench: Bench, engine: Engine) -> dict[str, float] | None:
    run = engine.run(bench.decks["straight"], OperatingPoint())
    return None if run.fallback else _levels(bench, run.plots[0])


def _ramp(bench: Bench, engine: Engine) -> dict[str, float] | None:
    """Return where the outputs come to rest; None where one of them does not."""
    (waves,) = engine.run(bench.decks["ramp"], Transient(RAMP_STEP, RAMP_STOP)).plots
    late = waves.real("time") >= RAMP_STOP * (1 - LAST_SHARE)
    for name in bench.amplifiers:
        if float(np.ptp(waves.voltage(bench.output(name))[late])) > STILL_VOLTS:
            return None
    return _levels(bench, waves, -1)


def _repeats(bench: Bench, waves: Plot) -> bool:
    """Tell whether the last period of the slowest signal is like the one before."""
    time = waves.real("time")
    period = time[-1] / PERIODS
    last, before = time >= time[-1] - period, (time < time[-1] - period) & (time >= period)
    for name in bench.amplifiers:
        volts = waves.voltage(bench.output(name))
        slack = REPEAT_VOLTS + REPEAT_SHARE * float(np.ptp(volts[last]))
        if (
            abs(float(np.max(volts[last]) - np.max(volts[before]))) > slack
            or abs(float(np.min(volts[last]) - np.min(volts[before]))) > slack
        ):
            return False
    return True
