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
    half = (view.range("output")[1] - view.range("output")[0]) / 2
    moved_plus, moved_minus = (_signal(view, quantity) for quantity in ("plus", "minus"))
    if moved_minus.span or not moved_plus.span:
        # The signal is on the inverting input: the other one carries the two thresholds.
        middle, drive = view.level("plus"), moved_minus
    else:
        middle, drive = view.level("minus"), moved_plus
    thresholds = Range(middle - abs(beta) * half, middle + abs(beta) * half)
    feeds = any(
        amplifier.designator in reached and solution.amplifiers[j].designator not in solution.forced
        for j, reached in enumerate(after)
    )
    return msgspec.structs.replace(
        loop,
        beta_plus=beta,
        capacitor_across_plus=across,
        thresholds=thresholds,
        drive=drive,
        feeds_linear=feeds,
    )


def _signal(view: View, quantity: str) -> Range:
    """Return what the signals alone do at an input, the stage's own output at its middle."""
    q, level = view.at(quantity), view.level(quantity)
    own = view.amplifier.designator
    others = [tone for tone in view.answers.tones if tone.tone.name != own]
    return Range(
        level - sum(float(tone.down[q]) for tone in others),
        level + sum(float(tone.up[q]) for tone in others),
    )
