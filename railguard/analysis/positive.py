"""What a positive loop is judged by: its thresholds, what drives it, what it feeds."""

import msgspec

from railguard.analysis.stage import Loop, Range
from railguard.analysis.view import View


def with_thresholds(view: View, loop: Loop, after: list[tuple[str, ...]]) -> Loop:
    """Add what a positive loop is judged by: its thresholds and what it feeds."""
    if loop.dc != "positive":
        return loop
    solution, amplifier = view.solution, view.amplifier
    ways, network = solution.ways, solution.passive.network
    across = next(
        (
            e.designator
            for e in ways.around.get(amplifier.plus, ())
            if e.kind == "C" and set(e.nets[:2]) == {amplifier.plus, amplifier.output}
        ),
        "",
    )
    row = network.outputs.get(amplifier.designator, -1)
    beta = float(solution.passive.dc.adjoint([network.row(amplifier.plus)])[0, row].real)
    low, high = view.range("output")
    level = view.level("plus")
    middle = view.level("output")
    feeds = any(
        amplifier.designator in reached and solution.amplifiers[j].designator not in solution.forced
        for j, reached in enumerate(after)
    )
    return msgspec.structs.replace(
        loop,
        beta_plus=beta,
        capacitor_across_plus=across,
        thresholds=Range(level + beta * (low - middle), level + beta * (high - middle)),
        drive=Range(*view.range("minus")),
        feeds_linear=feeds,
    )
