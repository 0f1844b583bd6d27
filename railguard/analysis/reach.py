"""Which signals reach a stage: its gains, its band, whether they come through a capacitor."""

import numpy as np

from railguard.analysis.solve import factor
from railguard.analysis.stage import Range
from railguard.analysis.view import View


def top_of(view: View) -> float | None:
    """Return the highest stated frequency that reaches the output, hertz."""
    q = view.at("output")
    tops = [t.tone.top for t in view.answers.tones if t.peaks[q] > 0 and t.tone.top > 0]
    return max(tops, default=None)


def band_of(view: View) -> Range:
    """Return the lowest and highest stated frequency that reaches the output, hertz."""
    q = view.at("output")
    reached = [t.tone.frequencies for t in view.answers.tones if t.peaks[q] > 0]
    if not reached:
        return Range()
    return Range(min(min(f) for f in reached), max(max(f) for f in reached))


def is_ac_coupled(view: View) -> bool:
    """Tell whether every signal that reaches the output is blocked at DC.

    What has no stated amplitude (a probe, a net that leaves the sheet) counts where nothing else
    moves the output.
    """
    moved = [
        (t, float(t.peaks[view.at("output")]))
        for t in view.answers.tones
        if t.peaks[view.at("output")] > 0
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


def gains_of(view: View, unit: str = "V") -> tuple[tuple[str, float], ...]:
    """Return the gain from each net a signal arrives at: at DC, or in mid-band where DC is cut.

    unit  "V": V/V from voltages; "A": V/A from currents
    """
    answers, network = view.answers, view.answers.network
    row = int(answers.rows[view.at("output")])
    if row < 0 or view.amplifier.designator in view.solution.forced:
        return ()
    dc = answers.dc.adjoint([row])[0]
    mid = view.solution.mid.adjoint([row])[0]
    gains = []
    for entry in view.solution.prepared.entries:
        if entry.unit != unit or not any(name in network.injections for name, _ in entry.drives):
            continue
        b = network.right_hand_side(entry.drives)
        at_dc, at_mid = float((dc @ b).real), complex(mid @ b)
        gain = at_dc if abs(at_dc) > 1e-3 * abs(at_mid) else abs(at_mid)
        if abs(gain) > 1e-6:
            gains.append((entry.label, gain))
    return tuple(gains)


_LOWEST_CORNER = 1e-4
_HIGHEST_BAND, _BAND_STEPS = 1e4, 17
"""How far above a signal its pass band is looked for, and in how many steps."""
_HALVINGS = 24


def high_pass_of(view: View) -> float | None:
    """Return the -3 dB corner that coupling capacitors give on the way to the output, hertz.

    Against the pass band, which may lie above the signal: a coupling far too small takes most of
    it. None where no signal is stated, or where the stage passes DC.
    """
    q = view.at("output")
    moved = [t for t in view.answers.tones if t.peaks[q] > 0 and t.hertz[q] > 0]
    row = int(view.answers.rows[q])
    if not moved or row < 0 or not is_ac_coupled(view):
        return None
    tone = max(moved, key=lambda t: float(t.peaks[q]))
    network = view.answers.network
    b = network.right_hand_side(tone.tone.drives)

    def size(hertz: float) -> float:
        return abs(complex(factor(network, hertz).forward(b)[row]))

    above = np.geomspace(float(tone.hertz[q]), _HIGHEST_BAND * float(tone.hertz[q]), _BAND_STEPS)
    sizes = [size(float(hertz)) for hertz in above]
    largest = max(sizes)
    target = largest / np.sqrt(2.0)
    low, high = _LOWEST_CORNER, float(above[sizes.index(largest)])
    if size(low) >= target:
        return None
    for _ in range(_HALVINGS):
        middle = float(np.sqrt(low * high))
        low, high = (middle, high) if size(middle) < target else (low, middle)
    return float(np.sqrt(low * high))
