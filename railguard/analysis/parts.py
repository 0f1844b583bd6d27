"""A circuit split into parts that know nothing of each other.

A net that an ideal source holds stands where it stands whatever hangs on it, so what meets only at
such nets, at ground or nowhere can be solved by itself: smaller matrices, work that grows with the
number of sheets and no faster, and one part without a solution never costs the others theirs.
"""

from collections import defaultdict
from collections.abc import Iterable

import msgspec

from railguard.analysis.network import UNSTAMPED
from railguard.analysis.recognise import Amplifier
from railguard.analysis.sets import Sets
from railguard.analysis.signals import Prepared
from railguard.circuit.model import GROUND, Element

_SOURCES = frozenset({"V", "battery"})


class Part(msgspec.Struct, frozen=True):
    """Elements and amplifiers that can be solved without the rest.

    prepared  with the part's elements and tones only; other levels have no injection here
    """

    prepared: Prepared
    amplifiers: tuple[Amplifier, ...]


def independent(prepared: Prepared, amplifiers: tuple[Amplifier, ...]) -> tuple[Part, ...]:
    """Split a circuit; parts without an amplifier are left out, nobody asks for their numbers."""
    elements = [e for e in prepared.elements if e.fitted]
    stiff = _stiff(elements)
    sets = Sets()
    own = {id(a.element) for a in amplifiers}
    sensed = {e.designator: e for e in elements if e.kind in _SOURCES}
    for element in elements:
        if id(element) in own or element.kind in UNSTAMPED:
            continue
        nets = [*element.nets]
        if element.control is not None:
            nets += element.control.nets
            source = sensed.get(element.control.element)
            nets += source.nets[:2] if source is not None else ()
        _join(sets, nets, stiff)
    for amplifier in amplifiers:
        _join(sets, _pins(amplifier), stiff)
    groups: dict[str, list[Amplifier]] = defaultdict(list)
    for amplifier in amplifiers:
        free = next((net for net in _pins(amplifier) if net not in stiff), None)
        groups[sets.find(free) if free is not None else f"#{amplifier.designator}"].append(
            amplifier
        )
    if len(groups) < 2:
        return (Part(prepared, amplifiers),)
    return _parts(prepared, elements, groups, stiff, sets, own)


def _pins(amplifier: Amplifier) -> tuple[str, ...]:
    pins = (amplifier.plus, amplifier.minus, amplifier.output)
    return (*pins, *(net for net in (amplifier.positive, amplifier.negative) if net))


def _join(sets: Sets, nets: Iterable[str], stiff: frozenset[str]) -> None:
    first = ""
    for net in nets:
        if net in stiff:
            continue
        if first:
            sets.join(first, net)
        first = first or net


def _stiff(elements: list[Element]) -> frozenset[str]:
    """Return ground and the nets that ideal sources hold, stacked ones too.

    A source whose current steers another element is left out: its current is a sum over all parts.
    """
    steering = {e.control.element for e in elements if e.control is not None}
    sources = [e for e in elements if e.kind in _SOURCES and e.designator not in steering]
    held = {GROUND}
    grown = True
    while grown:
        grown = False
        for source in sources:
            a, b = source.nets[:2]
            if (a in held) != (b in held):
                held |= {a, b}
                grown = True
    return frozenset(held)


def source_levels(prepared: Prepared) -> dict[str, float]:
    """Return the DC level of every net that ideal sources hold, V; ground is 0."""
    volts = {drive.injection: drive.value for drive in prepared.levels}
    sources = [e for e in prepared.elements if e.kind in _SOURCES and e.designator in volts]
    levels = {GROUND: 0.0}
    grown = True
    while grown:
        grown = False
        for source in sources:
            a, b = source.nets[:2]
            if a not in levels and b in levels:
                levels[a] = levels[b] + volts[source.designator]
                grown = True
            elif b not in levels and a in levels:
                levels[b] = levels[a] - volts[source.designator]
                grown = True
    return levels


def _parts(
    prepared: Prepared,
    elements: list[Element],
    groups: dict[str, list[Amplifier]],
    stiff: frozenset[str],
    sets: Sets,
    own: set[int],
) -> tuple[Part, ...]:
    inside: dict[str, list[int]] = defaultdict(list)
    holders: dict[str, list[int]] = defaultdict(list)
    places_of: dict[int, int] = {}
    for place, element in enumerate(elements):
        if id(element) in own:
            places_of[id(element)] = place
        else:
            for root in {sets.find(net) for net in element.nets if net not in stiff}:
                inside[root].append(place)
        if element.kind in _SOURCES and all(net in stiff for net in element.nets[:2]):
            for net in element.nets[:2]:
                holders[net].append(place)
    parts = []
    for root, mates in groups.items():
        places = set(inside.get(root, ()))
        touched = {net for place in places for net in elements[place].nets}
        touched |= {
            net
            for place in places
            if (control := elements[place].control) is not None
            for net in control.nets
        }
        touched |= {net for amplifier in mates for net in _pins(amplifier)}
        places |= _holding(touched & stiff, holders, elements)
        places |= {places_of[id(a.element)] for a in mates if id(a.element) in places_of}
        chosen = tuple(elements[place] for place in sorted(places))
        names = {element.designator for element in chosen}
        tones = tuple(t for t in prepared.tones if any(name in names for name, _ in t.drives))
        own_prepared = msgspec.structs.replace(prepared, elements=chosen, tones=tones)
        parts.append(Part(own_prepared, tuple(mates)))
    return tuple(parts)


def _holding(
    nets: set[str] | frozenset[str], holders: dict[str, list[int]], elements: list[Element]
) -> set[int]:
    """Return the sources behind some stiff nets, down to ground."""
    found: set[int] = set()
    queue, seen = [net for net in nets if net != GROUND], set(nets) | {GROUND}
    while queue:
        for place in holders.get(queue.pop(), ()):
            found.add(place)
            fresh = set(elements[place].nets[:2]) - seen
            seen |= fresh
            queue += fresh
    return found
