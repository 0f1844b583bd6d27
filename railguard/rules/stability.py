"""Stability: noise gain, phase margin, capacitive load, transimpedance stages."""

from collections.abc import Iterator

from railguard.analysis.bound import Bound
from railguard.analysis.margins import LEAST_OUTPUT_OHMS
from railguard.analysis.stage import Design, Stage, Unknown
from railguard.rules.compose import breach_finding, missing_figure, open_point, stage_finding
from railguard.rules.finding import Finding
from railguard.rules.protocol import Limit, Limits, Outcome, Rule
from railguard.rules.remedies import LEAST_CAPACITOR, compensation, fit
from railguard.rules.severity import TABLE, Broken, breach, evidence
from railguard.rules.wording import NO_SOURCE, cited, device, listed, origin, sheet
from railguard.units import si
from railguard.words import Basis

_WANTED = Limit(
    name="wanted",
    default=45.0,
    unit="°",
    meaning="phase margin wanted",
    source="Texas Instruments TIDU535 designs for more than 45°",
)

# --- stability-noise-gain


def judge_noise_gain(stage: Stage, limits: Limits, design: Design) -> Iterator[Outcome]:
    """Judge the noise gain where the loop closes against the least the device is stable at."""
    if stage.use != "linear" or stage.loop.dc != "negative":
        return
    gap = _noise_gain_gap(stage)
    yield from open_point("stability-noise-gain", stage, ("loop", "device"), gap)
    closes = stage.loop.noise_gain_crossover
    if stage.family is None or gap is not None or closes is None:
        return
    figure = stage.family.stable_gain
    bound = Bound(
        upper=False,
        demand=closes * (1 + limits["slack"]),
        typical=figure.best,
        typical_basis=figure.best_basis,
    )
    broken = breach(bound)
    if broken is None:
        return
    across = stage.feedback.capacitance
    why = f" The {si(across, 'F')} across the feedback bring it down there." if across else ""
    yield breach_finding(
        "stability-noise-gain",
        stage,
        broken,
        "",
        f"{stage.schematic}'s loop closes at {si(stage.loop.crossover, 'Hz')} with a noise gain of "
        f"{si(closes, '')}; {device(stage)} is stable from {si(broken.limit, '')} "
        f"({origin(broken.limit_basis)}).{why}",
        nets=(stage.output.net,),
        remedy="Fit a device stable at a gain of one, or raise the noise gain with a resistor and "
        f"a capacitor in series between the inputs, {_lead(stage, broken.limit)}.",
        source=sheet(stage, broken),
    )


def _noise_gain_gap(stage: Stage) -> Unknown | None:
    if stage.family is None:
        return None
    if stage.family.stable_gain.best is None:
        return missing_figure(stage, "least stable gain", "stable_gain")
    if stage.loop.noise_gain_crossover is not None:
        return None
    if stage.family.gain_bandwidth.best is None:
        return missing_figure(stage, "gain-bandwidth product", "gain_bandwidth")
    return stage.unknown.get("output", NOT_FOLLOWED)


NOT_FOLLOWED = Unknown("where its loop closes could not be worked out", "--engine ngspice")


def _lead(stage: Stage, wanted: float) -> str:
    """Give the resistor between the inputs that brings the noise gain to what is wanted."""
    resistance, gain = stage.feedback.resistance, stage.loop.noise_gain_crossover
    if not resistance or not gain or gain >= wanted:
        return "small against the feedback resistor"
    return f"{si(fit(resistance / (wanted - gain), 'down'), 'Ω')} or less"


NOISE_GAIN = Rule(
    name="stability-noise-gain",
    family="stability",
    looks_at="stage",
    judges="The noise gain where the loop closes against the least gain the device is stable at.",
    reason="A decompensated device needs attenuation in its feedback at the crossover; a capacitor "
    "across the feedback resistor takes it away just there.",
    source="B. Trump, EDN, Op amps: G=1 stable and decompensated; K. Castor-Perry, Electronic "
    "Design, Minimum stable gain; the device's data sheet",
    silent="Comparators, oscillators, unused channels. Devices whose least stable gain or "
    "gain-bandwidth product is not listed are listed as not checked.",
    limits=(
        Limit(
            name="slack",
            default=0.05,
            unit="",
            meaning="share by which the noise gain may fall short: the figure is coarse",
            source=NO_SOURCE,
        ),
    ),
    judge=judge_noise_gain,
)


# --- stability-phase-margin


def judge_phase_margin(stage: Stage, limits: Limits, design: Design) -> Iterator[Outcome]:
    """Judge the phase margin of a stage's own loop."""
    loop = stage.loop
    if stage.use != "linear" or loop.dc != "negative":
        return
    margin, wanted = _margin(stage, limits["wanted"]), limits["wanted"]
    gap = None
    family = stage.family
    if margin is None and family is not None and loop.crossover is None:
        known = family.gain_bandwidth.best is not None
        gap = stage.unknown.get("output", NOT_FOLLOWED) if known else None
    if margin is None and family is not None and gap is None:
        gap = Unknown(
            f"what {device(stage)} does to the phase here is not listed: gain-bandwidth product, "
            "output resistance or input capacitance",
            "add output_resistance and input_capacitance to a [[devices]] table",
        )
    yield from open_point("stability-phase-margin", stage, ("loop", "device"), gap)
    if margin is None:
        return
    if loop.phase_margin is None and loop.least_ohms is not None and margin < wanted:
        yield _charged(stage, margin, limits)
        return
    low = loop.phase_margin_worst.low
    at_corner = low is not None and low < limits["least"] <= margin
    if margin >= wanted and not at_corner:
        return
    bases = _bases(stage)
    row: Broken = "reserve"
    if margin <= 0:
        row = "typical"
    elif margin < limits["least"]:
        row = "guaranteed"
    elif at_corner:
        row = "default-corner"
    held = low if at_corner and low is not None else margin
    does = _does(held, limits["least"])
    load = stage.current.load_capacitance
    with_load = f" with {si(load, 'F')} at its output" if load else ""
    then = f", {si(low, '°')} at a corner of the tolerances" if at_corner else ""
    yield stage_finding(
        "stability-phase-margin",
        stage,
        TABLE[row][evidence(*bases)],
        f"{stage.schematic}'s loop closes at {si(loop.crossover, 'Hz')} with a phase margin of "
        f"{si(margin, '°')}{with_load}{then}, so it {does}{' there' if at_corner else ''}; "
        f"{si(wanted, '°')} is wanted.",
        nets=(stage.output.net,),
        demand=wanted,
        limit=held,
        margin=held - wanted,
        unit="°",
        basis=("netlist", *bases),
        remedy=_phase_remedy(stage),
        source="Texas Instruments TIDU535 designs for more than 45°; "
        f"{cited(stage, bases[0] if bases else 'practice')}",
        corner="worst-case" if at_corner else "nominal",
    )


def _charged(stage: Stage, most: float, limits: Limits) -> Finding:
    """Tell of a capacitor at an output whose resistance is not listed, but never so small.

    It is major: what outputs usually have is six times as much, and leaves half as much margin.

    most  phase margin with the least output resistance, degrees
    """
    ohms, wanted = stage.loop.least_ohms, limits["wanted"]
    least = "by common practice"
    if ohms is not None and ohms < LEAST_OUTPUT_OHMS:
        least = "which emitters make at its supply current"
    return stage_finding(
        "stability-phase-margin",
        stage,
        TABLE["typical"]["memory"],
        f"{stage.schematic} drives {si(stage.current.load_capacitance, 'F')} straight from its "
        f"output. The output resistance of {device(stage)} is not listed; with the least it may "
        f"have, {si(ohms, 'Ω')} {least}, its loop keeps a phase margin of {si(most, '°')}, so it "
        f"{_does(most, limits['least'])}; {si(wanted, '°')} is wanted.",
        nets=(stage.output.net,),
        demand=wanted,
        limit=most,
        margin=most - wanted,
        unit="°",
        basis=("netlist", *dict.fromkeys((*_bases(stage), "practice"))),
        remedy=_phase_remedy(stage),
        source="Texas Instruments TIDU535 designs for more than 45°; least output resistance: "
        f"{NO_SOURCE}",
    )


def _does(margin: float, least: float) -> str:
    """Say what a loop with some phase margin does."""
    return "oscillates" if margin <= 0 else "rings" if margin >= least else "rings long"


def _margin(stage: Stage, wanted: float) -> float | None:
    """Return the phase margin, or what bounds it where not all is listed; None: not decided.

    Where even the most of what is not listed leaves enough, and where nothing of it leaves too
    little, the question is settled.
    """
    loop = stage.loop
    if loop.phase_margin is not None:
        return loop.phase_margin
    least, most = loop.margins.low, loop.margins.high
    if least is not None and least >= wanted:
        return least
    return most if most is not None and most < wanted else None


def _bases(stage: Stage) -> tuple[Basis, ...]:
    """Return where the figures that make the phase margin came from."""
    family = stage.family
    if family is None:
        return ("practice",)
    figures = (family.gain_bandwidth, family.output_resistance, family.input_capacitance)
    return tuple(dict.fromkeys(f.best_basis for f in figures if f.best is not None))


ISOLATION = 47.0
"""Ohm; data sheets draw 20 to 100 ohms before a capacitive load."""


def _phase_remedy(stage: Stage) -> str:
    if stage.current.load_capacitance:
        return (
            f"Fit {si(ISOLATION, 'Ω')} between the output of {stage.schematic} and the capacitance "
            "it drives, outside the feedback."
        )
    wanted = across_feedback(stage)
    if wanted is not None and stage.feedback.elements:
        return f"Fit {si(wanted, 'F')} across {listed(stage.feedback.elements)}."
    return "Lower the resistors of the feedback network, or fit a capacitor across the feedback."


def across_feedback(stage: Stage, farads: float | None = None) -> float | None:
    """Return the capacitor across the feedback that leaves about 65 degrees, F.

    farads  at the inverting input; None: what the data sheet lists
    """
    listed = None if stage.family is None else stage.family.input_capacitance.best
    wanted = compensation(stage, farads or listed)
    return None if wanted is None else fit(max(wanted, LEAST_CAPACITOR), "up")


PHASE_MARGIN = Rule(
    name="stability-phase-margin",
    family="stability",
    looks_at="stage",
    judges="The phase margin of a stage's own loop, with what is listed of output resistance, "
    "input and load capacitance.",
    reason="The less margin, the longer a step rings; at none the stage oscillates.",
    source="Texas Instruments TIDU535; S. Franco, Design with Operational Amplifiers, 3rd ed., "
    "ch. 8",
    silent="Comparators, oscillators, unused channels. What tolerances leave between the least and "
    "the wanted margin: that is what the reserve is for. Where a figure that matters is not listed "
    "the margin is not known and listed as not checked, unless a capacitor stands straight at the "
    "output and even 10 Ω of output resistance leave too little.",
    limits=(
        _WANTED,
        Limit(
            name="least",
            default=20.0,
            unit="°",
            meaning="phase margin below which it counts like a guaranteed limit, and which "
            "tolerances may not reach either",
            source=NO_SOURCE,
        ),
    ),
    judge=judge_phase_margin,
)


# --- stability-load-capacitance


def judge_load(stage: Stage, limits: Limits, design: Design) -> Iterator[Outcome]:
    """Judge the capacitance straight at an output where its phase margin is not known."""
    load, family = stage.current.load_capacitance, stage.family
    if (
        stage.use in ("unused", "comparator")
        or not load
        or _margin(stage, limits["wanted"]) is not None
    ):
        return
    yield from open_point("stability-load-capacitance", stage, ("device",))
    figure = None if family is None else family.load_capacitance
    stated = None if figure is None else figure.best
    # Attenuation in the feedback makes room: the load counts divided by the noise gain.
    gain = max(stage.loop.noise_gain_crossover or stage.loop.noise_gain_dc or 1.0, 1.0)
    limit = (stated or limits["usual"]) * gain
    if load <= limit:
        return
    basis: Basis = "practice" if figure is None or stated is None else figure.best_basis
    yield stage_finding(
        "stability-load-capacitance",
        stage,
        TABLE["guaranteed"][evidence(basis)],
        f"{stage.schematic} drives {si(load, 'F')} straight from its output; {device(stage)} at a "
        f"noise gain of {si(gain, '')} is known to stand {si(limit, 'F')} ({origin(basis)}).",
        nets=(stage.output.net,),
        demand=load,
        limit=limit,
        margin=limit - load,
        unit="F",
        basis=("netlist", basis),
        remedy=f"Fit {si(ISOLATION, 'Ω')} between the output of {stage.schematic} and the "
        "capacitance, outside the feedback.",
        source="Microchip MCP6401 DS22229D, capacitive loads; Texas Instruments TLV2464 SGLS008G",
    )


LOAD_CAPACITANCE = Rule(
    name="stability-load-capacitance",
    family="stability",
    looks_at="stage",
    judges="The capacitance straight at an output against what the device stands, times its noise "
    "gain.",
    reason="Output resistance and load capacitance are a pole inside the loop.",
    source="Microchip MCP6401 DS22229D; Texas Instruments TLV2464 SGLS008G",
    silent="Where the phase margin is known: stability-phase-margin judges that. Capacitance "
    "behind a resistor.",
    limits=(
        _WANTED,
        Limit(
            name="usual",
            default=100e-12,
            unit="F",
            meaning="what a device stands whose data sheet lists nothing",
            source="Microchip MCP6401 DS22229D draws a series resistor from 100 pF on",
        ),
    ),
    judge=judge_load,
)


# --- stability-transimpedance


def judge_transimpedance(stage: Stage, limits: Limits, design: Design) -> Iterator[Outcome]:
    """Judge whether a transimpedance stage has a capacitor across its feedback."""
    if stage.topology != "transimpedance" or stage.use != "linear":
        return
    if stage.feedback.capacitance or not stage.feedback.resistance:
        return
    if _margin(stage, limits["wanted"]) is not None:
        return
    if stage.feedback.resistance < limits["resistance"]:
        return
    wanted = across_feedback(stage, limits["capacitance"])
    fitting = f"Fit {si(wanted, 'F')}" if wanted is not None else "Fit a few picofarads"
    yield stage_finding(
        "stability-transimpedance",
        stage,
        "minor",
        f"{stage.schematic} turns a current into a voltage over "
        f"{si(stage.feedback.resistance, 'Ω')} and has no capacitor across it: with the "
        "capacitance of the source and the input its loop closes with little phase left.",
        nets=(stage.inputs.minus.net,),
        demand=stage.feedback.resistance,
        limit=limits["resistance"],
        margin=limits["resistance"] - stage.feedback.resistance,
        unit="Ω",
        basis=("netlist", "practice"),
        remedy=f"{fitting} across {listed(stage.feedback.elements) or 'the feedback resistor'}.",
        source="Texas Instruments OPA607 SBOS981J, transimpedance design",
    )


TRANSIMPEDANCE = Rule(
    name="stability-transimpedance",
    family="stability",
    looks_at="stage",
    judges="Whether a transimpedance stage has a capacitor across its feedback resistor.",
    reason="The source's capacitance and the feedback resistor are a pole inside the loop.",
    source="Texas Instruments OPA607 SBOS981J; S. Franco, Design with Operational Amplifiers, 3rd "
    "ed., ch. 8",
    silent="Where the phase margin is known: stability-phase-margin judges that.",
    limits=(
        _WANTED,
        Limit(
            name="resistance",
            default=10e3,
            unit="Ω",
            meaning="feedback resistance from which a capacitor is wanted",
            source=NO_SOURCE,
        ),
        Limit(
            name="capacitance",
            default=20e-12,
            unit="F",
            meaning="source and input capacitance taken for the capacitor proposed",
            source="Texas Instruments OPA607 SBOS981J works with 20 pF",
        ),
    ),
    judge=judge_transimpedance,
)

RULES = (NOISE_GAIN, PHASE_MARGIN, LOAD_CAPACITANCE, TRANSIMPEDANCE)
