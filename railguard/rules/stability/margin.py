"""The phase margin of a loop."""

from collections.abc import Iterator

from railguard.analysis.margins import LEAST_OUTPUT_OHMS
from railguard.analysis.stage import Design, Stage, Unknown
from railguard.rules.compose import open_point, stage_finding
from railguard.rules.finding import Finding
from railguard.rules.protocol import Limit, Limits, Outcome, Rule
from railguard.rules.remedies import LEAST_CAPACITOR, compensation, fit
from railguard.rules.severity import TABLE, Broken, evidence
from railguard.rules.stability.logarithmic import amplifying, emitter_remedy
from railguard.rules.stability.noise_gain import NOT_FOLLOWED
from railguard.rules.wording import NO_SOURCE, cited, device, listed
from railguard.units import si
from railguard.words import Basis

WANTED = Limit(
    name="wanted",
    default=45.0,
    unit="°",
    meaning="phase margin wanted",
    source="Texas Instruments TIDU535 designs for more than 45°",
)


def judge_phase_margin(stage: Stage, limits: Limits, design: Design) -> Iterator[Outcome]:
    """Judge the phase margin of a stage's own loop."""
    loop = stage.loop
    if stage.use != "linear" or loop.dc != "negative":
        return
    margin, wanted = margin_of(stage, limits["wanted"]), limits["wanted"]
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
        yield _charged(stage, margin, limits, design)
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
        remedy=_phase_remedy(stage, design),
        source="Texas Instruments TIDU535 designs for more than 45°; "
        f"{cited(stage, bases[0] if bases else 'practice')}",
        corner="worst-case" if at_corner else "nominal",
    )


def _charged(stage: Stage, most: float, limits: Limits, design: Design) -> Finding:
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
        remedy=_phase_remedy(stage, design),
        source="Texas Instruments TIDU535 designs for more than 45°; least output resistance: "
        f"{NO_SOURCE}",
    )


def _does(margin: float, least: float) -> str:
    """Say what a loop with some phase margin does."""
    return "oscillates" if margin <= 0 else "rings" if margin >= least else "rings long"


def margin_of(stage: Stage, wanted: float) -> float | None:
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


def _phase_remedy(stage: Stage, design: Design) -> str:
    transistor = amplifying(stage, design)
    if transistor is not None:
        return emitter_remedy(transistor, stage)
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
        WANTED,
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

RULES = (PHASE_MARGIN,)
