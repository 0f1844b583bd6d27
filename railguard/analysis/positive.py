"""What a positive loop is judged by: its thresholds, what drives it, what it feeds."""

import msgspec
import numpy as np

from railguard.analysis.bound import Range
from railguard.analysis.loop import Loop
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
    row = network.outputs[amplifier.designator]
    beta = float(solution.passive.dc.adjoint([network.row(amplifier.plus)])[0, row].real)
    half = (view.range("output")[1] - view.range("output")[0]) / 2
    moved_plus, moved_minus = (_signal(view, quantity) for quantity in ("plus", "minus"))
    # The signal is on one input; the other one carries a standing level, or the two thresholds.
    on_minus = moved_minus[0] < moved_minus[1] or not moved_plus[0] < moved_plus[1]
    moved, other = ("minus", "plus") if on_minus else ("plus", "minus")
    away = view.level(other) - view.level(moved)
    entry = _entry(view, moved)
    share, start = (1.0, view.level(moved)) if entry is None else entry[1:]
    drive = moved_minus if on_minus else moved_plus
    at = view.level(moved)
    thresholds = _ordered(
        start + (away - abs(beta) * half) / share, start + (away + abs(beta) * half) / share
    )
    lower, upper = _moves(view, (moved, other), beta, half, entry)
    if share < 0:
        lower, upper = upper, lower
    drive = _ordered(*(start + (volts - at) / share for volts in drive))
    feeds = any(
        amplifier.designator in reached and solution.amplifiers[j].designator not in solution.forced
        for j, reached in enumerate(after)
    )
    switched = _switched(thresholds, drive) and not feeds and abs(beta) < WHOLE_BETA
    return msgspec.structs.replace(
        loop,
        beta_plus=beta,
        capacitor_across_plus=across,
        thresholds=Range(*thresholds),
        lower_worst=_around(thresholds[0], lower),
        upper_worst=_around(thresholds[1], upper),
        drive=Range(*drive),
        switched=switched,
        feeds_linear=feeds,
    )


CLEAR_SHARE = 0.1
"""Share of the hysteresis by which a signal passes both thresholds that is meant to switch."""


WHOLE_BETA = 0.99
"""Share of the output that comes back from which on a stage latches."""


def _switched(thresholds: tuple[float, float], drive: tuple[float, float]) -> bool:
    """Tell whether a signal goes well past both thresholds.

    With its inputs exchanged the stage would be linear, and its output stand at both limits at just
    those levels: a linear stage would be asked for what it cannot give, a comparator switches.
    """
    low, high = thresholds
    past = CLEAR_SHARE * (high - low)
    return drive[0] <= low - past and drive[1] >= high + past


def _ordered(a: float, b: float) -> tuple[float, float]:
    return min(a, b), max(a, b)


def _around(value: float, moved: float) -> Range:
    return Range(value - moved, value + moved)


def _moves(
    view: View,
    inputs: tuple[str, str],
    beta: float,
    half: float,
    entry: tuple[str, float, float] | None,
) -> tuple[float, float]:
    """Return how far the two thresholds move at the most, V: output at its low and its high limit.

    inputs  the one the signal is on, and the other
    beta    share of the output at the non-inverting input; half: of its swing, V
    entry   as of `_entry`
    """
    solution, answers, amplifier = view.solution, view.answers, view.amplifier
    spread, passive = solution.spread, solution.passive
    elements, width = spread.elements, len(spread.delta)
    moved, other = ((spread.high[q] + spread.low[q]) / 2 for q in map(view.at, inputs))
    away = view.level(inputs[1]) - view.level(inputs[0])
    of_beta, of_share = np.zeros(width), np.zeros(width)
    plus = passive.dc.adjoint([passive.network.row(amplifier.plus)])
    unit = passive.network.right_hand_side([(amplifier.designator, 1.0)])
    of_beta[: len(elements)] = elements.pulls(plus, passive.dc.forward(unit), 0j)[0].real
    share = 1.0
    if entry is not None:
        name, share, _ = entry
        at = answers.dc.adjoint([int(answers.rows[view.at(inputs[0])])])
        drive = answers.network.right_hand_side([(name, 1.0)])
        of_share[: len(elements)] = elements.pulls(at, answers.dc.forward(drive), 0j)[0].real
    else:
        moved = np.zeros(width)  # the threshold is that of the pin itself
    # The limits of the output go with its rails.
    rails = max(spread.reach(spread.high[view.at(pin)]) for pin in ("positive", "negative"))
    device = amplifier.match.device
    offset = (device.offset_voltage.best or 0.0) if device is not None else 0.0
    apart = (abs(beta) * float(rails) + offset) / abs(share)
    found = []
    for sign in (-1.0, 1.0):
        pull = (other - moved + sign * np.sign(beta) * of_beta * half) / share
        pull -= (away + sign * abs(beta) * half) / share**2 * of_share
        found.append(float(spread.reach(pull)) + apart)
    return found[0], found[1]


def _entry(view: View, quantity: str) -> tuple[str, float, float] | None:
    """Return the one signal that moves an input at DC, what the input takes of it, and its level.

    None where no signal, or more than one, reaches it so: thresholds then stand as at the pin.
    """
    answers, own = view.answers, view.amplifier.designator
    row = int(answers.rows[view.at(quantity)])
    if row < 0:
        return None
    adjoint = answers.dc.adjoint([row])[0].real
    # What another stage without a loop drives moves round the middle of that stage's range.
    levels = {
        a.designator: float(answers.level[answers.at(k, "output")])
        for k, a in enumerate(answers.amplifiers)
    }
    levels.update((drive.injection, drive.value) for drive in view.solution.prepared.levels)
    found: list[tuple[str, float, float]] = []
    for tone in view.tones:
        if tone.tone.name == own or tone.peaks[view.at(quantity)] <= 0:
            continue
        if len(tone.tone.drives) != 1:
            return None
        name = tone.tone.drives[0][0]
        b = answers.network.right_hand_side([(name, 1.0)]).real
        found.append((name, float(adjoint @ b), levels.get(name, 0.0)))
    if len(found) != 1 or abs(found[0][1]) < LEAST_SHARE:
        return None
    return found[0]


def _signal(view: View, quantity: str) -> tuple[float, float]:
    """Return what the signals alone do at an input, the stage's own output at its middle."""
    q, level = view.at(quantity), view.level(quantity)
    own = view.amplifier.designator
    others = [tone for tone in view.answers.tones if tone.tone.name != own]
    return (
        level - sum(float(tone.down[q]) for tone in others),
        level + sum(float(tone.up[q]) for tone in others),
    )
