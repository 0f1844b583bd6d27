"""Whether supplies are inside what the device allows, and stand where they say."""

from collections.abc import Iterator

from railguard.analysis.bound import Bound, Pair
from railguard.analysis.rail import Package, Rail
from railguard.analysis.stage import Design, Stage
from railguard.devices.model import Device
from railguard.notices import NotChecked
from railguard.rules.compose import (
    OWN_TABLE,
    finding,
    first_unknown,
)
from railguard.rules.finding import Finding
from railguard.rules.protocol import Limit, Limits, Outcome, Rule
from railguard.rules.severity import TABLE, Breach, breach, capped, evidence
from railguard.rules.supply.pins import (
    no_channel,
    pin_nets,
    supplies_of,
    supply_basis,
    unstated,
)
from railguard.rules.wording import NO_SOURCE, cited, listed, origin, rails
from railguard.rules.working import NO_VOLTS
from railguard.units import percent, si
from railguard.words import Severity

CLOSE = 1e-3
"""Share of a limit within which a supply counts as on it: 4.7498 V of 4.75 V is no shortfall."""

# --- supply-range


def judge_range(package: Package, limits: Limits, design: Design) -> Iterator[Outcome]:
    """Judge a package's total supply against its recommended range and its absolute maximum."""
    supplies = supplies_of(package, design)
    if not supplies:
        yield no_channel(package, "supply-range")
    for stages in supplies:
        yield from _range(package, stages, limits, design)


def _range(
    package: Package, stages: tuple[Stage, ...], limits: Limits, design: Design
) -> Iterator[Outcome]:
    stage = stages[0]
    device, total = stage.family, stage.supply.total
    if total is None:
        yield unstated(package, stage, "supply-range")
        return
    if device is None:
        reason = first_unknown(stage, ("device",))
        why = reason.why if reason else "its device is not known"
        yield NotChecked(package.designator, "supply-range", why, OWN_TABLE)
        return
    if device.supply_low is None and device.supply_high is None and device.supply_absolute is None:
        why = f"the supply range of {stage.device} is not in the catalogue"
        yield NotChecked(package.designator, "supply-range", why, OWN_TABLE)
        return
    if total <= NO_VOLTS:
        return  # told by supply-missing or supply-reversed
    same = [s for s in design.stages if s.family == device and pin_nets(s) == pin_nets(stage)]
    if same and same[0] not in stages:
        return  # told with the first package of its kind on this pair of rails
    for bound in _range_bounds(stage, device, total):
        broken = breach(bound)
        if broken is not None and -broken.margin > CLOSE * abs(broken.limit):
            together = tuple(same) or stages
            yield _out_of_range(package, together, bound, broken, limits["far-share"])


def _range_bounds(stage: Stage, device: Device, total: float) -> tuple[Bound, Bound]:
    supply = stage.supply
    highest = _difference(supply.positive_worst.high, supply.negative_worst.low)
    lowest = _difference(supply.positive_worst.low, supply.negative_worst.high)
    top = device.supply_high if device.supply_high is not None else device.supply_absolute
    high = Bound(
        upper=True,
        demand=total,
        guaranteed=device.supply_high,
        absolute=device.supply_absolute,
        guaranteed_basis=supply_basis(device, "high"),
        # where no range is listed, the corners are held against the absolute maximum
        typical_basis=supply_basis(device, "absolute"),
        absolute_basis=supply_basis(device, "absolute"),
        demand_basis=supply.basis,
        stated=_pair(highest, top, supply.tolerance_stated),
        default=_pair(highest, top, not supply.tolerance_stated),
    )
    low = Bound(
        upper=False,
        demand=total,
        guaranteed=device.supply_low,
        guaranteed_basis=supply_basis(device, "low"),
        demand_basis=supply.basis,
        stated=_pair(lowest, device.supply_low, supply.tolerance_stated),
        default=_pair(lowest, device.supply_low, not supply.tolerance_stated),
    )
    return high, low


def _difference(high: float | None, low: float | None) -> float | None:
    return None if high is None or low is None else high - low


def _pair(demand: float | None, limit: float | None, wanted: bool) -> Pair | None:
    return Pair(demand, limit) if wanted and demand is not None and limit is not None else None


def _out_of_range(
    package: Package, stages: tuple[Stage, ...], bound: Bound, broken: Breach, far_share: float
) -> Finding:
    """Make the finding; far outside the recommended range counts like a typical limit."""
    stage, severity = stages[0], broken.severity
    if not broken.at_corner and -broken.margin > far_share * broken.limit:
        worse = TABLE["typical"][evidence(*broken.basis)]
        severity = severity if broken.broken == "absolute" else worse
    packages = list(dict.fromkeys(s.package or s.schematic for s in stages))
    subject = f"{listed(packages)} ({stage.device})"
    gets, needs = ("gets", "it needs") if len(packages) == 1 else ("get", "they need")
    what = {
        "absolute": "the absolute maximum is",
        "guaranteed": "the recommended range goes to" if bound.upper else f"{needs} at least",
    }.get(broken.broken, "the range goes to" if bound.upper else f"{needs} at least")
    corner = " at the worst corner of the rails' tolerance" if broken.at_corner else ""
    side = "above" if bound.upper else "short of it"
    message = (
        f"{subject} {gets} {si(broken.demand, 'V')} in all ({rails(stage.supply)}){corner}; {what} "
        f"{si(broken.limit, 'V')} ({origin(broken.limit_basis)}), so it is "
        f"{si(-broken.margin, 'V')} {side}."
    )
    if bound.upper:
        remedy = f"Lower the total supply to at most {si(bound.guaranteed or broken.limit, 'V')}"
    else:
        remedy = f"Raise the total supply to at least {si(broken.limit, 'V')}"
    other = "higher" if bound.upper else "lower"
    return Finding(
        rule="supply-range",
        family="supply",
        severity=severity,
        designators=tuple(s.designator for s in stages),
        nets=tuple(filter(None, (stage.supply.positive_net, stage.supply.negative_net))),
        demand=broken.demand,
        limit=broken.limit,
        margin=broken.margin,
        unit="V",
        basis=broken.basis,
        corner="worst-case" if broken.at_corner else "nominal",
        message=message,
        remedy=f"{remedy}, or fit a device made for a {other} supply.",
        source=cited(stage, broken.limit_basis),
        location=package.location,
    )


RANGE = Rule(
    name="supply-range",
    family="supply",
    looks_at="package",
    judges="The total supply of every package, nominal and at the corners of the rails' tolerance, "
    "against the recommended range and the absolute maximum.",
    reason="Below its range an amplifier's stages lose their bias; above its absolute maximum its "
    "junctions break down.",
    source="the device's data sheet",
    silent="Devices the catalogue does not know, and supplies nobody states, are listed as not "
    "checked.",
    limits=(
        Limit(
            name="far-share",
            default=0.10,
            unit="",
            meaning="share of a recommended limit beyond which it counts like a typical limit",
            source=NO_SOURCE,
        ),
    ),
    judge=judge_range,
)


# --- supply-drop


def judge_drop(rail: Rail, limits: Limits, design: Design) -> Iterator[Outcome]:
    """Judge what a rail loses in its own series elements."""
    if not rail.series:
        return
    if rail.drop is None or rail.level is None:
        why = f"the current through {listed(rail.series)} or its resistance is not known"
        yield NotChecked(rail.net, "supply-drop", why, "state what the rail is held at under load")
        return
    source_level = abs(rail.level) + abs(rail.drop)
    allowed = limits["share"] * source_level
    if abs(rail.drop) <= allowed or not source_level:
        return
    yield finding(
        "supply-drop",
        "minor",
        f"{listed(rail.series)} takes {si(abs(rail.drop), 'V')} from rail {rail.net}, "
        f"{percent(abs(rail.drop) / source_level)} of its {si(source_level, 'V')}; "
        f"{percent(limits['share'])} is the usual allowance.",
        designators=rail.packages,
        nets=(rail.net,),
        demand=abs(rail.drop),
        limit=allowed,
        margin=allowed - abs(rail.drop),
        unit="V",
        basis=(rail.basis, "practice"),
        remedy=f"Fit a smaller value for {rail.series[0]}, or a ferrite of low DC resistance.",
        source=NO_SOURCE,
        location=rail.location,
    )


DROP = Rule(
    name="supply-drop",
    family="supply",
    looks_at="rail",
    judges="The voltage lost between a rail's source and the supply pins.",
    reason="What a series resistor takes from a rail is lost to the headroom of every stage on it.",
    source=NO_SOURCE,
    silent="Where the current or the element's resistance is not known it is listed as not "
    "checked; the reduced rail itself is what headroom is judged on.",
    limits=(
        Limit(
            name="share",
            default=0.05,
            unit="",
            meaning="share of the rail that may be lost in series elements",
            source=NO_SOURCE,
        ),
    ),
    judge=judge_drop,
)


# --- supply-name-disagrees


def judge_name(rail: Rail, limits: Limits, design: Design) -> Iterator[Outcome]:
    """Judge whether a rail stands where its name says."""
    if rail.named is None or rail.level is None:
        return
    off = abs(rail.level - rail.named)
    allowed = limits["share"] * abs(rail.named)
    if off <= allowed:
        return
    severity: Severity = "major" if off > limits["far-share"] * abs(rail.named) else "minor"
    yield finding(
        "supply-name-disagrees",
        capped(severity, "minor") if evidence(rail.basis) != "stated" else severity,
        f"Net {rail.net} is named for {si(rail.named, 'V')} and stands at {si(rail.level, 'V')} "
        f"({rail.origin or origin(rail.basis)}).",
        designators=rail.packages,
        nets=(rail.net,),
        demand=rail.level,
        limit=rail.named,
        margin=allowed - off,
        unit="V",
        basis=(rail.basis, "netlist"),
        remedy="Correct the source or the net's name; everything here was judged at "
        f"{si(rail.level, 'V')}.",
        source=NO_SOURCE,
        location=rail.location,
    )


NAME_DISAGREES = Rule(
    name="supply-name-disagrees",
    family="supply",
    looks_at="rail",
    judges="Whether a rail stands at the level its net's name says.",
    reason="A net named +12V that stands at 5 V is a slip in the netlist or in the name, and one "
    "of the two misleads everybody who reads it.",
    source=NO_SOURCE,
    silent="Nets whose name carries no level with a V or a sign.",
    limits=(
        Limit(
            name="share",
            default=0.10,
            unit="",
            meaning="share of the named level a rail may be off",
            source=NO_SOURCE,
        ),
        Limit(
            name="far-share",
            default=0.20,
            unit="",
            meaning="share beyond which the disagreement is major",
            source=NO_SOURCE,
        ),
    ),
    judge=judge_name,
)


RULES = (RANGE, DROP, NAME_DISAGREES)
