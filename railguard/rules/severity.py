"""How bad: one table for every quantity, by what is broken and by how good the evidence is."""

from typing import Literal

import msgspec

from railguard.analysis.stage import Bound
from railguard.words import SEVERITIES, Basis, Severity

Broken = Literal["absolute", "typical", "guaranteed", "default-corner", "reserve"]
Evidence = Literal["stated", "memory", "assumed"]

TABLE: dict[Broken, dict[Evidence, Severity]] = {
    "absolute": {"stated": "critical", "memory": "critical", "assumed": "minor"},
    "typical": {"stated": "critical", "memory": "major", "assumed": "minor"},
    "guaranteed": {"stated": "major", "memory": "minor", "assumed": "minor"},
    "default-corner": {"stated": "minor", "memory": "minor", "assumed": "remark"},
    "reserve": {"stated": "minor", "memory": "minor", "assumed": "remark"},
}

SMALL_SHARE = 0.02
"""An overrun below this share of the demanded span is `minor`."""
MEDIUM_SHARE = 0.10
"""An overrun below this share of the demanded span is at most `major`."""


def evidence(*bases: Basis) -> Evidence:
    """Return the weakest of some bases as a column of the table."""
    if any(basis in ("assumed", "practice") for basis in bases):
        return "assumed"
    return "memory" if "memory" in bases else "stated"


class Breach(msgspec.Struct, frozen=True):
    """A limit that is broken: which, by what numbers, and how bad that is."""

    broken: Broken
    severity: Severity
    demand: float
    limit: float
    margin: float
    share: float | None
    basis: tuple[Basis, ...]
    at_corner: bool


def _room(bound: Bound, demand: float, limit: float) -> float:
    return limit - demand if bound.upper else demand - limit


def soften(severity: Severity, overrun: float, span: float | None, level_outside: bool) -> Severity:
    """Soften by size: a small overrun at one end of a span is no catastrophe.

    overrun        positive, in the unit of the span
    level_outside  True where the DC level itself is beyond the limit: no softening then
    """
    if level_outside or not span:
        return severity
    share = overrun / span
    cap: Severity = "critical"
    if share < SMALL_SHARE:
        cap = "minor"
    elif share < MEDIUM_SHARE:
        cap = "major"
    return max(severity, cap, key=SEVERITIES.index)


def breach(bound: Bound, reserve: float = 0.0, softened: bool = True) -> Breach | None:
    """Find the worst limit a quantity breaks, or None where it keeps them all.

    reserve  room wanted at the guaranteed (else typical) limit at nominal, in the quantity's unit
    """
    if bound.demand is None:
        return None
    found: list[Breach] = []

    def judge(
        broken: Broken, demand: float, limit: float | None, bases: tuple[Basis, ...], corner: bool
    ) -> None:
        if limit is None:
            return
        wanted = reserve if broken == "reserve" else 0.0
        room = _room(bound, demand, limit)
        if room - wanted >= -1e-9 * max(abs(limit), abs(demand)):
            return
        severity = TABLE[broken][evidence(*bases)]
        if softened and broken in ("absolute", "typical", "guaranteed"):
            level = bound.level
            outside = level is not None and _room(bound, level, limit) < 0
            severity = soften(severity, -room, bound.span, outside)
        share = room / bound.span if bound.span else None
        kept = tuple(dict.fromkeys(bases))
        found.append(Breach(broken, severity, demand, limit, room, share, kept, corner))

    typical = (bound.demand_basis, bound.typical_basis)
    guaranteed = (bound.demand_basis, bound.guaranteed_basis)
    judge("absolute", bound.demand, bound.absolute, (bound.demand_basis, "netlist"), False)
    judge("typical", bound.demand, bound.typical, typical, False)
    judge("guaranteed", bound.demand, bound.guaranteed, guaranteed, False)
    if bound.stated is not None:
        judge("guaranteed", bound.stated.demand, bound.stated.limit, guaranteed, True)
    if bound.default is not None:
        judge("default-corner", bound.default.demand, bound.default.limit, guaranteed, True)
    if reserve > 0:
        best = bound.guaranteed if bound.guaranteed is not None else bound.typical
        judge("reserve", bound.demand, best, guaranteed, False)
    return min(found, key=lambda b: SEVERITIES.index(b.severity), default=None)
