"""Demand against limit on one side of one quantity, nominal and at the corners."""

from collections.abc import Callable

import numpy as np

from railguard.analysis.available import Reach
from railguard.analysis.corners import Flags, Spread
from railguard.analysis.network import Real
from railguard.analysis.stage import Bound, Pair
from railguard.words import Basis

CULPRITS = 3

Exact = Callable[[Real], tuple[float, float]]
"""Solves at given shares of all tolerances: (demand, how far the limit has moved)."""


def bound(
    *,
    upper: bool,
    demand: float,
    level: float,
    span: float,
    reach: Reach,
    absolute: float | None,
    absolute_basis: Basis,
    demand_basis: Basis,
    spread: Spread,
    moves: Real,
    limit_moves: Real,
    unsure: float = 0.0,
    exact: Exact | None = None,
) -> Bound:
    """Build a bound.

    unsure       how far the demand may be off by what is assumed, in its unit
    exact        solves a corner anew instead of following the derivatives to it

    moves        derivative of the demand's end to every parameter, shape (parameters,)
    limit_moves  the same of the limit: what moves both together leaves the margin alone
    """
    limit = reach.best
    stated = default = None
    culprits: tuple[str, ...] = ()
    if limit is not None and len(spread.delta):
        if spread.stated.any():
            stated = _corner(upper, demand, limit, moves, limit_moves, spread, spread.stated, exact)
        everything = np.ones(len(spread.delta), dtype=bool)
        default = _corner(upper, demand, limit, moves, limit_moves, spread, everything, exact)
        weight = np.abs(limit_moves - moves) * spread.delta
        order = np.argsort(-weight)[:CULPRITS]
        culprits = tuple(dict.fromkeys(spread.parameters[i].name for i in order if weight[i] > 0))
    return Bound(
        upper=upper,
        demand=demand,
        level=level,
        span=span,
        typical=reach.typical,
        guaranteed=reach.guaranteed,
        absolute=absolute,
        stated=stated,
        default=default,
        typical_basis=reach.typical_basis,
        guaranteed_basis=reach.guaranteed_basis,
        absolute_basis=absolute_basis,
        demand_basis=demand_basis,
        culprits=culprits,
        condition=reach.condition,
        unsure=unsure,
    )


def _corner(
    upper: bool,
    demand: float,
    limit: float,
    moves: Real,
    limit_moves: Real,
    spread: Spread,
    mask: Flags,
    exact: Exact | None,
) -> Pair:
    """Return demand and limit where tolerances leave the least room between them."""
    room = (limit_moves - moves) if upper else (moves - limit_moves)
    if exact is not None:
        reached, moved = exact(-np.sign(room) * mask)
        return Pair(reached, limit + moved)
    shift = -np.sign(room) * spread.delta * mask
    return Pair(float(demand + moves @ shift), float(limit + limit_moves @ shift))
