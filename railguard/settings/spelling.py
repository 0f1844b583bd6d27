"""Statements in the spelling of one netlist.

SPICE takes `vbat` and `VBAT` as one net, a schematic's label `LEVEL` is exported as `/LEVEL`, and
the designator `U3` as `XU3`. A person states whichever is at hand; here it becomes the netlist's
own name, so that every later room compares with `==`.
"""

from collections.abc import Callable, Iterable, Mapping
from typing import TypeVar

import msgspec

from railguard.location import Location
from railguard.notices import Problem
from railguard.settings.model import Settings, Signal
from railguard.settings.names import nearest

_GROUND = {"0": "0", "gnd": "0"}

Value = TypeVar("Value")


def respelt(
    settings: Settings,
    nets: Iterable[str],
    designators: Iterable[str],
    schematic: Callable[[str], str],
) -> tuple[Settings, tuple[Problem, ...]]:
    """Return the settings with nets and designators as one netlist spells them.

    nets, designators  those of the netlist
    schematic          gives a designator in the schematic's spelling

    A name the netlist does not have stays as it is: the user's file may state it for another one.
    Where a directive states it, it is a problem, as a directive speaks of its own netlist only.
    """
    if not (settings.nets or settings.signals or settings.loads or settings.uses or settings.pins):
        return settings, ()
    net = _Names(nets)
    stage = _Names(())
    for designator in designators:
        stage.known.setdefault(schematic(designator).casefold(), designator)
    for designator in tuple(stage.known.values()):
        stage.known[designator.casefold()] = designator

    signals = tuple(_signal(signal, net) for signal in settings.signals)
    loads = tuple(
        msgspec.structs.replace(load, net=net.spelt(load.net), to=net.spelt(load.to))
        for load in settings.loads
    )
    made = msgspec.structs.replace(
        settings,
        nets=_keys(settings.nets, net),
        signals=signals,
        loads=loads,
        uses=_keys(settings.uses, stage),
        pins=_keys(settings.pins, stage),
    )
    return made, _problems(made, net)


class _Names:
    """Names of the netlist by their spelling without case."""

    def __init__(self, names: Iterable[str]) -> None:
        self.known = {name.casefold(): name for name in names}

    def spelt(self, name: str) -> str:
        """Return the netlist's spelling of a name, or the name itself."""
        folded = name.casefold()
        found = self.known.get(folded) or _GROUND.get(folded) or self.known.get(f"/{folded}")
        return found or name

    def has(self, name: str) -> bool:
        """Tell whether a name, already respelt, is one of the netlist's."""
        return name.casefold() in self.known or name.casefold() in _GROUND


def _keys(stated: Mapping[str, Value], names: _Names) -> dict[str, Value]:
    made: dict[str, Value] = {}
    for name, value in stated.items():
        made.setdefault(names.spelt(name), value)
    return made


def _signal(signal: Signal, net: _Names) -> Signal:
    if signal.between:
        between = tuple(net.spelt(name) for name in signal.between)
        return msgspec.structs.replace(signal, between=between)
    return msgspec.structs.replace(signal, name=net.spelt(signal.name))


def _problems(settings: Settings, net: _Names) -> tuple[Problem, ...]:
    stated: list[tuple[str, Location | None]] = [
        *((name, level.location) for name, level in settings.nets.items()),
        *((n, s.location) for s in settings.signals for n in (s.between or (s.name,))),
        *((name, load.location) for load in settings.loads for name in (load.net, load.to)),
    ]
    problems = []
    for name, place in stated:
        if place is None or place.file == settings.file or net.has(name):
            continue
        close = nearest(name, net.known.values())
        message = f'A directive speaks of the net "{name}", which this netlist does not have.'
        remedy = f'The nearest is "{close}".' if close else ""
        problems.append(Problem("netlist-directive", message, remedy, place, nets=(name,)))
    return tuple(problems)
