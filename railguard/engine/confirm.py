"""Findings on range and current held against ngspice: confirmed, refuted, or left open."""

import msgspec

from railguard.analysis.bound import Bound, Range
from railguard.analysis.stage import Design, Stage, Unknown
from railguard.engine.operating import APART, Simulated, Simulation

MET = 0.02
"""A demand counts as met when the simulation comes within this share of its span."""
SMALLEST = 0.02
"""V within which an output voltage counts as reached whatever its span."""


class Outcome(msgspec.Struct, frozen=True):
    """What the simulation says of one demand: "confirmed", "refuted" or "open", and why."""

    word: str
    why: str


def outcome(
    rule: str, demand: float | None, limit: float | None, corner: str, stage: Stage, done: Simulated
) -> Outcome:
    """Hold one finding against what its stage did.

    The macromodel is typical, at nominal values: what breaks only a guaranteed limit or a corner
    is left open, and so is a demand that was not reached by tones that had no time to meet.
    """
    said = _outcome(rule, demand, limit, corner, stage, done)
    if said.word != "confirmed" or done.meets:
        return said
    return Outcome("open", "its tones are too near one another to meet in a run of bearable length")


def _outcome(
    rule: str, demand: float | None, limit: float | None, corner: str, stage: Stage, done: Simulated
) -> Outcome:
    if demand is None or limit is None:
        return Outcome("open", "it states no number that can be simulated")
    if corner == "worst-case":
        return Outcome("open", "it is a corner; the simulation runs at nominal values")
    if rule == "headroom-input":
        return _input(demand, limit, stage, done)
    if rule == "headroom-output":
        upper = demand > limit
        reached = done.output.high if upper else done.output.low
        slack = _slack(stage.output.demand)
        figure, bound = "V", stage.output.high if upper else stage.output.low
    else:
        reached = _most(done.current)
        slack, upper, figure = MET * abs(demand), True, "A"
        sources = (done.current.high or 0.0) >= -(done.current.low or 0.0)
        bound = stage.current.source if sources else stage.current.sink
    if reached is None:
        return Outcome("open", "it did not settle")
    short = demand - reached if upper else reached - demand
    told = f"{reached:.4g} {figure} of {demand:.4g} {figure}"
    if short > slack:
        if figure == "A" and done.apart is not None and done.apart <= APART:
            return Outcome(
                "refuted", f"ngspice needs {reached:.4g} A to follow, not {demand:.4g} A"
            )
        return Outcome("confirmed", f"ngspice reaches {told}")
    return _not_met(bound, demand, f"ngspice reaches {told}")


def _slack(span: Range) -> float:
    return max(MET * max(span.span or 0.0, 1.0), SMALLEST)


def _most(current: Range) -> float | None:
    if current.high is None or current.low is None:
        return None
    return max(current.high, -current.low, 0.0)


def _input(demand: float, limit: float, stage: Stage, done: Simulated) -> Outcome:
    """Hold an input's demand against where the input got, and whether the amplifier followed."""
    upper = demand > limit
    reached = done.plus.high if upper else done.plus.low
    if reached is None or done.apart is None:
        return Outcome("open", "it did not settle")
    short = demand - reached if upper else reached - demand
    told = f"{reached:.4g} V of {demand:.4g} V"
    if short > _slack(stage.inputs.demand):
        return Outcome("refuted", f"ngspice brings the input to {told} only")
    if done.apart > APART:
        return Outcome(
            "confirmed",
            f"at {told} ngspice's inputs part by {done.apart:.3g} V: it stops following",
        )
    bound = stage.inputs.high if upper else stage.inputs.low
    return _not_met(bound, demand, f"at {told} ngspice's inputs still follow")


def _not_met(bound: Bound, demand: float, told: str) -> Outcome:
    """Say what it means that the simulation does what the finding doubts."""
    typical = bound.typical
    if typical is not None and (demand <= typical if bound.upper else demand >= typical):
        return Outcome("open", f"{told}: a typical device does, the finding is about the others")
    return Outcome("refuted", f"{told} with typical figures")


def filled(design: Design, simulation: Simulation) -> Design:
    """Give the stages that the built-in solver could not follow their numbers from ngspice."""
    return msgspec.structs.replace(
        design, stages=tuple(_filled(stage, simulation) for stage in design.stages)
    )


def _filled(stage: Stage, simulation: Simulation) -> Stage:
    done = simulation.stages.get(stage.designator)
    bent = [p for p, u in stage.unknown.items() if u.add == "--engine ngspice"]
    if done is None or not bent or done.output.high is None:
        return stage
    unknown = {part: reason for part, reason in stage.unknown.items() if part not in bent}
    for part in ("loop", "dissipation"):
        if part in bent:
            unknown[part] = Unknown(stage.unknown[part].why, "nothing: it changes with the signal")
    output, current, inputs = stage.output, stage.current, stage.inputs
    if "output" in bent:
        # What clips is asked for more than it gives; the demand is what it would have to give.
        asked = done.output if done.wanted.high is None else done.wanted
        output = msgspec.structs.replace(
            output,
            level=done.level,
            demand=asked,
            high=_at(output.high, asked.high, asked, done.level),
            low=_at(output.low, asked.low, asked, done.level),
        )
        if inputs.plus.level is None:
            # What the gain multiplies is the way from there: a remedy is worked out from it.
            plus = msgspec.structs.replace(inputs.plus, level=done.rest)
            inputs = msgspec.structs.replace(inputs, plus=plus)
    if "current" in bent:
        source, sink = max(done.current.high or 0.0, 0.0), max(-(done.current.low or 0.0), 0.0)
        current = msgspec.structs.replace(
            current,
            demand_source=source,
            demand_sink=sink,
            source=msgspec.structs.replace(current.source, demand=source),
            sink=msgspec.structs.replace(current.sink, demand=sink),
        )
    return msgspec.structs.replace(
        stage, output=output, current=current, inputs=inputs, unknown=unknown
    )


def _at(bound: Bound, value: float | None, asked: Range, level: float) -> Bound:
    return msgspec.structs.replace(bound, demand=value, level=level, span=asked.span)
