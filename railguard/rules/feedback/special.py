"""Feedback of current-feedback devices, and the matching of difference amplifiers."""

from collections.abc import Iterator

from railguard.analysis.stage import Design, Stage
from railguard.devices.model import Figure
from railguard.rules.compose import missing_figure, open_point, stage_finding
from railguard.rules.protocol import Limit, Limits, Outcome, Rule
from railguard.rules.severity import ROUNDING, TABLE, evidence
from railguard.rules.wording import NO_SOURCE, cited, device, listed
from railguard.units import percent, si
from railguard.words import Severity

# --- feedback-current-type


def judge_current_type(stage: Stage, limits: Limits, design: Design) -> Iterator[Outcome]:
    """Judge the feedback resistor of a current-feedback device against the one its sheet states."""
    family = stage.family
    if family is None or family.feedback != "current" or stage.use != "linear":
        return
    if stage.feedback.resistance is None:
        return  # open at DC: feedback-open speaks
    figure = family.feedback_resistor
    stated = figure.best
    if stage.feedback.capacitance:
        yield _finding(
            stage,
            f"a capacitor of {si(stage.feedback.capacitance, 'F')} stands across its feedback: "
            "with current feedback it closes the loop at any frequency and the stage oscillates",
            figure,
            "Take the capacitor out; filter elsewhere.",
        )
        return
    gap = None if stated is not None else missing_figure(
        stage, "stated feedback resistor", "feedback_resistor"
    )  # fmt: skip
    yield from open_point("feedback-current-type", stage, (), gap)
    if stated is None:
        return
    ohms = stage.feedback.resistance
    fitted = f"{si(ohms, 'Ω')} of feedback" if ohms else "a wire for its feedback"
    fit = f"Fit {si(stated, 'Ω')} from the output to the inverting input."
    if ohms < limits["low-share"] * stated * (1 - ROUNDING):
        yield _finding(
            stage,
            f"{device(stage)} with current feedback asks for {si(stated, 'Ω')} and has {fitted}: "
            "its bandwidth runs away and it rings or oscillates",
            figure,
            fit,
        )
    elif ohms > limits["high-share"] * stated:
        yield _finding(
            stage,
            f"{device(stage)} with current feedback asks for {si(stated, 'Ω')} and has {fitted}: "
            f"its bandwidth falls to about {percent(stated / ohms)}",
            figure,
            fit,
            severity="remark",
        )


def _finding(
    stage: Stage, what: str, figure: Figure, remedy: str, severity: Severity | None = None
) -> Outcome:
    basis = figure.best_basis
    return stage_finding(
        "feedback-current-type",
        stage,
        severity or TABLE["typical"][evidence(basis)],
        f"{stage.schematic}: {what}.",
        nets=(stage.inputs.minus.net,),
        demand=stage.feedback.resistance,
        limit=figure.best,
        margin=None if figure.best is None else (stage.feedback.resistance or 0.0) - figure.best,
        unit="Ω",
        basis=("netlist", basis),
        remedy=remedy,
        source=f"Texas Instruments OPA681 data sheet, feedback resistor; {cited(stage, basis)}",
    )


CURRENT_TYPE = Rule(
    name="feedback-current-type",
    family="feedback",
    looks_at="stage",
    judges="The feedback resistor of a current-feedback device against the one its data sheet "
    "states, and that no capacitor stands across it.",
    reason="With current feedback the resistor alone sets the loop gain: too small a one, or a "
    "capacitor, and the loop closes beyond the device's second pole.",
    source="Texas Instruments OPA681 data sheet; the ban on wires and capacitors from memory",
    silent="Devices with voltage feedback.",
    limits=(
        Limit(
            name="low-share",
            default=0.7,
            unit="",
            meaning="share of the stated resistor below which the loop is too fast",
            source=NO_SOURCE,
        ),
        Limit(
            name="high-share",
            default=2.0,
            unit="",
            meaning="multiple of the stated resistor above which much bandwidth is lost",
            source=NO_SOURCE,
        ),
    ),
    judge=judge_current_type,
)


# --- feedback-matching

DEFAULT_TOLERANCE = 0.01
"""Share; what resistors are taken to be where nothing is stated."""


def judge_matching(stage: Stage, limits: Limits, design: Design) -> Iterator[Outcome]:
    """Judge the common-mode error a difference amplifier's resistor tolerance allows."""
    if stage.topology != "difference" or stage.use != "linear" or stage.loop.dc != "negative":
        return
    gains = [gain for _, gain in stage.gain]
    if len(gains) != 2 or gains[0] * gains[1] >= 0:
        return
    gain = max(abs(g) for g in gains)
    mismatch = abs(gains[0] + gains[1]) / gain
    stated = design.settings.tolerances.resistor
    tolerance = DEFAULT_TOLERANCE if stated is None else stated
    if mismatch > limits["mismatch"] + 4 * tolerance:
        return  # weights meant to differ: a subtractor, not a difference amplifier
    common = max(abs(stage.inputs.demand.high or 0.0), abs(stage.inputs.demand.low or 0.0))
    span = stage.output.demand.span
    if not span or not common:
        return
    error = 4 * tolerance * common
    if error <= limits["share"] * span:
        return
    rejection = (1 + gain) / (4 * tolerance)
    yield stage_finding(
        "feedback-matching",
        stage,
        "remark" if stated is None else "minor",
        f"{stage.schematic} is a difference amplifier with a gain of {si(gain, '')} and resistors "
        f"of {percent(tolerance)} ({'default' if stated is None else 'stated'}): common-mode "
        f"rejection may be as low as {si(_decibels(rejection), 'dB')}, and {si(common, 'V')} at "
        f"its inputs moves the output by {si(error, 'V')}, {percent(error / span)} of its span.",
        nets=(stage.output.net,),
        demand=error,
        limit=limits["share"] * span,
        margin=limits["share"] * span - error,
        unit="V",
        basis=("netlist", "assumed" if stated is None else "user"),
        remedy=f"Fit resistors of {percent(tolerance * limits['share'] * span / error)} in "
        f"{listed(stage.feedback.elements) or 'the network'} and its fellows, or a matched array.",
        source="Texas Instruments SLPS785 (RES11A), CMRR section: (1 + G) / 4t",
    )


def _decibels(ratio: float) -> float:
    from math import log10

    return 20 * log10(ratio)


MATCHING = Rule(
    name="feedback-matching",
    family="feedback",
    looks_at="stage",
    judges="The common-mode error of a difference amplifier at its resistors' tolerance.",
    reason="Four resistors of tolerance t leave a rejection of (1 + G) / 4t: 34 dB at a gain of "
    "one with 1 %.",
    source="Texas Instruments SLPS785 (RES11A); S. Franco, Design with Operational Amplifiers, "
    "3rd ed., ex. 2.9",
    silent="Subtractors whose weights differ on purpose; stages without a common-mode level.",
    limits=(
        Limit(
            name="share",
            default=0.01,
            unit="",
            meaning="share of the output span the common-mode error may take",
            source=NO_SOURCE,
        ),
        Limit(
            name="mismatch",
            default=0.02,
            unit="",
            meaning="difference of the two gains beyond which they are meant to differ",
            source=NO_SOURCE,
        ),
    ),
    judge=judge_matching,
)

RULES = (CURRENT_TYPE, MATCHING)
