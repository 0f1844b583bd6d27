"""The level at the inputs, and the error that bias current makes of source resistance."""

from collections.abc import Iterator

from railguard.analysis.stage import Design, Stage
from railguard.rules.compose import stage_finding
from railguard.rules.inputs import LEAST_UNEQUAL, bias_current, output_span
from railguard.rules.protocol import Limit, Limits, Outcome, Rule
from railguard.rules.remedies import fit
from railguard.rules.severity import TABLE, Broken, evidence
from railguard.rules.wording import NO_SOURCE, cited, device, listed
from railguard.rules.working import standstill
from railguard.units import percent, si

# --- bias-level


def judge_level(stage: Stage, limits: Limits, design: Design) -> Iterator[Outcome]:
    """Judge whether a stage that only takes AC signals rests near the middle of its range."""
    reach, level = stage.output.available, stage.output.level
    if stage.use != "linear" or not stage.ac_coupled or standstill(stage):
        return
    if level is None or reach.low is None or reach.high is None or not reach.span:
        return
    room = min(reach.high - level, level - reach.low)
    wanted = limits["share"] * reach.span
    demand = stage.output.demand.span
    if room < 0 or room >= wanted or (demand and demand / 2 <= room):
        return  # beyond the range headroom-output speaks; and a signal that fits is no trouble
    middle = (reach.high + reach.low) / 2
    yield stage_finding(
        "bias-level",
        stage,
        "minor",
        f"{stage.schematic} takes its signal through a capacitor and rests at {si(level, 'V')}, "
        f"{si(room, 'V')} from the end of its range ({si(reach.low, 'V')} to "
        f"{si(reach.high, 'V')}): it clips a signal of more than {si(room, 'V')} peak.",
        nets=(stage.inputs.plus.net,),
        demand=wanted,
        limit=room,
        margin=room - wanted,
        unit="V",
        basis=("netlist", stage.output.high.typical_basis, "practice"),
        remedy=f"Bias it so that its output rests at {si(middle, 'V')}.",
        source="Analog Devices AN-581",
    )


LEVEL = Rule(
    name="bias-level",
    family="bias",
    looks_at="stage",
    judges="Whether a stage that takes its signal through capacitors rests well within its output "
    "range.",
    reason="An AC signal swings both ways round the bias level, so the nearer end clips first.",
    source="Analog Devices AN-581",
    silent="DC-coupled stages; stages whose stated signal fits; levels beyond the range, which "
    "headroom-output judges.",
    limits=(
        Limit(
            name="share",
            default=0.1,
            unit="",
            meaning="share of the output's range to be left on either side of the level",
            source=NO_SOURCE,
        ),
    ),
    judge=judge_level,
)


# --- bias-current-error


def judge_current(stage: Stage, limits: Limits, design: Design) -> Iterator[Outcome]:
    """Judge the output error that bias current makes of the source's resistance."""
    gain = stage.loop.noise_gain_dc
    if stage.use != "linear" or standstill(stage) or not gain:
        return
    current, (span, span_basis) = bias_current(stage, design), output_span(stage)
    ohms = stage.inputs.plus.resistance
    if current is None or not ohms or not span:
        return
    unequal = ohms - (stage.inputs.minus.resistance or 0.0)
    error = current.amps * unequal * gain
    offset = (stage.family.offset_voltage.best if stage.family else None) or 0.0
    allowed = max(limits["share"] * span, offset * gain)
    far = error > limits["far-share"] * span
    if error <= allowed or (unequal <= limits["least"] and not far):
        return
    row: Broken = "typical" if far else "reserve"
    bases = (span_basis, current.basis)
    of = "what it is asked for" if span_basis != "assumed" else "its supply"
    of = "what it reaches" if stage.ac_coupled and stage.output.available.span else of
    through = f" ({listed(stage.inputs.plus.path[:3])})" if stage.inputs.plus.path else ""
    yield stage_finding(
        "bias-current-error",
        stage,
        TABLE[row][evidence(*bases)],
        f"{stage.schematic}'s bias current of {si(current.amps, 'A')} ({current.note}) through "
        f"{si(ohms, 'Ω')} at its non-inverting input{through} moves the output by "
        f"{si(error, 'V')}, {percent(error / span)} of {of}; {si(allowed, 'V')} is allowed.",
        nets=(stage.inputs.plus.net,),
        demand=error,
        limit=allowed,
        margin=allowed - error,
        unit="V",
        basis=bases,
        remedy=f"Bring the resistance at net {stage.inputs.plus.net} down to "
        f"{si(fit(ohms * allowed / error, 'down'), 'Ω')}, or fit a device of less bias current "
        f"than {device(stage)}.",
        source="S. Franco, Design with Operational Amplifiers, 3rd ed., ch. 5; "
        f"{cited(stage, current.basis)}",
    )


CURRENT_ERROR = Rule(
    name="bias-current-error",
    family="bias",
    looks_at="stage",
    judges="The output error from bias current through the resistance at the non-inverting input, "
    "less what an equal resistance at the other undoes, at the hottest ambient.",
    reason="Bias current times resistance is an offset; FET inputs double it every 10 °C.",
    source="S. Franco, Design with Operational Amplifiers, 3rd ed., ch. 5",
    silent="Devices whose bias current is not listed; errors below the device's own offset. "
    "Resistance at the inverting input is feedback-high's.",
    limits=(
        LEAST_UNEQUAL,
        Limit(
            name="share",
            default=0.01,
            unit="",
            meaning="share of the output span the error may take",
            source=NO_SOURCE,
        ),
        Limit(
            name="far-share",
            default=0.10,
            unit="",
            meaning="share beyond which it counts like a typical limit",
            source=NO_SOURCE,
        ),
    ),
    judge=judge_current,
)

RULES = (LEVEL, CURRENT_ERROR)
