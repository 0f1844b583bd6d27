"""The supply pins of a package: their nets, their levels, and what to say where one is open."""

from collections.abc import Iterable

from railguard.analysis.rail import Package
from railguard.analysis.stage import Design, Stage
from railguard.devices.model import Device
from railguard.notices import NotChecked
from railguard.rules.compose import channels_of, first_unknown
from railguard.rules.wording import listed
from railguard.words import Basis


def how_to_state(net: str) -> str:
    """Say how a user states what a supply net is held at."""
    return f'state it: [nets] "{net}" = {{ volts = ... }}'


def supplies_of(package: Package, design: Design) -> tuple[tuple[Stage, ...], ...]:
    """Return a package's channels, those on one pair of supply nets together.

    A sound package has one pair; a channel wired to other rails is judged by its own.
    """
    pairs: dict[tuple[tuple[str, str], ...], list[Stage]] = {}
    for stage in channels_of(package, design):
        pairs.setdefault(pin_nets(stage), []).append(stage)
    return tuple(tuple(stages) for stages in pairs.values())


def names_of(stages: Iterable[Stage]) -> str:
    """Name the packages some stages are in: `U1 and U2`."""
    return listed(dict.fromkeys(s.package or s.schematic for s in stages))


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


def supply_basis(device: Device, name: str) -> Basis:
    """Return where a device's supply figure came from: `low`, `high` or `absolute`."""
    return device.supply_basis.get(name, "memory")


def no_channel(package: Package, rule: str) -> NotChecked:
    """Say that a package has no channel to judge it by."""
    why = "none of its channels could be read as an amplifier"
    return NotChecked(package.designator, rule, why, "give its pin order")
