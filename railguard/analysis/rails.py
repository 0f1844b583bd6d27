"""Rails and packages: what feeds the supply pins, and the capacitors on it.

A netlist knows no distance, so capacitors are counted per rail: from the rail to a return, from
the rail to another rail, and on the far side of a series element.
"""

import re
from collections import defaultdict
from collections.abc import Iterable, Mapping
from typing import Literal

from railguard.analysis.bound import Range
from railguard.analysis.dcpaths import is_capacitor, leaves_sheet
from railguard.analysis.rail import Capacitor, Package, Rail
from railguard.analysis.recognise import Amplifier
from railguard.analysis.supplies import DEFAULT_RAIL_TOLERANCE, Feed
from railguard.circuit.model import GROUND, Element
from railguard.circuit.rails import level_from_name
from railguard.location import Location
from railguard.settings.model import Settings

STIFF_OHMS = 0.5
"""A link or resistor up to this resistance does not separate a capacitor from a pin."""
SERIES_OHMS = 100.0
"""Up to this resistance a resistor between two parts of a rail counts as its filter."""
_JOINS = re.compile(r"(?i)^(?:JP|NT|SJ|W|R)")
_RATING = re.compile(r"(?i)(?<![\w.])(\d+(?:\.\d+)?)\s*V(?:DC)?(?![\w])")


def rail_tolerance(feed: Feed, settings: Settings) -> tuple[float, bool]:
    """Return a rail's tolerance as a share, and whether the user stated it."""
    if feed.tolerance is not None:
        return feed.tolerance, True
    if settings.tolerances.rail is not None:
        return settings.tolerances.rail, True
    return DEFAULT_RAIL_TOLERANCE, False


class RailMap:
    """The elements on nets, for finding capacitors and series elements of rails."""

    def __init__(self, elements: Iterable[Element], rails: Mapping[str, str]) -> None:
        self._around: dict[str, list[Element]] = defaultdict(list)
        for element in elements:
            if element.fitted:
                for net in dict.fromkeys(element.nets):
                    self._around[net].append(element)
        self._rails = rails

    def at(self, net: str) -> list[Element]:
        """Return the elements on a net."""
        return self._around.get(net, [])

    def same(self, net: str) -> dict[str, str]:
        """Return the nets that are this rail, with the series element each lies behind ("": none).

        Net ties, jumpers and zero ohms join; ferrites, inductors and small resistors separate.
        """
        reached = {net: ""}
        queue = [net]
        while queue:
            at = queue.pop()
            for element in self.at(at):
                if len(element.nets) < 2:
                    continue
                joins = _joins(element)
                separates = _separates(element)
                if not joins and not separates:
                    continue
                for other in element.nets[:2]:
                    if other != GROUND and other not in reached:
                        reached[other] = reached[at] or ("" if joins else element.designator)
                        queue.append(other)
        return reached

    def capacitors(self, net: str) -> tuple[list[Capacitor], list[Capacitor], list[Capacitor]]:
        """Return a rail's capacitors: to a return, to another rail, behind a series element."""
        decoupling: list[Capacitor] = []
        across: list[Capacitor] = []
        upstream: list[Capacitor] = []
        nets = self.same(net)
        returns = self.grounds()
        for at, behind in nets.items():
            for element in self.at(at):
                if not is_capacitor(element):
                    continue
                other = element.nets[1] if element.nets[0] == at else element.nets[0]
                if other in nets:
                    continue
                capacitor = Capacitor(
                    designator=element.designator,
                    farads=element.value,
                    to=other,
                    behind=behind,
                    rating=_rating(element),
                    location=element.location,
                )
                if other in returns:
                    (upstream if behind else decoupling).append(capacitor)
                elif other in self._rails:
                    across.append(capacitor)
        return decoupling, across, upstream

    def grounds(self) -> frozenset[str]:
        """Return the nets that are ground through net ties, jumpers, zero ohms or a ferrite."""
        reached = {GROUND}
        queue = [GROUND]
        while queue:
            for element in self.at(queue.pop()):
                tied = _joins(element) or (element.kind == "link" and len(element.nets) == 2)
                if tied and len(element.nets) >= 2:
                    for other in element.nets[:2]:
                        if other not in reached and other not in self._rails:
                            reached.add(other)
                            queue.append(other)
        return frozenset(reached)


def _joins(element: Element) -> bool:
    if element.kind == "link":
        return bool(_JOINS.match(element.designator)) and (element.value or 0.0) <= STIFF_OHMS
    return element.kind == "R" and element.value is not None and abs(element.value) <= STIFF_OHMS


def _separates(element: Element) -> bool:
    if element.kind in ("L", "link"):
        return True
    return element.kind == "R" and element.value is not None and element.value <= SERIES_OHMS


def _rating(element: Element) -> float | None:
    found = _RATING.search(element.text)
    return float(found[1]) if found else None


def rails_of(
    signs: Mapping[str, str],
    feeds: Mapping[str, Feed],
    elements: Iterable[Element],
    amplifiers: Iterable[Amplifier],
    levels: Mapping[str, float],
    settings: Settings,
) -> tuple[Rail, ...]:
    """Return every rail.

    levels  DC level of every net that was solved; a rail's own statement stands where it was not
    """
    amplifiers = tuple(amplifiers)
    own = frozenset(a.element.designator for a in amplifiers)
    rail_map = RailMap(elements, signs)
    packages: dict[str, list[str]] = defaultdict(list)
    for amplifier in amplifiers:
        for net in {amplifier.positive, amplifier.negative}:
            if amplifier.package not in packages[net]:
                packages[net].append(amplifier.package)
    rails = []
    for net, sign in signs.items():
        feed = feeds[net]
        share, stated = rail_tolerance(feed, settings)
        level = _level(net, feed, levels)
        decoupling, across, upstream = rail_map.capacitors(net)
        span = abs(level) * share if level is not None else 0.0
        rails.append(
            Rail(
                net=net,
                sign="positive" if sign == "positive" else "negative",
                level=level,
                worst=Range() if level is None else Range(level - span, level + span),
                basis=feed.basis,
                origin=feed.origin,
                tolerance=share,
                tolerance_stated=stated,
                named=level_from_name(net),
                returns=tuple(sorted(rail_map.grounds())),
                decoupling=tuple(decoupling),
                across=tuple(across),
                upstream=tuple(upstream),
                packages=tuple(packages[net]),
                ideal=bool(feed.source) and not feed.series,
                series=feed.series,
                feed=_feed_word(net, feed, rail_map, own),
                drop=_drop(net, feed, levels),
                location=_place(net, feed, rail_map),
            )
        )
    return tuple(rails)


def _level(net: str, feed: Feed, levels: Mapping[str, float]) -> float | None:
    return levels.get(net, feed.level) if feed.held else None


def _feed_word(
    net: str, feed: Feed, rail_map: RailMap, own: frozenset[str]
) -> Literal["stated", "outside", "nothing"]:
    """Say whether a level is known, the net leaves the sheet, or nothing feeds it.

    own  designators of amplifiers' cards: a supply pin takes, it does not feed
    """
    if feed.held:
        return "stated"
    for at in rail_map.same(net):
        for element in rail_map.at(at):
            feeds = element.kind in ("D", "Q", "M", "J", "V", "battery", "I")
            if element.designator not in own and (feeds or leaves_sheet(element)):
                return "outside"
    return "nothing"


def _drop(net: str, feed: Feed, levels: Mapping[str, float]) -> float | None:
    if net not in levels or not feed.held:
        return None
    if not feed.series or not feed.at:
        return 0.0
    there = levels.get(feed.at)
    return None if there is None else abs(there - levels[net])


def _place(net: str, feed: Feed, rail_map: RailMap) -> Location | None:
    """Return the card of a rail's source, else the first card on the rail."""
    on_net = [*rail_map.at(feed.at), *rail_map.at(net)]
    source = next((e for e in on_net if e.designator == feed.source), None)
    found = source or next(iter(rail_map.at(net)), None)
    return found.location if found is not None else None


def packages_of(amplifiers: Iterable[Amplifier]) -> tuple[Package, ...]:
    """Return what is soldered, in the order of the netlist."""
    grouped: dict[str, list[Amplifier]] = defaultdict(list)
    for amplifier in amplifiers:
        if amplifier.has_supply:
            grouped[amplifier.package].append(amplifier)
    result = []
    for designator, mates in grouped.items():
        device = mates[0].match.device
        result.append(
            Package(
                designator=designator,
                device=mates[0].match.name,
                family=device.family if device else "",
                channels=tuple(a.designator for a in mates),
                positive=tuple(dict.fromkeys(a.positive for a in mates)),
                negative=tuple(dict.fromkeys(a.negative for a in mates)),
                size=mates[0].match.channels,
                location=mates[0].element.location,
            )
        )
    return tuple(result)
