"""Supplies: there, the right way round, inside what the device allows, at the level they say."""

from collections.abc import Iterator

from railguard.analysis.stage import Bound, Design, Package, Pair, Rail, Stage
from railguard.devices.model import Device
from railguard.notices import NotChecked
from railguard.rules.compose import (
    OWN_TABLE,
    channels_of,
    finding,
    first_unknown,
    rail_at,
)
from railguard.rules.finding import Finding
from railguard.rules.protocol import Limit, Limits, Outcome, Rule
from railguard.rules.severity import TABLE, Breach, breach, capped, evidence
from railguard.rules.wording import NO_SOURCE, cited, listed, origin, rails
from railguard.units import percent, si
from railguard.words import Basis, Severity

NO_VOLTS = 0.1
"""V between the supply pins below which there is no supply at all."""


def _state(net: str) -> str:
    return f'state it: [nets] "{net}" = {{ volts = ... }}'


def _shared(net: str, design: Design) -> tuple[Package, ...]:
    """Return the packages that have a supply pin on a net, in the order of the design."""
    return tuple(p for p in design.packages if net in p.positive or net in p.negative)


def _stage_of(package: Package, design: Design) -> Stage | None:
    """Return the channel to judge a package's supply by: the first with both levels known."""
    stages = channels_of(package, design)
    known = [s for s in stages if s.supply.total is not None]
    return next(iter(known or stages), None)


def _nets(stage: Stage) -> tuple[tuple[str, str], ...]:
    """Return (word, net) of both supply pins."""
    return ("positive", stage.supply.positive_net), ("negative", stage.supply.negative_net)


# --- supply-missing


def judge_missing(package: Package, limits: Limits, design: Design) -> Iterator[Outcome]:
    """Judge whether something feeds both supply pins of a package."""
    stage = _stage_of(package, design)
    if stage is None:
        why = "none of its channels could be read as an amplifier"
        yield NotChecked(package.designator, "supply-missing", why, "give its pin order")
        return
    fault = _one_net(package, stage) or _dead_net(package, stage, design)
    if fault is not None:
        yield from (fault,) if fault is not _TOLD_ELSEWHERE else ()
        return
    total = stage.supply.total
    if total is None:
        yield _unstated(package, stage)
        return
    levels = (stage.supply.positive, stage.supply.negative)
    if abs(total) <= NO_VOLTS and all(abs(level or 0.0) <= NO_VOLTS for level in levels):
        yield _dead_pins(
            package,
            stage,
            f"Between the supply pins of {package.designator} stand only {si(total, 'V')}.",
            "Connect both supply pins to their rails.",
        )


def _dead_pins(package: Package, stage: Stage, message: str, remedy: str) -> Finding:
    nets = tuple(dict.fromkeys(net for _, net in _nets(stage) if net))
    return finding(
        "supply-missing",
        "critical",
        message,
        designators=package.channels or (package.designator,),
        nets=nets,
        demand=stage.supply.total,
        unit="V",
        basis=(stage.supply.basis,),
        remedy=remedy,
        source=NO_SOURCE,
        location=package.location,
    )


def _one_net(package: Package, stage: Stage) -> Finding | None:
    net = stage.supply.positive_net
    if not net or net != stage.supply.negative_net:
        return None
    return _dead_pins(
        package,
        stage,
        f"Both supply pins of {package.designator} are on net {net}, so it has no supply.",
        "Connect the positive pin to the positive rail and the negative pin to the lower one.",
    )


_TOLD_ELSEWHERE = finding("supply-missing", "remark", "")
"""Marks a dead net that the first package on it has already been told about."""


def _dead_net(package: Package, stage: Stage, design: Design) -> Finding | None:
    """Find a supply net on which nothing could give a level, told once for all its packages."""
    for word, net in _nets(stage):
        rail = rail_at(net, design)
        if rail is None or rail.level is not None or rail.feed != "nothing":
            continue
        if not _states_supplies(design):
            continue
        packages = _shared(net, design) or (package,)
        if packages[0].designator != package.designator:
            return _TOLD_ELSEWHERE
        names = listed(p.designator for p in packages)
        pins = "pin" if len(packages) == 1 else "pins"
        return finding(
            "supply-missing",
            "critical",
            f"Nothing feeds net {net}: it is the {word} supply {pins} of {names}, and no source, "
            "regulator or connector stands on it.",
            designators=tuple(d for p in packages for d in p.channels or (p.designator,)),
            nets=(net,),
            remedy=f"Connect {net} to its supply; where it comes from outside the netlist, "
            f"{_state(net)}.",
            source=NO_SOURCE,
            location=rail.location or package.location,
        )
    return None


def _states_supplies(design: Design) -> bool:
    """Tell whether the deck holds sources at all, so that a rail without one is a fault."""
    return any(e.kind in ("V", "battery") for e in design.circuit.elements)


def _unstated(package: Package, stage: Stage) -> NotChecked:
    reason = first_unknown(stage, ("supply",))
    if reason is not None:
        return NotChecked(package.designator, "supply-missing", reason.why, reason.add)
    levels = (stage.supply.positive, stage.supply.negative)
    open_nets = [net for (_, net), level in zip(_nets(stage), levels, strict=True) if level is None]
    net = next(filter(None, open_nets), "")
    if not net:
        why, add = "its symbol has no supply pins", "use a symbol or model with supply pins"
    else:
        why, add = f"nothing states the level of its supply net {net}", _state(net)
    return NotChecked(package.designator, "supply-missing", why, add)


MISSING = Rule(
    name="supply-missing",
    family="supply",
    looks_at="package",
    judges="Whether something feeds both supply pins of every package.",
    reason="An amplifier without a supply delivers nothing, and its inputs feed its protection "
    "diodes.",
    source=NO_SOURCE,
    silent="A supply net that leaves the netlist, or that nothing states, is listed as not "
    "checked.",
    judge=judge_missing,
)


# --- supply-reversed


def judge_reversed(package: Package, limits: Limits, design: Design) -> Iterator[Outcome]:
    """Judge whether a package's positive pin stands above its negative pin."""
    stage = _stage_of(package, design)
    if stage is None or stage.supply.total is None:
        yield from _no_total(package, stage, "supply-reversed")
        return
    supply = stage.supply
    positive, negative = supply.positive or 0.0, supply.negative or 0.0
    off = abs(positive) <= NO_VOLTS and abs(negative) <= NO_VOLTS
    if positive - negative > NO_VOLTS or off or supply.positive_net == supply.negative_net:
        return
    same = [p for p in design.packages if _same_rails(p, stage, design)] or [package]
    if same[0].designator != package.designator:
        return
    yield _reversed(same, stage, positive, negative)


def _same_rails(package: Package, stage: Stage, design: Design) -> bool:
    other = _stage_of(package, design)
    return other is not None and _nets(other) == _nets(stage)


def _reversed(packages: list[Package], stage: Stage, positive: float, negative: float) -> Finding:
    """Say which pin is wrong: swapped pins, or one rail of the wrong sign."""
    names = listed(p.designator for p in packages)
    high, low = stage.supply.positive_net, stage.supply.negative_net
    if positive < negative:
        message = (
            f"{names}: the positive supply pin (net {high}) is at {si(positive, 'V')}, below the "
            f"negative one (net {low}) at {si(negative, 'V')}."
        )
        remedy = f"Swap the supply pins of {names}, or turn the source that feeds the rail."
    else:
        wrong, level = (high, positive) if positive < 0 else (low, negative)
        message = (
            f"{names}: both supply pins are at {si(level, 'V')}; net {wrong} has the wrong sign."
        )
        remedy = f"Turn the source that feeds {wrong}."
    return finding(
        "supply-reversed",
        TABLE["absolute"][evidence(stage.supply.basis)],
        message,
        designators=tuple(d for p in packages for d in p.channels or (p.designator,)),
        nets=tuple(filter(None, (high, low))),
        demand=positive - negative,
        limit=0.0,
        margin=positive - negative,
        unit="V",
        basis=(stage.supply.basis,),
        remedy=remedy,
        source=cited(stage, _basis(stage.family, "absolute")) if stage.family else NO_SOURCE,
        location=packages[0].location,
    )


def _no_total(package: Package, stage: Stage | None, rule: str) -> Iterator[NotChecked]:
    if stage is None:
        why, add = "none of its channels could be read as an amplifier", "give its pin order"
    else:
        base = _unstated(package, stage)
        why, add = base.why, base.add
    yield NotChecked(package.designator, rule, why, add)


REVERSED = Rule(
    name="supply-reversed",
    family="supply",
    looks_at="package",
    judges="Whether the positive supply pin stands above the negative one.",
    reason="A reversed supply forward-biases the substrate diode of the device: it draws what the "
    "supply gives and is damaged.",
    source="absolute maximum ratings of the device's data sheet; else common practice, no source",
    silent="Levels nobody states are listed as not checked.",
    judge=judge_reversed,
)


# --- supply-range


def _basis(device: Device | None, name: str) -> Basis:
    return "practice" if device is None else device.supply_basis.get(name, "memory")


def judge_range(package: Package, limits: Limits, design: Design) -> Iterator[Outcome]:
    """Judge a package's total supply against its recommended range and its absolute maximum."""
    stage = _stage_of(package, design)
    if stage is None or stage.supply.total is None:
        yield from _no_total(package, stage, "supply-range")
        return
    device, total = stage.family, stage.supply.total
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
    for bound in _range_bounds(stage, device, total):
        broken = breach(bound)
        if broken is not None:
            yield _out_of_range(package, stage, bound, broken, limits["far-share"])


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
        guaranteed_basis=_basis(device, "high" if device.supply_high is not None else "absolute"),
        absolute_basis=_basis(device, "absolute"),
        demand_basis=supply.basis,
        stated=_pair(highest, top, supply.tolerance_stated),
        default=_pair(highest, top, not supply.tolerance_stated),
    )
    low = Bound(
        upper=False,
        demand=total,
        guaranteed=device.supply_low,
        guaranteed_basis=_basis(device, "low"),
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
    package: Package, stage: Stage, bound: Bound, broken: Breach, far_share: float
) -> Finding:
    """Make the finding; far outside the recommended range counts like a typical limit."""
    severity = broken.severity
    if not broken.at_corner and -broken.margin > far_share * broken.limit:
        worse = TABLE["typical"][evidence(*broken.basis)]
        severity = severity if broken.broken == "absolute" else worse
    subject = f"{package.designator} ({stage.device})"
    what = {
        "absolute": "the absolute maximum is",
        "guaranteed": "the recommended range goes to" if bound.upper else "it needs at least",
    }.get(broken.broken, "the range goes to" if bound.upper else "it needs at least")
    corner = " at the worst corner of the rails' tolerance" if broken.at_corner else ""
    side = "above" if bound.upper else "short of it"
    message = (
        f"{subject} gets {si(broken.demand, 'V')} in all ({rails(stage.supply)}){corner}; {what} "
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
        designators=package.channels or (package.designator,),
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


# --- supply-package-split


def judge_split(package: Package, limits: Limits, design: Design) -> Iterator[Outcome]:
    """Judge whether all channels of a package stand on the same rails."""
    for word, nets in (("positive", package.positive), ("negative", package.negative)):
        different = tuple(dict.fromkeys(net for net in nets if net))
        if len(different) < 2:
            continue
        yield finding(
            "supply-package-split",
            "major",
            f"{package.designator} has one {word} supply pin, and its channels "
            f"{listed(package.channels)} put it on nets {listed(different)}.",
            designators=package.channels or (package.designator,),
            nets=different,
            demand=float(len(different)),
            limit=1.0,
            margin=1.0 - len(different),
            remedy=f"Put all channels of {package.designator} on one rail, or give the channel "
            "that needs another rail a package of its own.",
            source=NO_SOURCE,
            location=package.location,
        )


SPLIT = Rule(
    name="supply-package-split",
    family="supply",
    looks_at="package",
    judges="Whether all channels of a package stand on the same pair of rails.",
    reason="The channels of a package share its supply pins; two rails on one pin are a short.",
    source=NO_SOURCE,
    silent="Packages with one channel.",
    judge=judge_split,
)

RULES = (MISSING, REVERSED, RANGE, DROP, NAME_DISAGREES, SPLIT)
