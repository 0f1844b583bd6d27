"""How bad: one table for every quantity, by what is broken and by how good the evidence is."""

from collections.abc import Iterator
from typing import Literal

import msgspec

from railguard.analysis.bound import Bound
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
AT_REST = 1e-3
"""A level closer to the rail than this share of the span rests on the rail."""
ROUNDING = 1e-9
"""Shares of the numbers compared below which a difference is one of arithmetic only."""


def evidence(*bases: Basis) -> Evidence:
    """Return the weakest of some bases as a column of the table."""
    if any(basis in ("assumed", "practice") for basis in bases):
        return "assumed"
    return "memory" if "memory" in bases else "stated"


def capped(severity: Severity, cap: Severity) -> Severity:
    """Return `severity`, but nothing worse than `cap`."""
    return max(severity, cap, key=SEVERITIES.index)


class Breach(msgspec.Struct, frozen=True):
    """A limit that is broken: which, by what numbers, and how bad that is.

    margin  room, negative where the limit itself is passed; `share` of the demanded span
    basis   of demand and limit, without repeats; `limit_basis` of the limit alone
    """

    broken: Broken
    severity: Severity
    demand: float
    limit: float
    margin: float
    share: float | None
    basis: tuple[Basis, ...]
    limit_basis: Basis
    at_corner: bool


def gravity(broken: Breach) -> tuple[int, int, float]:
    """Sort key of breaches: the worst severity first, then the gravest limit, then the margin."""
    return SEVERITIES.index(broken.severity), list(TABLE).index(broken.broken), broken.margin


class _Check(msgspec.Struct, frozen=True):
    """One demand against one limit."""

    broken: Broken
    demand: float
    limit: float
    limit_basis: Basis
    at_corner: bool = False
    wanted: float = 0.0


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
    if share < SMALL_SHARE:
        return capped(severity, "minor")
    if share < MEDIUM_SHARE:
        return capped(severity, "major")
    return severity


def breach(
    bound: Bound,
    reserve: float = 0.0,
    *,
    scale: float | None = None,
    cap: Severity = "critical",
) -> Breach | None:
    """Find the worst limit a quantity breaks, or None where it keeps them all.

    reserve  room wanted at the guaranteed (else typical) limit at nominal, in the quantity's unit
    scale    what an overrun is measured against where the demand has no span and rests at zero
             scale, exactly on the lower rail: the total supply. None: nothing rests there.
    cap      the worst severity allowed: `minor` for a device nobody knows
    """
    found = [
        _judged(bound, check, scale, cap)
        for check in _checks(bound, reserve)
        if _fails(bound, check)
    ]
    return min(found, key=lambda b: SEVERITIES.index(b.severity), default=None)


def far_beyond(bound: Bound, broken: Breach, factor: float) -> Breach:
    """Return a breach as one of a typical limit where none is listed and the excess is great.

    factor  multiple of a guaranteed limit beyond which no device of the kind is expected to go
    """
    only_guaranteed = bound.typical is None and broken.broken == "guaranteed"
    if not only_guaranteed or broken.at_corner or broken.demand <= factor * broken.limit:
        return broken
    severity = TABLE["typical"][evidence(*broken.basis)]
    return msgspec.structs.replace(broken, severity=severity)


def _checks(bound: Bound, reserve: float) -> Iterator[_Check]:
    """Yield what is to be compared, the gravest limit first: it leads among equals."""
    if bound.demand is None:
        return
    demand = bound.demand
    best, best_basis = bound.best, bound.best_basis
    if bound.absolute is not None:
        yield _Check("absolute", demand, bound.absolute, bound.absolute_basis)
    if bound.typical is not None:
        yield _Check("typical", demand, bound.typical, bound.typical_basis)
    if bound.guaranteed is not None:
        yield _Check("guaranteed", demand, bound.guaranteed, bound.guaranteed_basis)
    if (stated := bound.stated) is not None:
        yield _Check("guaranteed", stated.demand, stated.limit, best_basis, at_corner=True)
    if (default := bound.default) is not None:
        yield _Check("default-corner", default.demand, default.limit, best_basis, at_corner=True)
    if reserve > 0 and best is not None:
        yield _Check("reserve", demand, best, best_basis, wanted=reserve)


def _fails(bound: Bound, check: _Check) -> bool:
    slack = ROUNDING * max(abs(check.limit), abs(check.demand), bound.span or 0.0)
    return _room(bound, check.demand, check.limit) - check.wanted < -slack


def _judged(bound: Bound, check: _Check, scale: float | None, cap: Severity) -> Breach:
    room = _room(bound, check.demand, check.limit)
    bases = ("assumed" if 0 < -room <= bound.unsure else bound.demand_basis, check.limit_basis)
    severity = TABLE[check.broken][evidence(*bases)]
    if not check.at_corner:
        resting = _rests_at_zero(bound, scale)
        span = bound.span or (scale if resting else None)
        severity = soften(severity, -room, span, _level_outside(bound, check.limit) and not resting)
    return Breach(
        check.broken,
        capped(severity, cap),
        check.demand,
        check.limit,
        room,
        room / bound.span if bound.span else None,
        tuple(dict.fromkeys(bases)),
        check.limit_basis,
        check.at_corner,
    )


def _level_outside(bound: Bound, limit: float) -> bool:
    return bound.level is not None and _room(bound, bound.level, limit) < 0


def _rests_at_zero(bound: Bound, scale: float | None) -> bool:
    """Tell whether the level stands on the lower rail: a sensor at zero on a single supply."""
    if scale is None or bound.upper or bound.level is None or bound.absolute is None:
        return False
    return abs(bound.level - bound.absolute) <= AT_REST * (bound.span or scale)
