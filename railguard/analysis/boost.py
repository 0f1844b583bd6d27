"""Transistors that loops drive: boosted outputs, current sinks and sources.

Each is taken for a straight line (`analysis.lines`), as far as it works so (`analysis.lined`). One
that stops conducting, saturates, or whose current nothing but its own gain sets is left out again,
and what rests on it has no number.
"""

from collections.abc import Sequence

from railguard.analysis.lined import Boost, Lined, Part, total, with_lines
from railguard.analysis.lines import (
    Carried,
    Line,
    Pair,
    current,
    first_line,
    names_of,
    paired,
    touching,
)
from railguard.analysis.network import Network
from railguard.analysis.ranges import Answers, answer, standing
from railguard.analysis.transistors import transistors_of

MOST = 32
"""Transistors in one part up to which they are looked at: beyond, it is no op-amp stage."""
ROUNDS = 6
"""How often transistors are left out and the rest solved again."""
STEPS = 20
"""Steps in which a curve and its current find each other."""
SETTLED_VOLTS = 1e-4


def boosted(part: Part, bent: bool) -> tuple[Network, Answers, Boost]:
    """Solve a part with those of its transistors that work as straight lines.

    bent  whether the part has transistors

    Raises  SolveError
    """
    found, left = transistors_of(part.prepared.elements, part.models) if bent else ((), {})
    if len(found) > MOST:
        left |= {one.designator: "which is one of very many" for one in found}
        found = ()
    chosen = paired(found)
    idle: frozenset[str] = frozenset()
    for _ in range(ROUNDS):
        if not chosen:
            break
        lined = Lined(part, _settled(part, chosen))
        halves = lined.one_sided()
        if halves:
            idle = idle.union(other.designator for _, other in halves.values())
            chosen = [halves[one][0] if one in halves else one for one in chosen]
            continue
        failing = lined.failing()
        if not failing:
            return lined.network, lined.answers, lined.boost(left, idle)
        left |= {name: why for one, why in failing.items() for name in names_of(one)}
        chosen = [one for one in chosen if one not in failing]
    answers = answer(part.network, part.amplifiers, part.prepared, part.draws, part.held)
    return part.network, answers, Boost(left=left)


def _settled(part: Part, chosen: Sequence[Carried]) -> dict[Carried, Line]:
    """Return the lines that touch the transistors' curves where they stand at DC."""
    lines = {one: first_line(one) for one in chosen}
    for _ in range(STEPS):
        solvable = with_lines(part, lines)
        network = solvable.network
        x = standing(network, solvable.prepared, part.draws, solvable.held).x
        moved = {}
        for one, line in lines.items():
            amps = total(current(one, line, network), x).real
            sign = 0 if isinstance(one, Pair) else one.sign
            moved[one] = touching(one, line, sign * amps)
        step = max(abs(moved[one].volts - lines[one].volts) for one in chosen)
        lines = moved
        if step < SETTLED_VOLTS:
            break
    return lines
