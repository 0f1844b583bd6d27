"""The noise gain where a loop closes."""

from collections.abc import Iterator

from railguard.analysis.bound import Bound
from railguard.analysis.stage import Design, Stage, Unknown
from railguard.rules.compose import breach_finding, missing_figure, open_point
from railguard.rules.protocol import Limit, Limits, Outcome, Rule
from railguard.rules.remedies import fit
from railguard.rules.severity import breach
from railguard.rules.stability.logarithmic import amplifying, emitter_remedy
from railguard.rules.wording import NO_SOURCE, device, origin, sheet
from railguard.units import si


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
    transistor = amplifying(stage, design)
    across = stage.feedback.capacitance
    why = f" The {si(across, 'F')} across the feedback bring it down there." if across else ""
    remedy = (
        "Fit a device stable at a gain of one, or raise the noise gain with a resistor and a "
        f"capacitor in series between the inputs, {_lead(stage, broken.limit)}."
    )
    if transistor is not None:
        # Resistor and capacitor between the inputs would slow it down at every current.
        why = f" {transistor.transistor} in its feedback amplifies there."
        remedy = "Fit a device stable at a gain of one."
        if broken.limit <= 1.0:
            remedy = emitter_remedy(transistor, stage)
    yield breach_finding(
        "stability-noise-gain",
        stage,
        broken,
        "",
        f"{stage.schematic}'s loop closes at {si(stage.loop.crossover, 'Hz')} with a noise gain of "
        f"{si(closes, '')}; {device(stage)} is stable from {si(broken.limit, '')} "
        f"({origin(broken.limit_basis)}).{why}",
        nets=(stage.output.net,),
        remedy=remedy,
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

RULES = (NOISE_GAIN,)
