"""Whether a loop's feedback is negative at DC, or positive, or not there."""

from collections.abc import Iterator

from railguard.analysis.loop import Loop
from railguard.analysis.stage import Design, Stage, Unknown
from railguard.rules.compose import open_point, stage_finding
from railguard.rules.protocol import Limit, Limits, Outcome, Rule
from railguard.rules.wording import listed
from railguard.units import si
from railguard.words import Severity

NO_LOOP = Unknown(
    "the sign of its feedback could not be worked out",
    "run with --engine ngspice where it is installed, or state the use of the stage",
)
SIGN_SOURCE = "common practice, no source: a loop is stable at DC only where A*beta is positive"


def _use_hint(stage: Stage) -> str:
    return f'state it: [stages] "{stage.schematic}" = {{ use = "comparator" }}'


# --- feedback-reversed


def judge_reversed(stage: Stage, limits: Limits, design: Design) -> Iterator[Outcome]:
    """Judge positive feedback at DC by what the evidence says: a mistake, or hysteresis."""
    if stage.use == "unused":
        return
    loop = stage.loop
    gap = NO_LOOP if loop.dc is None else None
    yield from open_point("feedback-reversed", stage, ("loop",), gap)
    if "loop" in stage.unknown or loop.dc != "positive":
        return
    severity, why = _evidence(stage, limits["whole-beta"])
    if severity == "critical":
        remedy = f"Swap the inputs of {stage.schematic}."
    elif severity == "major":
        remedy = f"Swap the inputs of {stage.schematic}; if it is a comparator, {_use_hint(stage)}."
    else:
        remedy = ""
    message = f"{stage.schematic} has positive feedback at DC{_beta(loop)}: {why}"
    yield stage_finding(
        "feedback-reversed",
        stage,
        severity,
        message,
        nets=tuple(dict.fromkeys((stage.inputs.plus.net, stage.output.net))),
        demand=loop.beta_plus,
        limit=0.0 if loop.beta_plus is not None else None,
        margin=-loop.beta_plus if loop.beta_plus is not None else None,
        remedy=remedy,
        source=SIGN_SOURCE,
    )


def _beta(loop: Loop) -> str:
    if loop.beta_plus is None:
        return ""
    return f" ({si(100 * loop.beta_plus, '%')} of the output comes back to the non-inverting input)"


def _thresholds(loop: Loop) -> str:
    low, high = loop.thresholds.low, loop.thresholds.high
    if low is None or high is None:
        return "its thresholds could not be worked out"
    return f"it switches at {si(low, 'V')} and {si(high, 'V')}"


def _evidence(stage: Stage, whole: float) -> tuple[Severity, str]:
    """Return how bad, and the sentence that says by what evidence."""
    loop = stage.loop
    never = _smaller_than_hysteresis(loop)
    meant = stage.use in ("comparator", "oscillator")
    # What is worked out from the output's load alone does not make up for a signal that never
    # switches the stage; what the user states does.
    if meant and (stage.use_stated or stage.use == "oscillator" or not never):
        return "remark", f"{_thresholds(loop)}. It is {_a_use(stage)}, {_basis(stage)}."
    if loop.capacitor_across_plus:
        return "critical", (
            f"{loop.capacitor_across_plus} stands across the positive path, where a linear stage "
            "has its feedback capacitor, so the inputs are most likely swapped."
        )
    if loop.beta_plus is not None and loop.beta_plus >= whole:
        return "critical", "all of the output comes back, so it latches at a rail."
    if loop.feeds_linear:
        return "critical", (
            f"{_thresholds(loop)}, and its output feeds a linear stage, which a switching one "
            "has no use for."
        )
    if never:
        return "critical", (
            f"{_thresholds(loop)}, and the signal ({si(loop.drive.low, 'V')} to "
            f"{si(loop.drive.high, 'V')}) never crosses both, so it stays at a rail."
        )
    return "major", f"{_thresholds(loop)}; nothing shows that switching is meant."


def _basis(stage: Stage) -> str:
    if stage.use_stated:
        return "as stated"
    if stage.use == "comparator" and stage.loop.switched:
        drive = stage.loop.drive
        return (
            f"as its signal shows, which goes from {si(drive.low, 'V')} to {si(drive.high, 'V')}: "
            "no linear stage could follow it"
        )
    return "as what it drives shows"


def _a_use(stage: Stage) -> str:
    return "an oscillator" if stage.use == "oscillator" else "a comparator"


def _smaller_than_hysteresis(loop: Loop) -> bool:
    low, high = loop.thresholds.low, loop.thresholds.high
    if low is None or high is None or loop.drive.low is None or loop.drive.high is None:
        return False
    return loop.drive.high < high or loop.drive.low > low


REVERSED = Rule(
    name="feedback-reversed",
    family="feedback",
    looks_at="stage",
    judges="Whether the loop round a stage, all other stages active, is positive at DC.",
    reason="Positive feedback drives an output to a rail and holds it there; it is a comparator "
    "with hysteresis, or a linear stage with its inputs swapped.",
    source=SIGN_SOURCE,
    silent="Critical where the evidence says mistake (a capacitor across the positive path, a "
    "signal smaller than the hysteresis, an output that feeds a linear stage, all of the output "
    "fed back); major with its thresholds otherwise; a remark where comparator or oscillator is "
    "stated, or the output only feeds a switch, gate, LED or relaxation network, or the signal "
    "goes well past both thresholds.",
    limits=(
        Limit(
            name="whole-beta",
            default=0.99,
            unit="",
            meaning="share of the output fed back to the non-inverting input that counts as all",
            source="common practice, no source",
        ),
    ),
    judge=judge_reversed,
)


# --- feedback-open


def judge_open(stage: Stage, limits: Limits, design: Design) -> Iterator[Outcome]:
    """Judge whether anything holds the stage's output at DC."""
    if stage.use == "unused":
        return
    gap = NO_LOOP if stage.loop.dc is None else _bridged(stage)
    yield from open_point("feedback-open", stage, ("loop",), gap)
    if "loop" in stage.unknown or stage.loop.dc != "open" or stage.loop.holds or gap is not None:
        return
    if stage.use != "linear":
        if not stage.use_stated and stage.use == "comparator":
            yield _bare_comparator(stage)
        return
    yield from _open(stage)


def _bridged(stage: Stage) -> Unknown | None:
    """Return why an open loop may be closed all the same, or None."""
    if stage.loop.dc != "open" or not stage.loop.bridges:
        return None
    return Unknown(
        f"{listed(stage.loop.bridges)} may lead its output back to its inverting input, which the "
        "netlist does not tell",
        "--engine ngspice, or a resistor where none is drawn",
    )


def _bare_comparator(stage: Stage) -> Outcome:
    return stage_finding(
        "feedback-open",
        stage,
        "remark",
        f"{stage.schematic} has no feedback at rest; by what it drives it is taken for a "
        "comparator. Without hysteresis one chatters on a slow or noisy input.",
        nets=(stage.output.net,),
        remedy=f"If that is meant, {_use_hint(stage)}.",
        source=SIGN_SOURCE,
    )


def _open(stage: Stage) -> Iterator[Outcome]:
    if stage.feedback.elements:
        severity: Severity = "major"
        verb = "passes" if len(stage.feedback.elements) == 1 else "pass"
        message = (
            f"{stage.schematic} has no feedback at DC: {listed(stage.feedback.elements)} between "
            f"its output and its inverting input {verb} no direct current, and no other stage "
            "holds its level. Offset and bias current take the output to a rail."
        )
        remedy = (
            f"Fit a resistor from net {stage.output.net} to net {stage.inputs.minus.net}, ten "
            "times the resistor that feeds the input or more; where a switch resets the stage, it "
            "is enough."
        )
    else:
        severity = "critical"
        message = (
            f"{stage.schematic} has no feedback: nothing leads from its output (net "
            f"{stage.output.net}) to its inverting input (net {stage.inputs.minus.net}), so the "
            "output stands at a rail."
        )
        remedy = (
            f"Connect the feedback resistor from net {stage.output.net} to net "
            f"{stage.inputs.minus.net}; if it is a comparator, {_use_hint(stage)}."
        )
    yield stage_finding(
        "feedback-open",
        stage,
        severity,
        message,
        nets=tuple(dict.fromkeys((stage.output.net, stage.inputs.minus.net))),
        demand=stage.loop.beta_dc,
        remedy=remedy,
        source=SIGN_SOURCE,
    )


OPEN = Rule(
    name="feedback-open",
    family="feedback",
    looks_at="stage",
    judges="Whether a stage has feedback at DC, its own or through other stages.",
    reason="Open-loop gain turns a millivolt of offset into a saturated output.",
    source=SIGN_SOURCE,
    silent="A stage whose level another stage holds (integrator in a servo or state-variable "
    "loop), comparators, oscillators (a circuit that is unstable with ideal amplifiers and that no "
    "signal reaches), unused channels. A precision rectifier or limiter counts as closed through "
    "its diodes. A loop through elements that could not be solved, and an integrator that a switch "
    "or a device nobody knows may reset, are listed as not checked.",
    judge=judge_open,
)

RULES = (REVERSED, OPEN)
