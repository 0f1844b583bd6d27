"""The input side of a stage: DC paths, common-mode range, differential input."""

from typing import TypedDict

from railguard.analysis.available import Reach, input_reach
from railguard.analysis.bound import Bound, Range
from railguard.analysis.bounds import bound
from railguard.analysis.rail import Supply
from railguard.analysis.stage import Inputs, Part, Pin, Unknown
from railguard.analysis.surroundings import divider_at, series_resistance
from railguard.analysis.view import View


def inputs_of(
    view: View,
    supply: Supply,
    rails: frozenset[str],
    working: bool,
    unknown: dict[Part, Unknown],
) -> Inputs:
    """Return both inputs: their pins, and the common-mode range asked for and allowed.

    rails    nets that feed supply pins
    working  False where no loop holds the inputs together: then both count
    unknown  filled with the reasons for what stays open
    """
    plus, minus = (_pin(view, quantity, rails) for quantity in ("plus", "minus"))
    device = view.amplifier.match.device
    known = view.known("plus") and plus.state != "floating"
    why = view.why("plus")
    if why is not None:
        unknown["input"] = why
    for pin in (plus, minus):
        if pin.state == "open":
            unknown["bias"] = Unknown(
                f"net {pin.net} leaves the sheet at {', '.join(pin.path[:3])}",
                f'[signals] "{pin.net}" or [nets] "{pin.net}"',
            )
    low, high = view.range("plus")
    level = view.level("plus")
    if not working and view.known("minus"):
        other = view.range("minus")
        low, high = min(low, other[0]), max(high, other[1])
    bounds, reaches = {}, {}
    q, spread = view.at("plus"), view.solution.spread
    for upper in (True, False):
        rail = supply.positive if upper else supply.negative
        if supply.positive is None or supply.negative is None or rail is None or not known:
            bounds[upper] = Bound(upper=upper, demand=(high if upper else low) if known else None)
            reaches[upper] = Reach(None, None, "practice", "practice")
            continue
        reach = input_reach(device, supply.positive, supply.negative, upper)
        reaches[upper] = reach
        pin_q = view.at("positive" if upper else "negative")
        bounds[upper] = bound(
            upper=upper,
            demand=high if upper else low,
            level=level,
            span=high - low,
            reach=reach,
            absolute=_beyond(rail, reach, upper),
            absolute_basis=supply.basis,
            demand_basis=view.basis("plus"),
            spread=spread,
            moves=spread.high[q] if upper else spread.low[q],
            limit_moves=spread.high[pin_q],
            exact=view.exact("plus", upper, "positive" if upper else "negative"),
        )
    return Inputs(
        plus=plus,
        minus=minus,
        demand=Range(low, high) if known else Range(),
        worst=view.worst("plus") if known else Range(),
        available=Range(reaches[False].typical, reaches[True].typical),
        guaranteed=Range(reaches[False].guaranteed, reaches[True].guaranteed),
        high=bounds[True],
        low=bounds[False],
        **_differential(view) if not working and known else {},
    )


def _beyond(rail: float, reach: Reach, upper: bool) -> float:
    """Return the rail, or the listed range where the sheet allows inputs beyond the rail."""
    listed = [v for v in (reach.typical, reach.guaranteed) if v is not None]
    return max([rail, *listed]) if upper else min([rail, *listed])


class _Difference(TypedDict, total=False):
    differential: float
    differential_worst: Range


def _differential(view: View) -> _Difference:
    """Return the most that stands between the inputs of a stage no loop holds, and its ends."""
    plus, minus = view.range("plus"), view.range("minus")
    spread = view.solution.spread
    p, m = view.at("plus"), view.at("minus")
    ways = (
        (abs(plus[1] - minus[0]), spread.high[p] - spread.low[m]),
        (abs(minus[1] - plus[0]), spread.high[m] - spread.low[p]),
    )
    most, moves = max(ways, key=lambda way: way[0])
    reach = [float(spread.reach(moved)) for _, moved in ways]
    own = float(spread.reach(moves))
    return {
        "differential": most,
        "differential_worst": Range(
            max(most - own, 0.0),
            max(value + moved for (value, _), moved in zip(ways, reach, strict=True)),
        ),
    }


def _pin(view: View, quantity: str, rails: frozenset[str]) -> Pin:
    solution, amplifier = view.solution, view.amplifier
    net = amplifier.plus if quantity == "plus" else amplifier.minus
    path = solution.dc_map.path(net, amplifier.designator)
    told = path.state != "floating" and view.known(quantity)
    return Pin(
        net=net,
        state=path.state,
        resistance=None if path.state == "floating" else solution.passive.resistance(net),
        level=view.level(quantity) if told else None,
        demand=Range(*view.range(quantity)) if told else Range(),
        path=path.via,
        series=series_resistance(net, solution.dc_map),
        divider=divider_at(net, solution.ways, rails),
    )
