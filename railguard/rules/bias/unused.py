"""Channels of a package that nothing uses."""

from collections.abc import Iterator

from railguard.analysis.stage import Design, Stage
from railguard.rules.compose import stage_finding
from railguard.rules.protocol import Limits, Outcome, Rule
from railguard.units import si
from railguard.words import Severity

UNUSED_SOURCE = (
    "Maxim AN1957; Texas Instruments, Properly terminating an unused op amp; Microchip MCP6291 "
    "DS21812E shows the comparator-style circuit as allowed"
)


def judge_unused(stage: Stage, limits: Limits, design: Design) -> Iterator[Outcome]:
    """Judge how an unused channel's pins are tied."""
    if stage.use != "unused":
        return
    fault = _fault(stage)
    if fault is None:
        return
    severity, what = fault
    yield stage_finding(
        "bias-unused",
        stage,
        severity,
        f"{stage.schematic} is not used, and {what}.",
        nets=tuple(dict.fromkeys((stage.inputs.plus.net, stage.inputs.minus.net))),
        remedy=_remedy(stage),
        source=UNUSED_SOURCE,
    )


def _fault(stage: Stage) -> tuple[Severity, str] | None:
    plus, minus = stage.inputs.plus, stage.inputs.minus
    floating = [p for p in (plus, minus) if p.state == "floating"]
    if floating:
        return "major", f"its input on net {floating[0].net} is left open"
    if stage.loop.dc == "positive":
        return "minor", "its feedback is positive, so its output stands at a rail"
    if stage.loop.dc == "open":
        if plus.net == minus.net:
            return (
                "minor",
                f"both inputs stand on net {plus.net}, so its offset drives it to a rail",
            )
        return "remark", (
            "its inputs are tied apart without feedback, so its output stands at a rail; some "
            "makers allow that, and it may draw more current"
        )
    typical, sure, level = stage.inputs.available, stage.inputs.guaranteed, plus.level
    low = typical.low if typical.low is not None else sure.low
    high = typical.high if typical.high is not None else sure.high
    if level is None or low is None or high is None or low <= level <= high:
        return None
    return "minor", (
        f"its input at {si(level, 'V')} is outside the {si(low, 'V')} to {si(high, 'V')} it takes"
    )


def _remedy(stage: Stage) -> str:
    supply = stage.supply
    if supply.positive is not None and supply.negative == 0:
        return (
            "Wire its output to its inverting input and its non-inverting input to "
            f"{si(supply.positive / 2, 'V')}, two resistors of 100 kΩ from the rail."
        )
    return "Wire its output to its inverting input and its non-inverting input to ground."


UNUSED = Rule(
    name="bias-unused",
    family="bias",
    looks_at="stage",
    judges="How the pins of an unused channel are tied.",
    reason="An open channel drifts from rail to rail, draws several times its quiescent current, "
    "and couples into its neighbours.",
    source=UNUSED_SOURCE,
    silent="Channels that are used; a follower at a level inside both its ranges.",
    judge=judge_unused,
)

RULES = (UNUSED,)
