"""Closed sets of words that several rooms share."""

from typing import Literal

Severity = Literal["critical", "major", "minor", "remark"]
"""`critical` will not work or will be damaged; `major` may fail within stated spread, or a
recommended limit is broken; `minor` poor practice, little reserve, or rests on an assumption;
`remark` worth knowing."""

SEVERITIES: tuple[Severity, ...] = ("critical", "major", "minor", "remark")
"""Worst first."""

Family = Literal[
    "supply",
    "decoupling",
    "headroom",
    "drive",
    "bias",
    "feedback",
    "dynamics",
    "stability",
    "netlist",
]

Verdict = Literal["pass", "hold", "incomplete"]

Basis = Literal["netlist", "catalogue", "memory", "practice", "assumed", "user"]
"""Where a number came from: the netlist, a data sheet seen, a data sheet from memory, common
practice, an assumption, the user's own statement."""

Kind = Literal["board", "bench", "unstated"]
"""A schematic editor's export of a product, a deck made to simulate something, or no evidence."""

Use = Literal["linear", "comparator", "oscillator", "unused"]


def worst(severities: list[Severity]) -> Severity | None:
    """Return the worst of some severities, or None where there are none."""
    return min(severities, key=SEVERITIES.index, default=None)


def at_or_above(severity: Severity, level: Severity) -> bool:
    """Tell whether `severity` is as bad as `level` or worse."""
    return SEVERITIES.index(severity) <= SEVERITIES.index(level)
