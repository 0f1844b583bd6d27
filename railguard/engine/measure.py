"""Measures an op-amp's macromodel on ngspice benches.

Each bench stands alone: one that fails says so and leaves its fields out. What a macromodel shows
is typical behaviour; nothing measured is ever called guaranteed.
"""

from collections.abc import Callable, Iterator

import msgspec
import numpy as np

from railguard.engine import benches
from railguard.engine.benches import LOADS, Bench, Floats
from railguard.engine.process import Engine
from railguard.engine.specimen import Specimen
from railguard.errors import EngineError

NO_LOAD_DEPENDENCE = 10e-3
"""V: a drop that changes less than this from no load to the heaviest knows no load."""
LIMITED = 0.98
"""Share of the largest current from which a load is at the current limit, not at the swing's."""
REJECTION = 3e-4
"""Common-mode rejection below which a slow drift does not count as a limit: 70 dB."""
SECOND_POLE = 1.15
"""Ratio of gain times frequency at 20 dB to the 0 dB crossing that a second pole explains."""

Figures = dict[str, object]


class Outcome(msgspec.Struct, frozen=True):
    """What one bench gave.

    figures  fields of a catalogue table
    remarks  what is odd about the model, whole sentences
    failed   why the bench gave nothing, or ""
    """

    bench: str
    figures: Figures = {}
    remarks: tuple[str, ...] = ()
    failed: str = ""


def measure(made: Specimen, engine: Engine, supply: float) -> Iterator[Outcome]:
    """Run every bench, one outcome each, in the order of `BENCHES`.

    supply  total, V

    Where the first, the follower, fails, nothing else is run: no figure of an amplifier whose pins
    are in doubt can be trusted.
    """
    bench = Bench(made, engine, supply)
    known: Figures = {}
    doubt = ""
    for name, run in BENCHES:
        try:
            outcome = Outcome("", failed=doubt) if doubt else run(bench, known)
        except EngineError as error:
            outcome = Outcome("", failed=error.what)
        if run is _follower:
            doubt = outcome.failed
        known.update(outcome.figures)
        yield msgspec.structs.replace(outcome, bench=name)


def _typical(value: float, condition: str = "") -> dict[str, object]:
    found: dict[str, object] = {"typical": float(f"{value:.4g}")}
    return {**found, "condition": condition} if condition else found


def _follower(bench: Bench, known: Figures) -> Outcome:
    del known
    found = benches.follower(bench)
    return Outcome("", {name: _typical(value) for name, value in found.items() if value > 0.0})


def _limits(bench: Bench, known: Figures) -> Outcome:
    del known
    source, sink = benches.held(bench, True), benches.held(bench, False)
    where = "output held at mid-supply"
    return Outcome(
        "",
        {
            "source_current": _typical(source, where),
            "sink_current": _typical(sink, where),
            "short_circuit": _typical(min(source, sink), where),
        },
    )


def _swing(bench: Bench, known: Figures) -> Outcome:
    figures: Figures = {}
    remarks = []
    for side, upwards in (("high", True), ("low", False)):
        tests = [benches.swing(bench, ohms, upwards) for ohms in LOADS]
        limit = _limit_of(known, "source_current" if upwards else "sink_current")
        figures[f"swing_{side}"] = [
            {"amps": float(f"{amps:.4g}"), "typical": max(float(f"{drop:.4g}"), 0.0)}
            for drop, amps, _rail in tests
            if limit is None or amps < LIMITED * limit
        ]
        rail = "positive" if upwards else "negative"
        if abs(tests[-1][0] - tests[0][0]) < NO_LOAD_DEPENDENCE:
            remarks.append(
                f"The drop to the {rail} rail does not depend on the load: the model tells nothing "
                "of its output under load."
            )
        drawn = tests[-1][2] - tests[0][2]
        if drawn < 0.5 * (tests[-1][1] - tests[0][1]):
            remarks.append(f"The load's current does not come from the {rail} supply pin.")
    return Outcome("", figures, tuple(remarks))


def _limit_of(known: Figures, name: str) -> float | None:
    figure = known.get(name)
    value = figure.get("typical") if isinstance(figure, dict) else None
    return value if isinstance(value, float) else None


def _gain(bench: Bench, known: Figures) -> Outcome:
    del known
    frequency, gain = benches.open_loop(bench)
    if gain[0] < 10.0 or gain[-1] > 1.0:
        raise EngineError("the open-loop gain does not fall from above 20 dB through 0 dB.")
    tenfold = _crossing(frequency, gain, 10.0)
    unity = _crossing(frequency, gain, 1.0)
    remarks: tuple[str, ...] = ()
    if 10.0 * tenfold > SECOND_POLE * unity:
        remarks = (
            f"Gain times frequency is {10.0 * tenfold:.3g} Hz at 20 dB, but the gain reaches 0 dB "
            f"at {unity:.3g} Hz: a second pole lies near.",
        )
    figures: Figures = {
        "gain_bandwidth": _typical(10.0 * tenfold),
        "open_loop_gain": _typical(float(gain[0])),
    }
    return Outcome("", figures, remarks)


def _crossing(frequency: Floats, gain: Floats, level: float) -> float:
    """Return where the gain last falls through a level, Hz, on logarithmic axes."""
    at = int(np.flatnonzero(gain >= level)[-1])
    share = np.log(gain[at] / level) / np.log(gain[at] / gain[at + 1])
    return float(frequency[at] * (frequency[at + 1] / frequency[at]) ** share)


def _slew(bench: Bench, known: Figures) -> Outcome:
    amplitude = 0.15 * bench.supply
    bandwidth = _limit_of(known, "gain_bandwidth") or 1e6
    # One volt per microsecond and megahertz is the middle of what op-amps do.
    guess = bandwidth
    for _turn in range(6):
        span = 2 * amplitude / guess
        time, output = benches.step(bench, amplitude, 0.02 * span, 12 * span)
        rates = _rates(time, output, amplitude)
        if rates is None:
            guess /= 10
        elif not 0.3 < min(rates) / guess < 3.0:
            guess = min(rates)
        else:
            return Outcome("", {"slew_rate": _typical(min(rates))}, _uneven(rates))
    raise EngineError("the output of a follower does not settle after a step.")


def _uneven(rates: tuple[float, float]) -> tuple[str, ...]:
    if max(rates) < 1.2 * min(rates):
        return ()
    return (
        f"It slews up at {rates[0]:.3g} V/s and down at {rates[1]:.3g} V/s; the slower counts.",
    )


def _rates(time: Floats, output: Floats, amplitude: float) -> tuple[float, float] | None:
    """Return slew rate up and down from 20 to 80 % of the step, V/s; None: not reached."""
    middle = int(np.searchsorted(time, time[-1] * 0.5))
    rates = []
    for sign, first, last in ((1.0, 0, middle), (-1.0, middle, len(time))):
        times = [
            _last_rise(time[first:last], sign * output[first:last], level)
            for level in (-0.6 * amplitude, 0.6 * amplitude)
        ]
        if times[0] is None or times[1] is None or times[1] <= times[0]:
            return None
        rates.append(1.2 * amplitude / (times[1] - times[0]))
    return rates[0], rates[1]


def _last_rise(time: Floats, values: Floats, level: float) -> float | None:
    """Return when values last rise through a level and stay above it to the end, s."""
    below = np.flatnonzero(values < level)
    if not below.size or below[-1] + 1 >= len(values):
        return None
    at = int(below[-1])
    share = (level - values[at]) / (values[at + 1] - values[at])
    return float(time[at] + share * (time[at + 1] - time[at]))


def _inputs(bench: Bench, known: Figures) -> Outcome:
    del known
    figures: Figures = {}
    for name, upwards in (("input_low", False), ("input_high", True)):
        level, error = benches.common_mode(bench, upwards)
        # A thousandth or so of the level is the model's finite rejection, not a limit.
        allowed = benches.SERVO_ERROR + REJECTION * np.abs(level)
        away = np.flatnonzero(np.abs(error - error[0]) > allowed)
        if away.size and away[0] < 3:
            raise EngineError("the inputs do not work at mid-supply.")
        last = float(level[away[0] - 1] if away.size else level[-1])
        rail = bench.rail if upwards else -bench.rail
        figures[name] = _typical(last - rail, "" if away.size else "at least; no limit found")
    return Outcome("", figures)


BENCHES: tuple[tuple[str, Callable[[Bench, Figures], Outcome]], ...] = (
    ("offset, bias and supply current", _follower),
    ("source and sink limit", _limits),
    ("output swing into several loads", _swing),
    ("gain-bandwidth product", _gain),
    ("slew rate", _slew),
    ("input range", _inputs),
)
