"""Problems in numbers a reader can take."""

from collections import Counter

import msgspec

from railguard.notices import Problem

MOST_ALIKE = 200
"""Problems of one rule that are told one by one."""


def not_drowned(problems: list[Problem]) -> tuple[Problem, ...]:
    """Leave out what is told too often to be read, and say how much that is."""
    times: Counter[str] = Counter()
    kept = []
    for problem in problems:
        times[problem.rule] += 1
        if times[problem.rule] <= MOST_ALIKE:
            kept.append(problem)
    for rule, count in times.items():
        if count > MOST_ALIKE:
            last = next(p for p in reversed(problems) if p.rule == rule)
            kept.append(
                msgspec.structs.replace(
                    last,
                    message=f"{count - MOST_ALIKE:,} more of these are not listed, up to this one: "
                    f"{last.message}",
                )
            )
    return tuple(kept)
