"""Stages that cannot follow: what they really feed to the next.

The demand on a stage stays unclipped, so that its margin is seen. What comes after it, though, is
fed by an output that stands at its limit; judging that on the unclipped demand would tell one fault
twice. So the circuit is solved again with every saturated output held to what it reaches, front
of the chain first, and the stages behind take their numbers from there.
"""

from collections.abc import Mapping, Sequence

import msgspec

from railguard.analysis.ranges import Clamp
from railguard.analysis.stage import Stage


def clamps_of(stages: Sequence[Stage], known: Mapping[str, Clamp]) -> dict[str, Clamp]:
    """Return the outputs asked beyond what they typically reach, and what they do instead.

    Of a device without a listed swing, beyond its rails.

    known  clamps found before: they stay. New ones are added from the front of the chain only,
           because what a saturated stage asks of the ones behind it is not real.
    """
    asked = {s.designator: c for s in stages if (c := _clamp(s)) is not None} | dict(known)
    new = set(asked) - set(known)
    front = {
        name
        for name in new
        if not any(
            name in _behind(stages, frozenset({other}))
            and other not in _behind(stages, frozenset({name}))
            for other in new - {name}
        )
    }
    return {**known, **{name: asked[name] for name in front}}


def _clamp(stage: Stage) -> Clamp | None:
    low, high = stage.output.demand.low, stage.output.demand.high
    reach, supply = stage.output.available, stage.supply
    # Where no typical swing is listed an output may come close to its rails, and never beyond.
    least = reach.low if reach.low is not None else supply.negative
    most = reach.high if reach.high is not None else supply.positive
    if low is None or high is None or least is None or most is None or least >= most:
        return None
    if high <= most and low >= least:
        return None
    bottom, top = min(max(low, least), most), max(min(high, most), least)
    return Clamp((bottom + top) / 2, (top - bottom) / 2, stage.output.frequency or 0.0)


def followers_replaced(
    stages: Sequence[Stage], real: Sequence[Stage], clamped: frozenset[str]
) -> tuple[Stage, ...]:
    """Return the stages, those behind a clamped one with the numbers of the second solution."""
    behind = _behind(stages, clamped)
    return tuple(
        msgspec.structs.replace(
            stage,
            output=other.output,
            current=other.current,
            inputs=other.inputs,
            dissipation=other.dissipation,
        )
        if stage.designator in behind and stage.designator not in clamped
        else stage
        for stage, other in zip(stages, real, strict=True)
    )


def _behind(stages: Sequence[Stage], clamped: frozenset[str]) -> set[str]:
    """Return every stage a clamped output reaches, through other stages too."""
    reached = set(clamped)
    grown = True
    while grown:
        grown = False
        for stage in stages:
            if stage.designator not in reached and reached.intersection(stage.after):
                reached.add(stage.designator)
                grown = True
    return reached
