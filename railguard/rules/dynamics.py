"""Dynamics: whether a stage is fast enough for the signals that reach it."""

import math
from collections.abc import Iterator

from railguard.analysis.bound import Bound
from railguard.analysis.stage import Design, Stage
from railguard.rules.compose import breach_finding, missing_figure, open_point, stage_finding
from railguard.rules.protocol import Limit, Limits, Outcome, Rule
from railguard.rules.relations import in_ring
from railguard.rules.severity import TABLE, Broken, breach, evidence
from railguard.rules.wording import NO_SOURCE, device, limit_note, origin, sheet
from railguard.units import percent, si
from railguard.words import Basis

# --- dynamics-loop-gain


def judge_loop_gain(stage: Stage, limits: Limits, design: Design) -> Iterator[Outcome]:
    """Judge the loop gain left at the top of the band."""
    loop = stage.loop
    if stage.use != "linear" or loop.dc != "negative" or not loop.band:
        return
    figure = None if stage.family is None else stage.family.gain_bandwidth
    gap = None
    if loop.loop_gain is None and stage.family is not None:
        gap = missing_figure(stage, "gain-bandwidth product", "gain_bandwidth")
    yield from open_point("dynamics-loop-gain", stage, ("loop", "device"), gap)
    left = loop.loop_gain
    if left is None or figure is None or left >= limits["wanted"]:
        return
    basis = figure.typical_basis if figure.typical is not None else figure.guaranteed_basis
    row: Broken = "typical" if left < 1 else "reserve"
    short = 1 - 1 / math.sqrt(1 + 1 / left**2) if left > 0 else 1.0
    needed = (loop.noise_gain or 1.0) * loop.band * limits["wanted"]
    yield stage_finding(
        "dynamics-loop-gain",
        stage,
        TABLE[row][evidence(basis)],
        f"At {si(loop.band, 'Hz')} {stage.schematic} has a loop gain of {si(left, '')} left "
        f"({device(stage)} with {si(figure.best, 'Hz')}, {origin(basis)}, at a noise gain of "
        f"{si(loop.noise_gain, '')}): its gain falls short by {percent(short)}. "
        f"{si(limits['wanted'], '')} is wanted.",
        nets=(stage.output.net,),
        demand=limits["wanted"],
        limit=left,
        margin=left - limits["wanted"],
        basis=("netlist", basis),
        remedy=f"Fit a device of {si(needed, 'Hz')} gain-bandwidth product, or share the gain "
        "between two stages.",
        source="S. Franco, Design with Operational Amplifiers, 3rd ed., ch. 6: the error is about "
        "1 / 2T²",
    )


LOOP_GAIN = Rule(
    name="dynamics-loop-gain",
    family="dynamics",
    looks_at="stage",
    judges="The loop gain at the top of the stated band.",
    reason="Closed-loop accuracy lives on loop gain: at a loop gain of one the gain is down by "
    "3 dB.",
    source="S. Franco, Design with Operational Amplifiers, 3rd ed., ch. 6",
    silent="Where no band is stated; devices whose gain-bandwidth product is not listed are listed "
    "as not checked.",
    limits=(
        Limit(
            name="wanted",
            default=7.0,
            unit="",
            meaning="loop gain wanted at the top of the band; seven leaves an error of 1 %",
            source="derived: 1 / 2T²",
        ),
    ),
    judge=judge_loop_gain,
)


# --- dynamics-slew


def judge_slew(stage: Stage, limits: Limits, design: Design) -> Iterator[Outcome]:
    """Judge the steepest slope asked of an output against the slew rate."""
    slew, family = stage.output.slew, stage.family
    if stage.use != "linear" or not slew:
        return
    gap = None
    if family is not None and family.slew_rate.best is None:
        gap = missing_figure(stage, "slew rate", "slew_rate")
    yield from open_point("dynamics-slew", stage, ("output", "device"), gap)
    if family is None or gap is not None:
        return
    figure = family.slew_rate
    bound = Bound(
        upper=True,
        demand=slew,
        typical=figure.typical,
        guaranteed=figure.guaranteed,
        typical_basis=figure.typical_basis,
        guaranteed_basis=figure.guaranteed_basis,
        demand_basis=stage.output.high.demand_basis,
    )
    broken = breach(bound, (limits["factor"] - 1) * slew)
    if broken is None:
        return
    at = f" at {si(stage.output.frequency, 'Hz')}" if stage.output.frequency else ""
    kind = "typical" if broken.broken == "typical" or figure.guaranteed is None else "guaranteed"
    note = limit_note(kind, broken.limit_basis, figure.condition)
    tail = (
        f"so a sine of that size needs {si(slew / broken.limit, '')} times what it has"
        if broken.margin < 0
        else f"{si(limits['factor'], '')} times the slope is wanted"
    )
    yield breach_finding(
        "dynamics-slew",
        stage,
        broken,
        "V/s",
        f"{stage.schematic}'s output must move at {si(slew, 'V/s')}{at}; {device(stage)} slews at "
        f"{si(broken.limit, 'V/s')} {note}, {tail}.",
        nets=(stage.output.net,),
        remedy=f"Fit a device of at least {si(limits['factor'] * slew, 'V/s')}, or lower the "
        f"amplitude or the band to {percent(min(broken.limit / (limits['factor'] * slew), 1.0))} "
        "of what it is.",
        source=sheet(stage, broken),
    )


SLEW = Rule(
    name="dynamics-slew",
    family="dynamics",
    looks_at="stage",
    judges="The steepest slope asked of an output against the device's slew rate.",
    reason="A sine of amplitude V at f has a slope of 2πfV; beyond the slew rate it turns into a "
    "triangle.",
    source="the device's data sheet; full-power bandwidth SR / 2πV",
    silent="Stages without a stated AC signal. Devices whose slew rate is not listed are listed as "
    "not checked.",
    limits=(
        Limit(
            name="factor",
            default=1.5,
            unit="",
            meaning="slew rate wanted, as a multiple of the slope demanded",
            source="from memory: a margin of 2 to 5 is often asked for",
        ),
    ),
    judge=judge_slew,
)


# --- dynamics-coupling


def judge_coupling(stage: Stage, limits: Limits, design: Design) -> Iterator[Outcome]:
    """Judge the corner of the coupling capacitors against the bottom of the band."""
    corner, bottom = stage.high_pass, stage.band.low
    if stage.use != "linear" or not corner or not bottom:
        return
    if stage.filter is not None or in_ring(stage, design):
        return  # a filter's own corner is meant
    allowed = limits["share"] * bottom
    if corner <= allowed:
        return
    loss = 10 * math.log10(1 + (corner / bottom) ** 2)
    basis: Basis = stage.output.high.demand_basis
    yield stage_finding(
        "dynamics-coupling",
        stage,
        "minor" if corner > bottom else "remark",
        f"The coupling capacitors on the way to {stage.schematic} give a corner at "
        f"{si(corner, 'Hz')}; at {si(bottom, 'Hz')}, the bottom of the stated band, "
        f"{si(loss, 'dB')} are lost.",
        nets=(stage.output.net,),
        demand=corner,
        limit=allowed,
        margin=allowed - corner,
        unit="Hz",
        basis=(basis, "practice"),
        remedy=f"Fit coupling capacitors {si(corner / allowed, '')} times as large, or as much "
        "more resistance behind them.",
        source=NO_SOURCE,
    )


COUPLING = Rule(
    name="dynamics-coupling",
    family="dynamics",
    looks_at="stage",
    judges="The corner coupling capacitors give against the bottom of the stated band.",
    reason="At its corner a coupling takes 3 dB, and the corners of several stages add up.",
    source=NO_SOURCE,
    silent="Signals whose band begins at DC or is not stated; filter stages and stages in a ring, "
    "whose corner is meant.",
    limits=(
        Limit(
            name="share",
            default=0.5,
            unit="",
            meaning="share of the band's lowest frequency the corner may reach: 1 dB",
            source=NO_SOURCE,
        ),
    ),
    judge=judge_coupling,
)

# --- dynamics-filter


def judge_filter(stage: Stage, limits: Limits, design: Design) -> Iterator[Outcome]:
    """Judge the gain-bandwidth product against what a filter stage needs."""
    filtered, family = stage.filter, stage.family
    if filtered is None or stage.use != "linear":
        return
    gap = None
    if family is not None and family.gain_bandwidth.best is None:
        gap = missing_figure(stage, "gain-bandwidth product", "gain_bandwidth")
    yield from open_point("dynamics-filter", stage, ("device",), gap)
    if family is None or family.gain_bandwidth.best is None:
        return
    figure, product = family.gain_bandwidth, family.gain_bandwidth.best
    # With feedback from both sides the poles of a band-pass move by Q f / GBW, whatever its gain.
    gain = 1.0 if _is_two_sided(stage) else max(abs(filtered.gain), 1.0)
    needed = limits["factor"] * gain * max(filtered.q, 1.0)
    needed *= filtered.frequency
    if product >= needed:
        return
    basis = figure.best_basis
    row: Broken = "guaranteed" if product < limits["far-share"] * needed else "reserve"
    yield stage_finding(
        "dynamics-filter",
        stage,
        TABLE[row][evidence(basis)],
        f"{stage.schematic} is a {filtered.kind} at {si(filtered.frequency, 'Hz')} with a Q of "
        f"{si(filtered.q, '')} and a gain of {si(filtered.gain, '')}, which wants a gain-bandwidth "
        f"product of {si(needed, 'Hz')}; {device(stage)} has {si(product, 'Hz')} "
        f"({origin(basis)}), so frequency and Q come out lower than drawn.",
        nets=(stage.output.net,),
        demand=needed,
        limit=product,
        margin=product - needed,
        unit="Hz",
        basis=("netlist", basis),
        remedy=f"Fit a device of {si(needed, 'Hz')}, or share Q and gain among more stages.",
        source="S. Franco, Design with Operational Amplifiers, 3rd ed., ex. 6.12 for the "
        "band-pass; Op Amps for Everyone, ch. 16, from memory",
    )


def _is_two_sided(stage: Stage) -> bool:
    """Tell whether a stage is a multiple-feedback band-pass."""
    kind = stage.filter.kind if stage.filter is not None else ""
    return kind == "band-pass" and stage.topology == "multiple-feedback filter"


FILTER = Rule(
    name="dynamics-filter",
    family="dynamics",
    looks_at="stage",
    judges="The gain-bandwidth product of a second-order filter stage against its frequency, Q and "
    "gain.",
    reason="A filter's poles are where the drawing says only with loop gain to spare at its "
    "frequency, and the more the higher its Q.",
    source="S. Franco, Design with Operational Amplifiers, 3rd ed., ch. 6; Op Amps for Everyone, "
    "ch. 16, from memory",
    silent="Stages that are no Sallen-Key or multiple-feedback filter. Devices whose "
    "gain-bandwidth product is not listed are listed as not checked.",
    limits=(
        Limit(
            name="factor",
            default=100.0,
            unit="",
            meaning="gain-bandwidth product wanted, as a multiple of frequency times Q times gain",
            source="Op Amps for Everyone, ch. 16, from memory; 200 for a band-pass within 1 %: "
            "S. Franco, ex. 6.12",
        ),
        Limit(
            name="far-share",
            default=0.1,
            unit="",
            meaning="share of that below which it counts like a guaranteed limit",
            source=NO_SOURCE,
        ),
    ),
    judge=judge_filter,
)

RULES = (LOOP_GAIN, SLEW, COUPLING, FILTER)
