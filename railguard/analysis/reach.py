"""Which signals reach a stage: its gains, its band, whether they come through a capacitor."""

import msgspec
import numpy as np

from railguard.analysis.bound import Range
from railguard.analysis.equations import Complex, Real
from railguard.analysis.loop import Loop
from railguard.analysis.solve import factor
from railguard.analysis.surroundings import MID_HERTZ
from railguard.analysis.vertices import Answer, ends
from railguard.analysis.view import View


def top_of(view: View) -> float | None:
    """Return the highest stated frequency that reaches the output, hertz."""
    q = view.at("output")
    tops = [t.tone.top for t in view.tones if t.peaks[q] > 0 and t.tone.top > 0]
    return max(tops, default=None)


def band_of(view: View) -> Range:
    """Return the lowest and highest stated frequency that reaches the output, hertz."""
    q = view.at("output")
    reached = [t.tone.frequencies for t in view.tones if t.peaks[q] > 0]
    if not reached:
        return Range()
    return Range(min(min(f) for f in reached), max(max(f) for f in reached))


def is_ac_coupled(view: View) -> bool:
    """Tell whether every signal that reaches the output is blocked at DC.

    What has no stated amplitude (a probe, a net that leaves the sheet) counts where nothing else
    moves the output.
    """
    moved = [
        (t, float(t.peaks[view.at("output")])) for t in view.tones if t.peaks[view.at("output")] > 0
    ]
    if not moved:
        unseen = view.spoil("output")
        return bool(unseen.ac) and not unseen.dc
    rows = [int(view.answers.rows[view.at("output")])]
    adjoint = view.answers.dc.adjoint(rows)[0]
    for tone, peak in moved:
        b = view.answers.network.right_hand_side(tone.tone.drives)
        if abs(complex(adjoint @ b)) > 1e-3 * peak:
            return False
    return True


class Gain(msgspec.Struct, frozen=True):
    """What a stage makes of one signal, V/V or V/A, and the range tolerances give it."""

    net: str
    value: float
    worst: Range


def gains_of(view: View, unit: str = "V") -> tuple[Gain, ...]:
    """Return the gain from each net a signal arrives at: at DC, or in mid-band where DC is cut.

    unit  "V": V/V from voltages; "A": V/A from currents
    """
    answers, network = view.answers, view.answers.network
    row = int(answers.rows[view.at("output")])
    if row < 0 or view.amplifier.designator in view.solution.forced:
        return ()
    dc = answers.dc.adjoint([row])
    mid = view.solution.mid.adjoint([row])
    gains = []
    for entry in view.solution.prepared.entries:
        if entry.unit != unit or not any(name in network.injections for name, _ in entry.drives):
            continue
        b = network.right_hand_side(entry.drives)
        at_dc, at_mid = float((dc[0] @ b).real), complex(mid[0] @ b)
        passes = abs(at_dc) > 1e-3 * abs(at_mid)
        gain = at_dc if passes else abs(at_mid)
        if abs(gain) <= 1e-6:
            continue
        spread = view.solution.spread
        if passes:
            found = Answer(
                dc[0], answers.dc, answers.dc.forward(b), 0j, complex(at_dc), signed=True
            )
        else:
            solved, s = view.solution.mid, 2j * np.pi * MID_HERTZ
            found = Answer(mid[0], solved, solved.forward(b), s, at_mid)
        gains.append(Gain(entry.label, gain, ends(spread.elements, spread.tolerances, [found])))
    return tuple(gains)


def noise_gain_span(view: View, loop: Loop) -> Range:
    """Return the noise gain at DC over the tolerances of the stage's own network.

    Unknown where another amplifier's gain stands in its loop.
    """
    passive, amplifier = view.solution.passive, view.amplifier
    branch = passive.network.outputs.get(amplifier.designator, -1)
    nominal = loop.noise_gain_dc
    if nominal is None or loop.holds or branch < 0:
        return Range()
    rows = [passive.network.row(amplifier.minus), passive.network.row(amplifier.plus)]
    adjoint = passive.dc.adjoint(rows)
    spread = view.solution.spread
    unit = passive.network.right_hand_side([(amplifier.designator, 1.0)])
    across = adjoint[0] - adjoint[1]
    found = Answer(
        across, passive.dc, passive.dc.forward(unit), 0j, complex(across[branch]), signed=True
    )
    beta = ends(spread.elements, spread.tolerances, [found])
    if beta.low is None or beta.high is None or beta.low <= 0:
        return Range()
    return Range(1.0 / beta.high, 1.0 / beta.low)


_NOTHING = 1e-12
"""V; what arithmetic leaves at an output that no signal moves."""
_LOWEST_CORNER = 1e-4
_HIGHEST_BAND, _BAND_STEPS = 1e4, 17
"""How far above a signal its pass band is looked for, and in how many steps."""
_HALVINGS = 24
_STEP = 1e-3
"""Share of a frequency over which a slope is taken."""


def high_pass_of(view: View) -> tuple[float | None, Range]:
    """Return the -3 dB corner that coupling capacitors give on the way to the output, and its ends.

    Against the pass band, which may lie above the signal: a coupling far too small takes most of
    it. None where no signal is stated, or where the stage passes DC.
    """
    q = view.at("output")
    moved = [t for t in view.tones if t.peaks[q] > 0 and t.hertz[q] > 0]
    row = int(view.answers.rows[q])
    if not moved or row < 0 or not is_ac_coupled(view):
        return None, Range()
    tone = max(moved, key=lambda t: float(t.peaks[q]))
    network = view.answers.network
    b = network.right_hand_side(tone.tone.drives)

    def size(hertz: float) -> float:
        return abs(complex(factor(network, hertz).forward(b)[row]))

    above = np.geomspace(float(tone.hertz[q]), _HIGHEST_BAND * float(tone.hertz[q]), _BAND_STEPS)
    sizes = [size(float(hertz)) for hertz in above]
    largest = max(sizes)
    if largest < _NOTHING:
        return None, Range()
    target = largest / np.sqrt(2.0)
    low, high = _LOWEST_CORNER, float(above[sizes.index(largest)])
    top = high
    if size(low) >= target:
        return None, Range()
    for _ in range(_HALVINGS):
        middle = float(np.sqrt(low * high))
        low, high = (middle, high) if size(middle) < target else (low, middle)
    corner = float(np.sqrt(low * high))
    return corner, _corner_span(view, b, row, corner, top)


def _corner_span(view: View, b: Complex, row: int, corner: float, top: float) -> Range:
    """Return the ends of a corner: where the response falls against that at `top`, hertz.

    On the logarithms of frequency and parameters, on which a product of powers is a plane.
    """
    network = view.answers.network
    elements, delta = view.solution.spread.elements, view.solution.spread.tolerances

    def response(hertz: float) -> tuple[float, Real]:
        """Return ln |H| and its derivatives."""
        solved = factor(network, hertz)
        x, adjoint = solved.forward(b), solved.adjoint([row])
        pulls = (elements.pulls(adjoint, x, 2j * np.pi * hertz)[0] / x[row]).real
        return float(np.log(abs(x[row]))), pulls

    (here, pull), (_, against) = response(corner), response(top)
    beyond, _ = response(corner * (1.0 + _STEP))
    slope = (beyond - here) / np.log1p(_STEP)
    if slope <= 0:
        return Range()
    pulls = -(pull - against) / slope
    more, less = pulls * np.log1p(delta), pulls * np.log1p(-delta)
    up, down = np.maximum(more, less).sum(), np.minimum(more, less).sum()
    return Range(corner * float(np.exp(down)), corner * float(np.exp(up)))
