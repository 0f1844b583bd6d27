"""Each amplifier's stage, read from the solved circuit."""

from collections.abc import Mapping, Sequence

import msgspec
import numpy as np

from railguard.analysis.balance import balance_of
from railguard.analysis.bound import Range
from railguard.analysis.closing import Bands
from railguard.analysis.filters import filter_of
from railguard.analysis.heat import heat_of
from railguard.analysis.inputs import inputs_of
from railguard.analysis.loop import Filter, Loop
from railguard.analysis.loops import OPEN_BETA, Margin, loop_of, with_ends
from railguard.analysis.outputs import output_side
from railguard.analysis.positive import with_thresholds
from railguard.analysis.rail import Supply
from railguard.analysis.reach import (
    Gain,
    band_of,
    gains_of,
    high_pass_of,
    is_ac_coupled,
    noise_gain_span,
    top_of,
)
from railguard.analysis.recognise import Amplifier
from railguard.analysis.solution import Solution, stated_use
from railguard.analysis.stage import Allowed, Inputs, Output, Part, Pin, Stage, Unknown
from railguard.analysis.supplies import Feed
from railguard.analysis.surroundings import feedback_of, output_load
from railguard.analysis.thermal import case_of, junction, package_heat
from railguard.analysis.topology import instrumentation, topology_of
from railguard.analysis.unseen import Spoiled
from railguard.analysis.uses import bridges, worked_out_use
from railguard.analysis.view import View
from railguard.circuit.model import GROUND
from railguard.settings.model import Settings
from railguard.words import Basis

WEAK = 1e-6
"""A share of an output below this at an input is no connection."""


def drafts_of(
    solution: Solution,
    feeds: Mapping[str, Feed],
    settings: Settings,
    spoiled: list[Spoiled],
    rails: frozenset[str],
) -> tuple[Stage, ...]:
    """Build the stage of every amplifier of a solved part, without what other parts add to it."""
    views = [View(solution, k, spoiled) for k in range(len(solution.amplifiers))]
    after = [_after(view) for view in views]
    bands = Bands(solution.loop_network, solution.off)
    return tuple(_stage(view, feeds, settings, rails, after, bands) for view in views)


def finished(
    drafts: Sequence[Stage], allowed: Mapping[str, Allowed], settings: Settings
) -> tuple[Stage, ...]:
    """Add what takes all stages of a circuit: the input allowed, a package's heat, names of three.

    allowed  by designator
    """
    heat, least, most = (
        package_heat(drafts, own)
        for own in (
            lambda stage: stage.dissipation,
            lambda stage: stage.dissipation_worst.low,
            lambda stage: stage.dissipation_worst.high,
        )
    )
    names = instrumentation(
        {stage.designator: stage.topology for stage in drafts},
        {stage.designator: stage.after for stage in drafts},
    )
    return tuple(
        msgspec.structs.replace(
            stage,
            topology=names[stage.designator],
            allowed=allowed.get(stage.designator),
            dissipation=heat[stage.package],
            dissipation_worst=Range(least[stage.package], most[stage.package]),
            junction=junction(stage.case, heat[stage.package], settings),
            junction_worst=Range(
                *(junction(stage.case, end[stage.package], settings) for end in (least, most))
            ),
        )
        for stage in drafts
    )


RESIDUE = 1e-3
"""Share of a difference amplifier's gain below which a gain is common mode."""


def _after(view: View) -> tuple[str, ...]:
    """Return the amplifiers whose output reaches this one's inputs without passing a third."""
    passive, amplifier = view.solution.passive, view.amplifier
    rows = [passive.network.row(amplifier.plus), passive.network.row(amplifier.minus)]
    dc, mid = passive.dc.adjoint(rows), passive.mid.adjoint(rows)
    strong = (np.maximum(np.abs(dc), np.abs(mid)).max(axis=0) > WEAK).tolist()
    others = (a for a in view.solution.amplifiers if a is not amplifier)
    driven = ((a.designator, passive.network.outputs.get(a.designator, -1)) for a in others)
    return tuple(name for name, row in driven if row >= 0 and strong[row])


def _stage(
    view: View,
    feeds: Mapping[str, Feed],
    settings: Settings,
    rails: frozenset[str],
    after: list[tuple[str, ...]],
    bands: Bands,
) -> Stage:
    solution, amplifier, device = view.solution, view.amplifier, view.amplifier.match.device
    name = amplifier.designator
    unknown: dict[Part, Unknown] = {}
    supply = _supply(view, feeds, unknown)
    top = top_of(view)
    loop = Loop(band=top)
    if name in solution.through:
        sign = solution.swept.dc[view.k]
        loop = Loop(dc="negative" if sign > 0 else "positive", band=top)
        unknown["output"] = unknown["current"] = unknown["loop"] = _THROUGH_DIODES
    elif name in solution.turning.ramps:
        loop = Loop(dc="negative", band=top, holds=tuple(sorted(solution.turning.switching)))
    elif name in solution.answers.network.outputs:
        margin = solution.margins.get(name, Margin())
        closing = solution.closings.get(name)
        loop = loop_of(amplifier, view.k, solution.swept, top, margin, closing)
        loop = msgspec.structs.replace(
            loop,
            holds=_holds(view, loop, after),
            bridges=bridges(amplifier, solution.ways) if loop.dc == "open" else (),
        )
    stated = stated_use(amplifier, settings)
    use = stated or (
        "oscillator"
        if name in solution.turning.all
        else worked_out_use(amplifier, solution.ways, loop, _other_inputs(view), rails)
    )
    working = name not in solution.forced and name in solution.answers.network.outputs
    loop = with_thresholds(view, loop, after)
    if use == "linear" and stated is None and loop.switched:
        use = "comparator"
    spread_noise_gain = noise_gain_span(view, loop)
    loop = with_ends(loop, spread_noise_gain, bands, view.k, local=view.k in solution.swept.local)
    feedback = feedback_of(amplifier, solution.passive, solution.ways, solution.answers)
    load = output_load(amplifier, solution.passive)
    current, output = output_side(view, supply, load, working, unknown)
    inputs = inputs_of(view, supply, rails, working, unknown)
    _device_unknown(view, unknown)
    if name in solution.turning.unfollowed:
        unknown["output"] = unknown["current"] = _UNFOLLOWED
    if loop.dc is None or name not in solution.answers.network.outputs:
        unknown["loop"] = Unknown(
            f"the output of {name} is tied to {amplifier.output}, which something else holds",
            "see the finding on it",
        )
    outer = frozenset(a.output for a in solution.amplifiers if a.designator in loop.holds)
    balance = balance_of(view, settings.tolerances, rails)
    topology = topology_of(amplifier, solution.ways, loop, rails, outer)
    corner, corner_ends = high_pass_of(view)
    gains, transfers = gains_of(view), gains_of(view, "A")
    if balance is not None and balance.sense:
        topology = "difference"
    if balance is not None:  # what a finite open-loop gain leaves of the common mode is no gain
        gains = tuple(gain for gain in gains if abs(gain.value) > RESIDUE * balance.gain)
    filtered = filter_of(
        amplifier,
        solution.ways,
        topology,
        _share_at_minus(view),
        _largest(gains),
        solution.spread.shares,
        spread_noise_gain,
    )
    if filtered is not None and filtered.kind == "band-pass" and len(gains) == 1:
        gains = _in_pass_band(gains, filtered, topology, after[view.k])
    heat = heat_of(view, supply, output, current, load, use)
    if heat.bounded:
        unknown.pop("current", None)
    if heat.watts is None and "output" in unknown:
        unknown["dissipation"] = unknown["output"]
    return Stage(
        designator=name,
        schematic=amplifier.schematic,
        device=amplifier.match.name,
        family=device,
        package=amplifier.package,
        topology=topology,
        use=use,
        use_stated=stated is not None,
        supply=supply,
        output=output,
        current=current,
        inputs=inputs,
        loop=loop,
        feedback=feedback,
        dissipation=heat.watts,
        dissipation_worst=heat.worst,
        gain=tuple((gain.net, gain.value) for gain in gains),
        gain_worst=tuple((gain.net, gain.worst) for gain in gains),
        transfer=tuple((gain.net, gain.value) for gain in transfers),
        transfer_worst=tuple((gain.net, gain.worst) for gain in transfers),
        after=after[view.k],
        generic=amplifier.match.sort == "generic",
        ac_coupled=is_ac_coupled(view),
        band=band_of(view),
        high_pass=corner,
        high_pass_worst=corner_ends,
        filter=filtered,
        case=case_of(
            device,
            amplifier.match.channels,
            f"{amplifier.match.name} {amplifier.element.text}",
        ),
        balance=balance,
        unknown=unknown,
        location=amplifier.element.location,
    )


def _largest(gains: Sequence[Gain]) -> tuple[float, Range]:
    """Return the largest magnitude among gains, and its range; zero without any."""
    most = max(gains, key=lambda gain: abs(gain.value), default=None)
    if most is None:
        return 0.0, Range()
    worst = most.worst
    if most.value < 0 and worst.low is not None and worst.high is not None:
        worst = Range(-worst.high, -worst.low)
    return abs(most.value), worst


_THROUGH_DIODES = Unknown(
    "its feedback runs through diodes, which the built-in solver does not follow",
    "--engine ngspice",
)

_UNFOLLOWED = Unknown(
    "it oscillates, and its amplitude is set by something the built-in solver does not follow",
    "--engine ngspice",
)


def _in_pass_band(
    gains: tuple[Gain, ...], filtered: Filter, topology: str, before: tuple[str, ...]
) -> tuple[Gain, ...]:
    """Return the gain of a band-pass from its signal where it is meant to pass, not far below.

    Only of a stage that has the signal at first hand: what stands before has its own gain.
    """
    if before or topology != "multiple-feedback filter":
        return gains
    return (Gain(gains[0].net, filtered.gain, filtered.gain_worst),)


def _holds(view: View, loop: Loop, after: list[tuple[str, ...]]) -> tuple[str, ...]:
    """Return the stages that hold this one's level where its own network does not."""
    passive, amplifier = view.solution.passive, view.amplifier
    branch = passive.network.outputs.get(amplifier.designator, -1)
    if loop.dc != "negative" or branch < 0:
        return ()
    rows = [passive.network.row(amplifier.minus), passive.network.row(amplifier.plus)]
    minus, plus = passive.dc.adjoint(rows)[:, branch].real
    if minus - plus > OPEN_BETA:
        return ()
    names = [a.designator for a in view.solution.amplifiers]
    reached, queue = set(), [view.k]
    while queue:
        for name in after[queue.pop()]:
            if name not in reached:
                reached.add(name)
                queue.append(names.index(name))
    return tuple(n for n in names if n in reached and n != amplifier.designator)


def _share_at_minus(view: View) -> float | None:
    """Return the share of the output that reaches the inverting input at DC."""
    passive, amplifier = view.solution.passive, view.amplifier
    branch = passive.network.outputs.get(amplifier.designator, -1)
    row = passive.network.row(amplifier.minus)
    if branch < 0 or row < 0:
        return None
    return float(passive.dc.adjoint([row])[0, branch].real)


def _supply(view: View, feeds: Mapping[str, Feed], unknown: dict[Part, Unknown]) -> Supply:
    amplifier = view.amplifier
    if not amplifier.has_supply:
        unknown["supply"] = Unknown(
            f"{amplifier.designator} has no supply pins in the netlist",
            "an op-amp card with its supply pins",
        )
        return Supply(pins=False)
    levels: list[float | None] = []
    worst: list[Range] = []
    stated: list[bool] = []
    basis: Basis = "netlist"
    for net, quantity in ((amplifier.positive, "positive"), (amplifier.negative, "negative")):
        feed = feeds.get(net)
        held = net == GROUND or (feed is not None and feed.held)
        level = view.level(quantity) if held else None
        levels.append(level)
        if not held:
            unknown["supply"] = Unknown(
                f"nothing states the level of {net}, the supply of {amplifier.designator}",
                f'[nets] "{net}" = {{ volts = ... }}',
            )
        if feed is not None and feed.basis == "user":
            basis = "user"
        excursion = 0.0
        if level is not None:
            q = view.at(quantity)
            mask = ~view.solution.spread.error
            moves = np.abs(view.solution.spread.high[q]) * view.solution.spread.delta * mask
            excursion = float(moves.sum())
            stated.append(
                bool((moves * view.solution.spread.stated).sum() >= 0.5 * moves.sum() > 0)
            )
        worst.append(Range() if level is None else Range(level - excursion, level + excursion))
    return Supply(
        positive=levels[0],
        negative=levels[1],
        positive_net=amplifier.positive,
        negative_net=amplifier.negative,
        basis=basis,
        positive_worst=worst[0],
        negative_worst=worst[1],
        tolerance_stated=bool(stated) and any(stated),
    )


def _other_inputs(view: View) -> frozenset[str]:
    return frozenset(
        net
        for other in view.solution.amplifiers
        if other is not view.amplifier
        for net in (other.plus, other.minus)
    )


def _device_unknown(view: View, unknown: dict[Part, Unknown]) -> None:
    match = view.amplifier.match
    if match.device is not None:
        return
    if match.sort == "generic":
        why = f"{view.amplifier.designator} is an amplifier without a type ({match.name})"
    else:
        near = f"; the nearest name is {match.nearest}" if match.nearest else ""
        why = f"{match.name} is not in the catalogue{near}"
    unknown["device"] = Unknown(why, "a device name, or [[devices]] with its data-sheet figures")


def unsolved(amplifiers: tuple[Amplifier, ...], why: str, settings: Settings) -> tuple[Stage, ...]:
    """Return stages of a circuit that could not be solved: nothing is known, and why."""
    reason = Unknown(why, "see the finding on it")
    parts: tuple[Part, ...] = ("supply", "output", "current", "input", "bias", "loop")
    stages = []
    for amplifier in amplifiers:
        stated = stated_use(amplifier, settings)
        stages.append(
            Stage(
                designator=amplifier.designator,
                schematic=amplifier.schematic,
                device=amplifier.match.name,
                family=amplifier.match.device,
                package=amplifier.package,
                topology="other",
                use=stated or "linear",
                use_stated=stated is not None,
                output=Output(net=amplifier.output),
                inputs=Inputs(plus=Pin(net=amplifier.plus), minus=Pin(net=amplifier.minus)),
                generic=amplifier.match.sort == "generic",
                unknown=dict.fromkeys(parts, reason),
                location=amplifier.element.location,
            )
        )
    return tuple(stages)
