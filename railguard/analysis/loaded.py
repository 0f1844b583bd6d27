"""Stated loads behind resistors: what a converter's input gets from the outputs before it."""

from collections.abc import Sequence

from railguard.analysis.bound import Range
from railguard.analysis.ranges import swings
from railguard.analysis.solution import Solution
from railguard.analysis.stage import Loaded, Stage
from railguard.analysis.surroundings import Ways
from railguard.settings.model import Settings

PASSIVE = frozenset({"R", "C", "L", "link", "open"})
"""Kinds that stand in the way without bending it; a diode at the net clamps it, and is none."""


def loads_of(solution: Solution, stages: Sequence[Stage], settings: Settings) -> tuple[Loaded, ...]:
    """Return the stated loads with a limit that outputs reach through passive elements.

    solution  with every saturated output held to what it reaches
    """
    by_output = {stage.output.net: stage for stage in stages}
    found = {}
    for load in settings.loads:
        if load.max_volts is None or load.net in by_output:
            continue
        if solution.answers.network.row(load.net) < 0:
            continue
        outputs = _behind(load.net, solution.ways)
        drivers = [stage for net, stage in by_output.items() if net in outputs]
        if drivers and all(_is_known(stage) for stage in drivers):
            found[load.net] = tuple(stage.designator for stage in drivers)
    if not found:
        return ()
    return tuple(
        Loaded(net=net, volts=Range(*ends), drivers=found[net])
        for net, ends in swings(solution.answers, tuple(found)).items()
    )


def _is_known(stage: Stage) -> bool:
    demand = stage.output.demand
    return demand.low is not None and demand.high is not None and "output" not in stage.unknown


def _behind(net: str, ways: Ways) -> set[str]:
    """Return the outputs that reach a net over free nets; none where something bends the way."""
    seen, queue, outputs = {net}, [net], set[str]()
    while queue:
        for element in ways.around.get(queue.pop(), ()):
            if element.kind not in PASSIVE:
                return set()
            for other in element.nets[:2] if element.kind != "open" else ():
                if other in ways.outputs:
                    outputs.add(other)
                elif other not in seen and other not in ways.held:
                    seen.add(other)
                    queue.append(other)
    return outputs
