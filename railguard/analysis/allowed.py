"""The largest input that keeps every stage inside its ranges, and what limits it."""

from collections.abc import Sequence

import numpy as np

from railguard.analysis.network import Real
from railguard.analysis.solution import Solution
from railguard.analysis.stage import Allowed, Stage

WEAK = 1e-6
"""A gain below this is no connection."""


def allowed_inputs(solution: Solution, stages: Sequence[Stage]) -> dict[str, Allowed]:
    """Return, by designator, the largest input that keeps every stage inside its ranges.

    The input is moved alone, all other signals at their DC level. Guaranteed limits count, typical
    ones where nothing is guaranteed. Where the input is cut off at DC, its excursion in mid-band
    counts.
    """
    result: dict[str, Allowed] = {}
    answers, network = solution.answers, solution.answers.network
    rows = [int(r) for r in answers.rows]
    dc = answers.dc.adjoint(rows)
    mid = solution.mid.adjoint(rows)
    for entry in sorted(solution.prepared.entries, key=lambda e: e.rank):
        if any(name not in network.injections for name, _ in entry.drives):
            continue
        b = network.right_hand_side(entry.drives)
        at_dc, at_mid = (dc @ b).real, np.abs(mid @ b)
        low, high, limited, reached = _span(stages, solution, at_dc, at_mid, entry.level)
        if limited:
            allowed = Allowed(entry.label, low, high, limited, entry.unit)
            for designator in reached:
                result.setdefault(designator, allowed)
    return result


def _span(
    stages: Sequence[Stage],
    solution: Solution,
    at_dc: Real,
    at_mid: Real,
    start: float,
) -> tuple[float, float, str, list[str]]:
    low, high, limited, closest = -np.inf, np.inf, "", np.inf
    reached = []
    for k, stage in enumerate(stages):
        q = solution.answers.at(k, "output")
        cut = abs(at_dc[q]) <= 1e-3 * at_mid[q]
        if (at_mid[q] if cut else abs(at_dc[q])) <= WEAK or stage.output.level is None:
            continue
        reached.append(stage.designator)
        for rule, quantity, pair in (
            ("headroom-output", "output", (stage.output.low, stage.output.high)),
            ("headroom-input", "plus", (stage.inputs.low, stage.inputs.high)),
        ):
            index = solution.answers.at(k, quantity)
            gain = at_mid[index] if cut else at_dc[index]
            if abs(gain) <= WEAK:
                continue
            level = float(solution.answers.level[index])
            for bound in pair:
                limit = bound.guaranteed if bound.guaranteed is not None else bound.typical
                if limit is None:
                    continue
                steps = [(limit - level) / gain]
                if cut:
                    steps.append(-steps[0])
                for step in steps:
                    low, high, limited, closest = _tighten(
                        low, high, limited, closest, step, start, f"{rule} {stage.designator}"
                    )
    if not np.isfinite(low) or not np.isfinite(high):
        return 0.0, 0.0, "", reached
    return float(low), float(high), limited, reached


def _tighten(
    low: float, high: float, limited: str, closest: float, step: float, start: float, by: str
) -> tuple[float, float, str, float]:
    """Take one more limit in: `step` is how far the input may move towards it."""
    if step >= 0:
        high = min(high, start + step)
    else:
        low = max(low, start + step)
    if abs(step) < closest:
        return low, high, by, abs(step)
    return low, high, limited, closest
