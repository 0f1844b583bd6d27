"""Feedback of current-feedback devices, and the matching of difference amplifiers."""

import math
from collections.abc import Iterator

from railguard.analysis.loop import Balance
from railguard.analysis.stage import Design, Stage
from railguard.devices.model import Figure
from railguard.rules.compose import missing_figure, open_point, stage_finding
from railguard.rules.finding import Finding
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
    """Judge what a difference amplifier's reference and its resistors' tolerance leave of it."""
    soft = _soft_reference(stage, limits)
    if soft is not None:
        yield soft
        return  # what tolerance adds is small beside it
    if stage.topology != "difference" or stage.use != "linear" or stage.loop.dc != "negative":
        return
    balance = stage.balance
    told = design.settings.tolerances.resistor
    stated = told is not None if balance is None else balance.stated
    four = 4 * (DEFAULT_TOLERANCE if told is None else told)
    four = four if balance is None else balance.tolerance
    gain = _gain_of_difference(stage, limits["mismatch"] + four)
    common = max(abs(stage.inputs.demand.high or 0.0), abs(stage.inputs.demand.low or 0.0))
    span, shown = _shown(stage)
    if gain is None or not span or not common:
        return
    error = four * common
    if error <= limits["share"] * span:
        return
    rejection = (1 + gain) / four
    far = error > limits["far-share"] * span
    severity: Severity = "major" if stated and far else "minor" if stated or far else "remark"
    tolerance = four / 4
    yield stage_finding(
        "feedback-matching",
        stage,
        severity,
        f"{stage.schematic} is a difference amplifier with a gain of {si(gain, '')} and resistors "
        f"of {percent(tolerance)} ({'stated' if stated else 'default'}): common-mode "
        f"rejection may be as low as {si(_decibels(rejection), 'dB')}, and {si(common, 'V')} at "
        f"its inputs moves the output by {si(error, 'V')}, {percent(error / span)} of {shown}.",
        nets=(stage.output.net,),
        demand=error,
        limit=limits["share"] * span,
        margin=limits["share"] * span - error,
        unit="V",
        basis=("netlist", "user" if stated else "assumed"),
        remedy=_matched(stage, tolerance * limits["share"] * span / error),
        source="Texas Instruments SLPS785 (RES11A), CMRR section: (1 + G) / 4t",
    )


def _soft_reference(stage: Stage, limits: Limits) -> Finding | None:
    """Tell of a reference that comes from a bare divider, which costs the four their balance."""
    balance = stage.balance
    works = stage.use == "linear" and stage.loop.dc == "negative"
    if not works or balance is None or not balance.source:
        return None
    share = balance.source_ohms / balance.fellow
    corner = 0.0
    if balance.source_farads:
        corner = 1 / (2 * math.pi * balance.source_ohms * balance.source_farads)
    held = bool(corner and stage.band.low and stage.band.low > corner)
    if share <= limits["reference"] or held:
        return None
    fellow = balance.fellow + balance.source_ohms
    first = balance.fellow / balance.gain
    common = (1 + balance.gain) * fellow / (first + fellow) - balance.gain
    rejection = _decibels(balance.gain / common)
    name = balance.elements[3]
    return stage_finding(
        "feedback-matching",
        stage,
        "minor",
        f"{stage.schematic}'s reference comes from the divider {listed(balance.source)}: its "
        f"{si(balance.source_ohms, 'Ω')} stand in series with {name}, so the one signal is "
        f"multiplied by {si(balance.gain + common, '')} and the other by {si(balance.gain, '')}; "
        f"{si(rejection, 'dB')} of common-mode rejection are left.",
        nets=(stage.output.net,),
        demand=share,
        limit=limits["reference"],
        margin=limits["reference"] - share,
        unit="",
        basis=("netlist",),
        remedy=_stiffened(balance, name),
        source="Analog Devices AD620 data sheet: the reference terminal wants a low resistance, "
        "from memory",
    )


def _stiffened(balance: Balance, name: str) -> str:
    buffered = f"Buffer the divider with an amplifier before {name}"
    rest = balance.fellow - balance.source_ohms
    if rest < balance.source_ohms:
        return f"{buffered}."
    return f"{buffered}, or fit {si(rest, 'Ω')} there, which both together make the old value."


FINEST = 0.0005
"""Share; single resistors of a closer tolerance are no stock items."""


def _gain_of_difference(stage: Stage, apart: float) -> float | None:
    """Return the gain of the difference, or None where two gains are meant to differ."""
    if stage.balance is not None and stage.balance.sense:
        return stage.balance.gain
    gains = [gain for _, gain in stage.gain]
    if len(gains) != 2 or gains[0] * gains[1] >= 0:
        return None
    gain = max(abs(g) for g in gains)
    # Further apart: weights that are meant to differ, a subtractor.
    return gain if abs(gains[0] + gains[1]) / gain <= apart else None


def _shown(stage: Stage) -> tuple[float, str]:
    """Return what the output is to show, V, and the words for it.

    A current that stands still has no span: there it is the level over the reference.
    """
    span = stage.output.demand.span or 0.0
    if stage.balance is not None and stage.balance.sense and stage.output.demand.high is not None:
        ends = (stage.output.demand.high, stage.output.demand.low or 0.0)
        most = max(abs(end - stage.balance.reference) for end in ends)
        if most > span:
            return most, f"the {si(most, 'V')} it is to show"
    return span, "its span"


def _matched(stage: Stage, tolerance: float) -> str:
    own = stage.feedback.elements
    names = stage.balance.elements if stage.balance is not None else own
    fellows = "" if stage.balance is not None else " and its fellows"
    where = f"{listed(names) or 'the network'}{fellows}"
    if tolerance < FINEST:
        return (
            f"Fit a matched array, or a difference amplifier with its resistors inside, for "
            f"{where}: single resistors would have to be of {percent(tolerance)}."
        )
    return f"Fit resistors of {percent(tolerance)} in {where}, or a matched array."


def _decibels(ratio: float) -> float:
    from math import log10

    return 20 * log10(ratio)


MATCHING = Rule(
    name="feedback-matching",
    family="feedback",
    looks_at="stage",
    judges="The common-mode error of a difference amplifier at its resistors' tolerance, and with "
    "a divider as its reference.",
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
            name="far-share",
            default=0.1,
            unit="",
            meaning="share beyond which the error is no question of accuracy: major where the "
            "tolerances are stated, minor where they are the default",
            source=NO_SOURCE,
        ),
        Limit(
            name="reference",
            default=0.02,
            unit="",
            meaning="resistance of what the reference comes from, as a share of the resistor there",
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
