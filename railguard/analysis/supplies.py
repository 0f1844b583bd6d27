"""The level of every rail, by order of trust.

The user's file (or a directive in the netlist), then the sources in the deck as the DC solution
sees them, then the net's name. A supply that nothing states stays unknown.
"""

from collections import defaultdict, deque
from collections.abc import Iterable, Mapping

import msgspec

from railguard.analysis.recognise import Amplifier
from railguard.circuit.model import GROUND, Element
from railguard.circuit.rails import level_from_name
from railguard.settings.model import Settings
from railguard.words import Basis

SERIES_OHMS = 1000.0
"""Up to this resistance a resistor between a source and a supply pin counts as a series element."""

LONE_OHMS = 100e3
"""Up to this resistance a single resistor from a source feeds a pin that nothing else feeds."""

DEFAULT_RAIL_TOLERANCE = 0.05
"""Rails that feed a supply pin: 5 %, common practice, no source (regulators 2 to 5 %)."""


class Feed(msgspec.Struct, frozen=True, kw_only=True):
    """How one supply net is fed.

    level    volts where the user or the net's name states it; None: the DC solution tells
    origin   in words, for the report
    source   designator of the source found behind it, or ""
    series   designators between that source and the net
    held     True where something states the level at all
    at       the net that carries the statement (the supply net itself, or one behind a ferrite)
    """

    net: str
    level: float | None
    basis: Basis
    origin: str
    source: str = ""
    series: tuple[str, ...] = ()
    held: bool = True
    at: str = ""
    tolerance: float | None = None


def supply_nets(amplifiers: Iterable[Amplifier]) -> dict[str, str]:
    """Return the nets that feed supply pins, ground left out: net -> "positive" or "negative"."""
    nets: dict[str, str] = {}
    for amplifier in amplifiers:
        for net, sign in ((amplifier.negative, "negative"), (amplifier.positive, "positive")):
            if net and net != GROUND:
                nets[net] = sign
    return nets


def feeds(
    nets: Iterable[str],
    elements: Iterable[Element],
    settings: Settings,
    amplifiers: Iterable[Amplifier],
) -> dict[str, Feed]:
    """Find what feeds each supply net.

    A search from the pin through series elements (inductors, links, resistors up to 1 kilohm)
    meets, in order: a net the user states, a source, an amplifier's output, a net whose name
    carries a level. Where it meets none, one larger resistor straight from a source counts: a
    micropower stage may be fed so, and one that is not must be told what the resistor takes.
    """
    elements, amplifiers = tuple(elements), tuple(amplifiers)
    around = _neighbours(elements, SERIES_OHMS)
    outputs = {a.output: a.designator for a in amplifiers}
    found = {net: _feed(net, around, settings, outputs) for net in nets}
    if all(feed.held for feed in found.values()):
        return found
    wider = _neighbours(elements, LONE_OHMS)
    return {
        net: feed if feed.held else _through_one(net, wider, settings) or feed
        for net, feed in found.items()
    }


def _through_one(
    net: str, around: Mapping[str, list[tuple[Element, str]]], settings: Settings
) -> Feed | None:
    """Return the feed of a net over one resistor from a source or a net whose level is stated."""
    for element, other in around.get(net, ()):
        if element.kind != "R" or other == GROUND:
            continue
        stated = settings.nets.get(other)
        if stated is not None:
            where = settings.file or "a directive"
            return Feed(
                net=net, level=None, basis="user", origin=where, series=(element.designator,),
                at=other, tolerance=stated.tolerance,
            )  # fmt: skip
        for source, _ in around.get(other, ()):
            if source.kind in ("V", "battery") and _delivers(source) and GROUND in source.nets:
                return Feed(
                    net=net, level=None, basis="netlist", origin=source.designator,
                    source=source.designator, series=(element.designator,), at=other,
                )  # fmt: skip
    return None


def _neighbours(
    elements: Iterable[Element], most: float
) -> Mapping[str, list[tuple[Element, str]]]:
    """Return the series elements on each net with the net behind; resistors up to `most` ohm."""
    around: dict[str, list[tuple[Element, str]]] = defaultdict(list)
    for element in elements:
        if not element.fitted or len(element.nets) < 2:
            continue
        series = (
            element.kind in ("L", "link")
            or (element.kind == "R" and element.value is not None and element.value <= most)
            or element.kind in ("V", "E", "H", "battery", "B")
        )
        if series:
            a, b = element.nets[:2]
            around[a].append((element, b))
            around[b].append((element, a))
    return around


def _feed(
    net: str,
    around: Mapping[str, list[tuple[Element, str]]],
    settings: Settings,
    outputs: Mapping[str, str],
) -> Feed:
    seen = {net}
    queue: deque[tuple[str, tuple[str, ...]]] = deque([(net, ())])
    sourced: Feed | None = None
    named: Feed | None = None
    while queue:
        at, series = queue.popleft()
        stated = settings.nets.get(at)
        if stated is not None:
            where = settings.file or "a directive"
            return Feed(
                net=net, level=stated.volts, basis="user", origin=where, series=series, at=at,
                tolerance=stated.tolerance,
            )  # fmt: skip
        if at in outputs and sourced is None:
            origin = f"the output of {outputs[at]}"
            sourced = Feed(
                net=net, level=None, basis="netlist", origin=origin, source=outputs[at],
                series=series, at=at,
            )  # fmt: skip
        level = level_from_name(at)
        if level is not None and named is None:
            named = Feed(
                net=net, level=level, basis="netlist", origin="its name", series=series, at=at
            )
        for element, other in around.get(at, ()):
            if element.kind in ("V", "E", "H", "battery", "B"):
                grounded = element.kind == "V" and other == GROUND and _is_stated(element)
                if sourced is None and (grounded or _delivers(element)):
                    sourced = Feed(
                        net=net, level=None, basis="netlist", origin=element.designator,
                        source=element.designator, series=series, at=at,
                    )  # fmt: skip
                step = series
            else:
                step = (*series, element.designator)
            if other not in seen and other != GROUND:
                seen.add(other)
                queue.append((other, step))
    found = sourced or named
    if found is not None:
        return found
    return Feed(net=net, level=None, basis="assumed", origin="", held=False, at=net)


def _is_stated(element: Element) -> bool:
    return element.source is not None and element.source.stated


def _delivers(element: Element) -> bool:
    if element.kind == "battery":
        return element.source is not None and element.source.stated
    if element.kind == "V":
        # A source of exactly zero between two nets is an ammeter: the search goes on through it.
        # One to ground holds the net at ground, and says so.
        source = element.source
        if source is None or not source.stated:
            return False
        return source.level != 0 or GROUND in element.nets[:2]
    return True
