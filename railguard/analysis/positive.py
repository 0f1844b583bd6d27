"""What a positive loop is judged by: its thresholds, what drives it, what it feeds."""

import msgspec

from railguard.analysis.stage import Loop, Range
from railguard.analysis.view import View

LEAST_SHARE = 1e-3
"""A signal that reaches an input with less than this at DC comes through a capacitor."""


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
    # The signal is on one input; the other one carries a standing level, or the two thresholds.
    on_minus = bool(moved_minus.span or not moved_plus.span)
    moved, other = ("minus", "plus") if on_minus else ("plus", "minus")
    away = view.level(other) - view.level(moved)
    entry = _entry(view, moved)
    share, start = entry if entry is not None else (1.0, view.level(moved))
    drive = moved_minus if on_minus else moved_plus
    at = view.level(moved)
    thresholds = _ordered(
        start + (away - abs(beta) * half) / share, start + (away + abs(beta) * half) / share
    )
    if drive.low is not None and drive.high is not None:
        drive = _ordered(start + (drive.low - at) / share, start + (drive.high - at) / share)
    feeds = any(
        amplifier.designator in reached and solution.amplifiers[j].designator not in solution.forced
        for j, reached in enumerate(after)
    )
    switched = _switched(thresholds, drive) and not feeds and abs(beta) < WHOLE_BETA
    return msgspec.structs.replace(
        loop,
        beta_plus=beta,
        capacitor_across_plus=across,
        thresholds=thresholds,
        drive=drive,
        switched=switched,
        feeds_linear=feeds,
    )


CLEAR_SHARE = 0.1
"""Share of the hysteresis by which a signal passes both thresholds that is meant to switch."""


WHOLE_BETA = 0.99
"""Share of the output that comes back from which on a stage latches."""


def _switched(thresholds: Range, drive: Range) -> bool:
    """Tell whether a signal goes well past both thresholds.

    With its inputs exchanged the stage would be linear, and its output stand at both limits at just
    those levels: a linear stage would be asked for what it cannot give, a comparator switches.
    """
    low, high = thresholds.low, thresholds.high
    if low is None or high is None or drive.low is None or drive.high is None:
        return False
    past = CLEAR_SHARE * (high - low)
    return drive.low <= low - past and drive.high >= high + past


def _ordered(a: float, b: float) -> Range:
    return Range(min(a, b), max(a, b))


def _entry(view: View, quantity: str) -> tuple[float, float] | None:
    """Return what an input takes of the one signal that moves it at DC, and that signal's level.

    None where no signal, or more than one, reaches it so: thresholds then stand as at the pin.
    """
    answers, own = view.answers, view.amplifier.designator
    row = int(answers.rows[view.at(quantity)])
    if row < 0:
        return None
    adjoint = answers.dc.adjoint([row])[0].real
    levels = {drive.injection: drive.value for drive in view.solution.prepared.levels}
    found = []
    for tone in answers.tones:
        if tone.tone.name == own or tone.peaks[view.at(quantity)] <= 0:
            continue
        if len(tone.tone.drives) != 1:
            return None
        name = tone.tone.drives[0][0]
        b = answers.network.right_hand_side([(name, 1.0)]).real
        found.append((float(adjoint @ b), levels.get(name, 0.0)))
    if len(found) != 1 or abs(found[0][0]) < LEAST_SHARE:
        return None
    return found[0]


def _signal(view: View, quantity: str) -> Range:
    """Return what the signals alone do at an input, the stage's own output at its middle."""
    q, level = view.at(quantity), view.level(quantity)
    own = view.amplifier.designator
    others = [tone for tone in view.answers.tones if tone.tone.name != own]
    return Range(
        level - sum(float(tone.down[q]) for tone in others),
        level + sum(float(tone.up[q]) for tone in others),
    )
