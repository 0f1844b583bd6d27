"""Demand against limit on one side of one quantity, nominal and at the corners."""

from collections.abc import Callable

import numpy as np

from railguard.analysis.available import Reach
from railguard.analysis.bound import Bound, Pair
from railguard.analysis.corners import Spread
from railguard.analysis.equations import Real
from railguard.words import Basis

CULPRITS = 3
ALIKE = 9
"""Decimals of the heaviest weight to which two are compared."""
TINY = 1e-300

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
        room = limit_moves - moves
        away = np.sign(room) if not upper else -np.sign(room)

        def corner(signs: Real) -> Pair:
            """Return demand and limit where tolerances leave the least room between them."""
            if exact is not None:
                reached, moved = exact(signs)
                return Pair(reached, limit + moved)
            shift = signs * spread.delta
            return Pair(float(demand + moves @ shift), float(limit + limit_moves @ shift))

        if spread.any_stated:
            stated = corner(away * spread.stated)
        default = corner(away)
        weight = np.abs(room) * spread.delta
        # Two that weigh the same stand in the order of the netlist, whatever rounding does.
        ranked = np.round(weight / max(weight.max(), TINY), ALIKE)
        order = np.argsort(-ranked, kind="stable")[:CULPRITS]
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
