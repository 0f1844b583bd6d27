"""Which signals reach a stage: its gains, its band, whether they come through a capacitor."""

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
    """Tell whether every signal that reaches the output is blocked at DC."""
    moved = [
        (t, float(t.peaks[view.at("output")]))
        for t in view.answers.tones
        if t.peaks[view.at("output")] > 0
    ]
    if not moved:
        return False
    rows = [int(view.answers.rows[view.at("output")])]
    adjoint = view.answers.dc.adjoint(rows)[0]
    for tone, peak in moved:
        b = view.answers.network.right_hand_side(tone.tone.drives)
        if abs(complex(adjoint @ b)) > 1e-3 * peak:
            return False
    return True


def gains_of(view: View) -> tuple[tuple[str, float], ...]:
    """Return the gain from each net a signal arrives at: at DC, or in mid-band where DC is cut."""
    answers, network = view.answers, view.answers.network
    row = int(answers.rows[view.at("output")])
    if row < 0 or view.amplifier.designator in view.solution.forced:
        return ()
    dc = answers.dc.adjoint([row])[0]
    mid = view.solution.mid.adjoint([row])[0]
    gains = []
    for net, name in dict.fromkeys(view.solution.prepared.entries):
        if name not in network.injections or network.injections[name].row < 0:
            continue
        b = network.right_hand_side([(name, 1.0)])
        at_dc, at_mid = float((dc @ b).real), complex(mid @ b)
        gain = at_dc if abs(at_dc) > 1e-3 * abs(at_mid) else abs(at_mid)
        if abs(gain) > 1e-6:
            gains.append((net, gain))
    return tuple(gains)
