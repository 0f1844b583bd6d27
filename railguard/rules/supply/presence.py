"""Whether every package has a supply, the right way round, and one pair of rails."""

from collections.abc import Iterator

from railguard.analysis.rail import Package, Rail
from railguard.analysis.stage import Design, Stage
from railguard.rules.compose import (
    finding,
    rail_at,
)
from railguard.rules.finding import Finding
from railguard.rules.protocol import Limits, Outcome, Rule
from railguard.rules.severity import TABLE, evidence
from railguard.rules.supply.pins import (
    how_to_state,
    names_of,
    no_channel,
    pin_nets,
    supplies_of,
    supply_basis,
    unstated,
)
from railguard.rules.wording import NO_SOURCE, cited, listed
from railguard.rules.working import NO_VOLTS
from railguard.units import si

# --- supply-missing


def judge_missing(package: Package, limits: Limits, design: Design) -> Iterator[Outcome]:
    """Judge whether something feeds both supply pins of a package."""
    supplies = supplies_of(package, design)
    if not supplies:
        yield no_channel(package, "supply-missing")
    for stages in supplies:
        yield from _missing(package, stages, design)


def _missing(package: Package, stages: tuple[Stage, ...], design: Design) -> Iterator[Outcome]:
    stage = stages[0]
    net, total = stage.supply.positive_net, stage.supply.total
    levels = (stage.supply.positive, stage.supply.negative)
    if net and net == stage.supply.negative_net:
        yield _dead_pins(
            package,
            stages,
            f"Both supply pins of {package.designator} are on net {net}, so it has no supply.",
            "Connect the positive pin to the positive rail and the negative pin to the lower one.",
        )
    elif (dead := _dead_pin(stage, design)) is not None:
        word, rail = dead
        fed = [s for s in design.stages if rail.net in dict(pin_nets(s)).values()]
        if fed[0] in stages:
            yield _dead_net(word, rail, fed)
    elif total is None:
        yield unstated(package, stage, "supply-missing")
    elif abs(total) <= NO_VOLTS and all(abs(level or 0.0) <= NO_VOLTS for level in levels):
        yield _dead_pins(
            package,
            stages,
            f"Between the supply pins of {package.designator} stand only {si(total, 'V')}.",
            "Connect both supply pins to their rails.",
        )


def _dead_pins(package: Package, stages: tuple[Stage, ...], message: str, remedy: str) -> Finding:
    nets = tuple(dict.fromkeys(net for _, net in pin_nets(stages[0]) if net))
    return finding(
        "supply-missing",
        "critical",
        message,
        designators=tuple(s.designator for s in stages),
        nets=nets,
        demand=stages[0].supply.total,
        unit="V",
        basis=(stages[0].supply.basis,),
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


def _dead_net(word: str, rail: Rail, stages: list[Stage]) -> Finding:
    pins = "pin" if len({s.package for s in stages}) == 1 else "pins"
    return finding(
        "supply-missing",
        "critical",
        f"Nothing feeds net {rail.net}: it is the {word} supply {pins} of {names_of(stages)}, and "
        "no source, regulator or connector stands on it.",
        designators=tuple(s.designator for s in stages),
        nets=(rail.net,),
        remedy=f"Connect {rail.net} to its supply; where it comes from outside the netlist, "
        f"{how_to_state(rail.net)}.",
        source=NO_SOURCE,
        location=rail.location or stages[0].location,
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
    supplies = supplies_of(package, design)
    if not supplies:
        yield no_channel(package, "supply-reversed")
    for stages in supplies:
        supply = stages[0].supply
        if supply.positive is None or supply.negative is None:
            yield unstated(package, stages[0], "supply-reversed")
            continue
        off = abs(supply.positive) <= NO_VOLTS and abs(supply.negative) <= NO_VOLTS
        right = supply.positive - supply.negative > NO_VOLTS
        if right or off or supply.positive_net == supply.negative_net:
            continue
        same = [s for s in design.stages if pin_nets(s) == pin_nets(stages[0])]
        if same[0] in stages:
            yield _reversed(same, supply.positive, supply.negative)


def _reversed(stages: list[Stage], positive: float, negative: float) -> Finding:
    """Say which pin is wrong: swapped pins, or one rail of the wrong sign."""
    names, stage = names_of(stages), stages[0]
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
        designators=tuple(s.designator for s in stages),
        nets=tuple(filter(None, (high, low))),
        demand=positive - negative,
        limit=NO_VOLTS,
        margin=positive - negative - NO_VOLTS,
        unit="V",
        basis=(stage.supply.basis,),
        remedy=remedy,
        source=cited(stage, supply_basis(stage.family, "absolute")) if stage.family else NO_SOURCE,
        location=stage.location,
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
    split = {}
    for word, nets in (("positive", package.positive), ("negative", package.negative)):
        different = tuple(dict.fromkeys(net for net in nets if net))
        if len(different) > 1:
            split[word] = different
    if not split:
        return
    pins = listed(f"its {word} supply pin on nets {listed(nets)}" for word, nets in split.items())
    yield finding(
        "supply-package-split",
        "major",
        f"The channels of {package.designator} ({listed(package.channels)}) put {pins}; the "
        "package has one such pin.",
        designators=package.channels or (package.designator,),
        nets=tuple(dict.fromkeys(net for nets in split.values() for net in nets)),
        remedy=f"Put all channels of {package.designator} on one pair of rails, or give the "
        "channel that needs another a package of its own.",
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
