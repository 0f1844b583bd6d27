"""What hangs on a loop: capacitance at an output, a current source at an inverting input."""

from collections.abc import Iterator

from railguard.analysis.stage import Design, Stage
from railguard.rules.compose import open_point, stage_finding
from railguard.rules.protocol import Limit, Limits, Outcome, Rule
from railguard.rules.severity import TABLE, evidence
from railguard.rules.stability.margin import ISOLATION, WANTED, across_feedback, margin_of
from railguard.rules.wording import NO_SOURCE, device, listed, origin
from railguard.units import si
from railguard.words import Basis

# --- stability-load-capacitance


def judge_load(stage: Stage, limits: Limits, design: Design) -> Iterator[Outcome]:
    """Judge the capacitance straight at an output where its phase margin is not known."""
    load, family = stage.current.load_capacitance, stage.family
    if (
        stage.use in ("unused", "comparator")
        or not load
        or margin_of(stage, limits["wanted"]) is not None
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
        WANTED,
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
    if margin_of(stage, limits["wanted"]) is not None:
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
        WANTED,
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

RULES = (LOAD_CAPACITANCE, TRANSIMPEDANCE)
