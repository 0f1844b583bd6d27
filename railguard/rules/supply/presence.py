"""Whether every package has a supply, the right way round, and one pair of rails."""

from collections.abc import Iterator

from railguard.analysis.stage import Design, Package, Rail, Stage
from railguard.rules.compose import (
    finding,
    rail_at,
)
from railguard.rules.finding import Finding
from railguard.rules.protocol import Limits, Outcome, Rule
from railguard.rules.severity import TABLE, evidence
from railguard.rules.supply.pins import (
    how_to_state,
    no_total,
    packages_on,
    pin_nets,
    stage_of,
    supply_basis,
    unstated,
)
from railguard.rules.wording import NO_SOURCE, cited, listed
from railguard.rules.working import NO_VOLTS
from railguard.units import si

# --- supply-missing


def judge_missing(package: Package, limits: Limits, design: Design) -> Iterator[Outcome]:
    """Judge whether something feeds both supply pins of a package."""
    stage = stage_of(package, design)
    if stage is None:
        yield no_total(package, stage, "supply-missing")
        return
    net = stage.supply.positive_net
    if net and net == stage.supply.negative_net:
        yield _dead_pins(
            package,
            stage,
            f"Both supply pins of {package.designator} are on net {net}, so it has no supply.",
            "Connect the positive pin to the positive rail and the negative pin to the lower one.",
        )
        return
    dead = _dead_pin(stage, design)
    if dead is not None:
        word, rail = dead
        packages = packages_on(rail.net, design) or (package,)
        if packages[0].designator == package.designator:
            yield _dead_net(word, rail, packages)
        return
    total = stage.supply.total
    if total is None:
        yield unstated(package, stage, "supply-missing")
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
    nets = tuple(dict.fromkeys(net for _, net in pin_nets(stage) if net))
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


def _dead_pin(stage: Stage, design: Design) -> tuple[str, Rail] | None:
    """Find the supply pin of a stage whose net nothing could give a level, with its rail."""
    if not _states_supplies(design):
        return None
    for word, net in pin_nets(stage):
        rail = rail_at(net, design)
        if rail is not None and rail.level is None and rail.feed == "nothing":
            return word, rail
    return None


def _dead_net(word: str, rail: Rail, packages: tuple[Package, ...]) -> Finding:
    names = listed(p.designator for p in packages)
    pins = "pin" if len(packages) == 1 else "pins"
    return finding(
        "supply-missing",
        "critical",
        f"Nothing feeds net {rail.net}: it is the {word} supply {pins} of {names}, and no source, "
        "regulator or connector stands on it.",
        designators=tuple(d for p in packages for d in p.channels or (p.designator,)),
        nets=(rail.net,),
        remedy=f"Connect {rail.net} to its supply; where it comes from outside the netlist, "
        f"{how_to_state(rail.net)}.",
        source=NO_SOURCE,
        location=rail.location or packages[0].location,
    )


def _states_supplies(design: Design) -> bool:
    """Tell whether the deck holds sources at all, so that a rail without one is a fault."""
    return any(e.kind in ("V", "battery") for e in design.circuit.elements)


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
    stage = stage_of(package, design)
    if stage is None or stage.supply.total is None:
        yield no_total(package, stage, "supply-reversed")
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
    other = stage_of(package, design)
    return other is not None and pin_nets(other) == pin_nets(stage)


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
        source=cited(stage, supply_basis(stage.family, "absolute")) if stage.family else NO_SOURCE,
        location=packages[0].location,
    )


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

RULES = (MISSING, REVERSED, SPLIT)
