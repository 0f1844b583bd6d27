"""The supply pins of a package: their nets, their levels, and what to say where one is open."""

from railguard.analysis.stage import Design, Package, Stage
from railguard.devices.model import Device
from railguard.notices import NotChecked
from railguard.rules.compose import channels_of, first_unknown
from railguard.words import Basis


def how_to_state(net: str) -> str:
    """Say how a user states what a supply net is held at."""
    return f'state it: [nets] "{net}" = {{ volts = ... }}'


def packages_on(net: str, design: Design) -> tuple[Package, ...]:
    """Return the packages that have a supply pin on a net, in the order of the design."""
    return tuple(p for p in design.packages if net in p.positive or net in p.negative)


def stage_of(package: Package, design: Design) -> Stage | None:
    """Return the channel to judge a package's supply by: the first with both levels known."""
    stages = channels_of(package, design)
    known = [s for s in stages if s.supply.total is not None]
    return next(iter(known or stages), None)


def pin_nets(stage: Stage) -> tuple[tuple[str, str], ...]:
    """Return (word, net) of both supply pins."""
    return ("positive", stage.supply.positive_net), ("negative", stage.supply.negative_net)


def unstated(package: Package, stage: Stage, rule: str) -> NotChecked:
    """Say which supply pin of a package has no level, and how to state it."""
    reason = first_unknown(stage, ("supply",))
    if reason is not None:
        return NotChecked(package.designator, rule, reason.why, reason.add)
    levels = (stage.supply.positive, stage.supply.negative)
    open_nets = [
        net for (_, net), level in zip(pin_nets(stage), levels, strict=True) if level is None
    ]
    net = next(filter(None, open_nets), "")
    if not net:
        why, add = "its symbol has no supply pins", "use a symbol or model with supply pins"
    else:
        why, add = f"nothing states the level of its supply net {net}", how_to_state(net)
    return NotChecked(package.designator, rule, why, add)


def supply_basis(device: Device | None, name: str) -> Basis:
    """Return where a device's supply figure came from: `low`, `high` or `absolute`."""
    return "practice" if device is None else device.supply_basis.get(name, "memory")


def no_total(package: Package, stage: Stage | None, rule: str) -> NotChecked:
    """Say why a package's total supply is not known."""
    if stage is None:
        why = "none of its channels could be read as an amplifier"
        return NotChecked(package.designator, rule, why, "give its pin order")
    return unstated(package, stage, rule)
