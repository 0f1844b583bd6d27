"""The output side of a stage: range, swing, current, each against its limits."""

import numpy as np

from railguard.analysis.available import Reach, current_reach, output_reach
from railguard.analysis.bound import Bound, Range
from railguard.analysis.bounds import bound
from railguard.analysis.rail import Supply
from railguard.analysis.stage import Carrier, Current, Output, Part, Unknown
from railguard.analysis.surroundings import heaviest_load, load_capacitance
from railguard.analysis.vertices import Answer, ends
from railguard.analysis.view import View

_NO_SUPPLY = Unknown("its supply pins leave it no supply voltage", "see the finding on its supply")
_NO_LOOP = Unknown(
    "its output stands at one of its limits and what it drives there is not followed",
    "--engine ngspice",
)


def output_side(
    view: View,
    supply: Supply,
    load: float | None,
    working: bool,
    unknown: dict[Part, Unknown],
) -> tuple[Current, Output]:
    """Return what is asked of an output and what it can do, in volts and in amperes.

    load     resistance it works into, ohm
    working  False where no loop holds it
    unknown  filled with the reasons for what stays open
    """
    amplifier, device = view.amplifier, view.amplifier.match.device
    solved = amplifier.designator in view.answers.network.outputs
    known = working and view.known("output")
    current_known = solved and view.known("current") and (working or supply.total is not None)
    parts: tuple[Part, ...] = ("output", "current")
    for part in parts:
        why = view.why(part)
        if why is not None:
            unknown[part] = why
    if not working and "output" not in unknown:
        unknown["output"] = _NO_LOOP
    if supply.total is not None and supply.total <= 0:
        unknown["output"] = unknown["current"] = _NO_SUPPLY
        known = False
    level, (low, high) = view.level("output"), view.range("output")
    # What the netlist shows of its load counts where it does not show all.
    amps, (amps_low, amps_high) = view.level("current"), view.range("current")
    slope = 1.0 / load if load else 0.0
    if known and high - level > 1e-9:
        slope = max(slope, (amps_high - amps) / (high - level))

    # A transistor takes base current one way only: beyond what is asked nothing is added to it.
    carriers = view.solution.boost.drives.get(amplifier.designator, ())
    most = max(amps_high, 0.0), min(amps_low, 0.0)

    def line(volts: float) -> float:
        at = amps + slope * (volts - level) if known else slope * volts
        return min(max(at, most[1]), most[0]) if carriers else at

    reaches: dict[bool, Reach | None] = {True: None, False: None}
    if (
        supply.positive is not None
        and supply.negative is not None
        and supply.positive > supply.negative
    ):
        above, below = _rail_ohms(view, True), _rail_ohms(view, False)
        # The pins' levels hold what it gives at rest, and its reach counts all of it.
        rest = amps if amplifier.designator in view.answers.drawn else 0.0
        positive = supply.positive + above * max(rest, 0.0)
        negative = supply.negative - below * max(-rest, 0.0)
        for upper in (True, False):
            reaches[upper] = output_reach(
                device,
                positive,
                negative,
                upper,
                line if upper else lambda volts: -line(volts),
                above if upper else below,
            )
    q = view.at("output")
    spread = view.solution.spread
    bounds = {}
    for upper in (True, False):
        reach = reaches[upper]
        if reach is None:
            bounds[upper] = Bound(upper=upper, demand=(high if upper else low) if known else None)
            continue
        if not known:
            bounds[upper] = Bound(
                upper=upper,
                typical=reach.typical,
                guaranteed=reach.guaranteed,
                absolute=supply.positive if upper else supply.negative,
                typical_basis=reach.typical_basis,
                guaranteed_basis=reach.guaranteed_basis,
                absolute_basis=supply.basis,
                condition=reach.condition,
            )
            continue
        pin = view.at("positive" if upper else "negative")
        bounds[upper] = bound(
            upper=upper,
            demand=high if upper else low,
            level=level,
            span=high - low,
            reach=reach,
            absolute=supply.positive if upper else supply.negative,
            absolute_basis=supply.basis,
            demand_basis=view.basis("output"),
            spread=spread,
            moves=spread.high[q] if upper else spread.low[q],
            limit_moves=spread.high[pin],
            unsure=view.unsure("output"),
            exact=view.exact("output", upper, "positive" if upper else "negative"),
        )
    slew = float(view.answers.slew[q])
    error = float((np.abs(spread.high[q]) * spread.delta * spread.error).sum())
    up, down = reaches[True], reaches[False]
    output = Output(
        net=amplifier.output,
        level=level if known else None,
        demand=Range(low, high) if known else Range(),
        worst=view.worst("output") if known else Range(),
        rss=view.rss("output") if known else Range(),
        sampled=view.sampled("output") if known else Range(),
        available=Range(down.typical if down else None, up.typical if up else None),
        guaranteed=Range(down.guaranteed if down else None, up.guaranteed if up else None),
        high=bounds[True],
        low=bounds[False],
        frequency=_worst_frequency(view),
        slew=slew if known and slew > 0 else None,
        slew_worst=_slew_ends(view) if known and slew > 0 else Range(),
        offset=error if known and device is not None else None,
    )
    return _current(view, current_known, load, carriers if current_known else ()), output


def _slew_ends(view: View) -> Range:
    """Return the ends of the steepest slope, of each tone at the frequency where it is steepest.

    A wave that is no sine is taken to grow as its fundamental does.
    """
    q, spread = view.at("output"), view.solution.spread
    row = int(view.answers.rows[q])
    answers = []
    for tone in (tone for tone in view.answers.tones if tone.slew[q] > 0):
        at = next(worst for worst in tone.steepest if q in worst.picks)
        value = complex(at.x[row])
        if not value:
            return Range()
        weight = float(tone.slew[q]) / abs(value)
        adjoint, s = at.factor.adjoint([row])[0], 2j * np.pi * at.hertz
        answers.append(Answer(adjoint, at.factor, at.x, s, value, weight))
    return ends(spread.elements, spread.tolerances, answers)


def _rail_ohms(view: View, upper: bool) -> float:
    """Return the resistance at a supply pin, ohm."""
    row = int(view.answers.rows[view.at("positive" if upper else "negative")])
    return 0.0 if row < 0 else max(float(view.answers.dc.adjoint([row])[0, row].real), 0.0)


def _worst_frequency(view: View) -> float | None:
    q = view.at("output")
    best = max(view.tones, key=lambda t: float(t.peaks[q]), default=None)
    return float(best.hertz[q]) if best is not None and best.peaks[q] > 0 else None


def _current(view: View, known: bool, load: float | None, carriers: tuple[Carrier, ...]) -> Current:
    device = view.amplifier.match.device
    amps = view.level("current")
    low, high = view.range("current")
    q, spread = view.at("current"), view.solution.spread
    worst = view.worst("current")
    bounds, available = {}, {}
    for source in (True, False):
        reach = current_reach(device, source)
        demand = max(high if source else -low, 0.0)
        available[source] = reach.best
        moves = spread.high[q] if source else -spread.low[q]
        bounds[source] = (
            bound(
                upper=True,
                demand=demand,
                level=amps if source else -amps,
                span=high - low,
                reach=reach,
                absolute=None,
                absolute_basis="catalogue",
                demand_basis=view.basis("current"),
                spread=spread,
                moves=moves,
                limit_moves=np.zeros_like(moves),
                exact=view.exact("current", source, sign=1.0 if source else -1.0),
            )
            if known
            else Bound(upper=True, typical=reach.typical, guaranteed=reach.guaranteed)
        )
    capacitance = load_capacitance(view.amplifier, view.solution.ways)
    return Current(
        demand_source=max(high, 0.0) if known else None,
        demand_sink=max(-low, 0.0) if known else None,
        worst_source=max(worst.high or 0.0, 0.0) if known else None,
        worst_sink=max(-(worst.low or 0.0), 0.0) if known else None,
        sampled=view.sampled("current") if known else Range(),
        available_source=available[True],
        available_sink=available[False],
        source=bounds[True],
        sink=bounds[False],
        short_circuit=device.short_circuit.best if device is not None else None,
        load=load,
        load_capacitance=capacitance,
        into=heaviest_load(view.amplifier, view.solution.ways),
        carriers=carriers,
    )
