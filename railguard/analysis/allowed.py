"""The largest input that keeps every stage inside its ranges, and what limits it."""

from collections.abc import Sequence

import msgspec
import numpy as np

from railguard.analysis.equations import Complex, Real
from railguard.analysis.solution import Solution
from railguard.analysis.stage import Allowed, Stage

WEAK = 1e-6
"""A gain below this is no connection."""


class _Room(msgspec.Struct):
    """How far an input may move, and what stops it first."""

    low: float = -np.inf
    high: float = np.inf
    limited: str = ""
    closest: float = np.inf

    def tighten(self, room: float, start: float, upper: bool, by: str) -> None:
        """Take one more limit in.

        room   how far the input may move towards it; below zero where it is passed at rest
        upper  whether that is the way up
        """
        if upper:
            self.high = min(self.high, start + room)
        else:
            self.low = max(self.low, start - room)
        if room < self.closest:
            self.limited, self.closest = by, room


def allowed_inputs(solved: Sequence[tuple[Solution, Sequence[Stage]]]) -> dict[str, Allowed]:
    """Return, by designator, the largest input that keeps every stage inside its ranges.

    The input is moved alone, all other signals at their DC level. Guaranteed limits count, typical
    ones where nothing is guaranteed. Where the input is cut off at DC, its excursion in mid-band
    counts.

    solved  the parts of the circuit with their stages: one input may reach several
    """
    result: dict[str, Allowed] = {}
    if not solved:
        return result
    factors = [_factors(solution) for solution, _ in solved]
    for entry in sorted(solved[0][0].prepared.entries, key=lambda e: e.rank):
        room, reached = _Room(), []
        for (solution, stages), (dc, mid) in zip(solved, factors, strict=True):
            network = solution.answers.network
            if not any(name in network.injections for name, _ in entry.drives):
                continue
            b = network.right_hand_side(entry.drives)
            at_dc, at_mid = (dc @ b).real, np.abs(mid @ b)
            here = _tightened(room, stages, solution, at_dc, at_mid, entry.level)
            if here and solution.boost.working:
                _transistors_kept(room, solution, solution.answers.dc.forward(b).real, entry.level)
            reached += here
        if room.limited and np.isfinite(room.low) and np.isfinite(room.high):
            low, high = float(room.low), float(room.high)
            if low > high:
                continue  # no input keeps every stage in range
            allowed = Allowed(entry.label, low, high, room.limited, entry.unit)
            for designator in reached:
                result.setdefault(designator, allowed)
    return result


def _factors(solution: Solution) -> tuple[Complex, Complex]:
    rows = [int(r) for r in solution.answers.rows]
    return solution.answers.dc.adjoint(rows), solution.mid.adjoint(rows)


OUT_OF_SIGHT = 1e6
"""Volts or amperes of an input from which on a transistor's limit is none of its own."""


def _transistors_kept(room: _Room, solution: Solution, moved: Real, start: float) -> None:
    """Take in what the transistors of a part need to go on working.

    moved  what a unit of the input makes of the DC solution, shape (unknowns,)
    """
    x = solution.answers.x
    for one in solution.boost.working:
        for limit in one.limits:
            left = sum(unit * float(x[row]) for row, unit in limit.entries) - limit.least
            gain = sum(unit * float(moved[row]) for row, unit in limit.entries)
            if abs(gain) * OUT_OF_SIGHT > abs(left):
                by = f"{one.carried.designator}, which {limit.why}"
                room.tighten(left / abs(gain), start, gain < 0, by)


def _tightened(
    room: _Room,
    stages: Sequence[Stage],
    solution: Solution,
    at_dc: Real,
    at_mid: Real,
    start: float,
) -> list[str]:
    """Take in the limits of one part's stages; return the stages the input reaches."""
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
                if bound.best is None:
                    continue
                step = (bound.best - level) / gain
                upper = bound.upper == (gain > 0)
                for way in (True, False) if cut else (upper,):
                    left = step if upper else -step
                    room.tighten(left, start, way, f"{rule} {stage.designator}")
    return reached
