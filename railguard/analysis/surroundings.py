"""What stands around one amplifier: its feedback network, its inputs' resistances, its load.

Worked out on the same circuit with every amplifier's output as a plain source (the passive view):
the inverse of that matrix gives the resistance at every net and the share of each output that
reaches it.
"""

from collections import defaultdict, deque
from collections.abc import Iterable, Mapping

import msgspec
import numpy as np

from railguard.analysis.dcpaths import DcMap, is_capacitor, leaves_sheet
from railguard.analysis.loop import Feedback
from railguard.analysis.network import Network
from railguard.analysis.ranges import Answers
from railguard.analysis.recognise import Amplifier
from railguard.analysis.solve import Factor, factor
from railguard.analysis.stage import Divider
from railguard.circuit.model import GROUND, Element

MID_HERTZ = 1000.0
"""Where the resistance at the inverting input is looked at: couplings short, parasitics open."""
TINY = 1e-12
BRIDGE_SPREAD = 1.1
"""The four arms of a sensor bridge are alike within this ratio; two bias dividers rarely are."""


class Passive(msgspec.Struct, frozen=True):
    """The circuit with every amplifier's output held: factors at DC and in mid-band.

    of  the network it is a view of
    """

    of: Network
    network: Network
    dc: Factor
    mid: Factor

    def resistance(self, net: str) -> float | None:
        """Return the resistance a net sees at DC, ohm; None for a net without a DC way."""
        row = self.network.row(net)
        if row < 0:
            return 0.0
        if net in self.network.floating:
            return None
        return float(self.dc.adjoint([row])[0, row].real)


def passive_view(active: Network) -> Passive:
    """Build the passive view of a circuit from its network."""
    network = active.again(frozenset(a.designator for a in active.amplifiers))
    return Passive(active, network, factor(network, 0.0), factor(network, MID_HERTZ))


class Ways:
    """Nets, what is on them, and which of them are held by something stiff."""

    def __init__(self, elements: Iterable[Element], amplifiers: Iterable[Amplifier]) -> None:
        self.around: dict[str, list[Element]] = defaultdict(list)
        self.held = {GROUND}
        own = {id(a.element) for a in amplifiers}
        for element in elements:
            if not element.fitted or id(element) in own:
                continue
            for net in dict.fromkeys(element.nets):
                self.around[net].append(element)
            if element.kind in ("V", "E", "battery") and GROUND in element.nets[:2]:
                self.held.update(element.nets[:2])
        self.outputs = {a.output for a in amplifiers}

    def shortest(self, start: str, goal: str, kinds: str = "RCL") -> tuple[Element, ...] | None:
        """Return the fewest passive elements from one net to another, over free nets only."""
        if start == goal:
            return ()
        seen = {start}
        queue: deque[tuple[str, tuple[Element, ...]]] = deque([(start, ())])
        while queue:
            at, way = queue.popleft()
            for element in self.around.get(at, ()):
                if not (element.kind in kinds or element.kind == "link") or len(element.nets) < 2:
                    continue
                for other in element.nets[:2]:
                    if other == goal:
                        return (*way, element)
                    free = other not in self.held and other not in self.outputs
                    if free and other not in seen:
                        seen.add(other)
                        queue.append((other, (*way, element)))
        return None


def feedback_of(
    amplifier: Amplifier, passive: Passive, ways: Ways, answers: Answers | None
) -> Feedback:
    """Return the network between an amplifier's output and its inverting input."""
    path = ways.shortest(amplifier.output, amplifier.minus, "RL")
    if path is None:
        path = ways.shortest(amplifier.output, amplifier.minus)
    if path is None:
        return Feedback()
    network = passive.network
    minus, branch = network.row(amplifier.minus), network.outputs.get(amplifier.designator, -1)
    if minus < 0 or branch < 0:
        return Feedback(elements=tuple(e.designator for e in path))
    row = passive.dc.adjoint([minus])[0].real
    share, own = float(row[branch]), float(row[minus])
    mid = passive.mid.adjoint([minus])[0]
    resistance = own / share if abs(share) > TINY else None
    if amplifier.output == amplifier.minus:
        resistance = 0.0
    between = {amplifier.output, amplifier.minus}
    capacitance = sum(
        e.value or 0.0
        for e in ways.around.get(amplifier.minus, ())
        if e.kind == "C" and set(e.nets[:2]) == between
    )
    first = [
        e
        for e in ways.around.get(amplifier.output, ())
        if e.kind == "R" and e.value and _leads_to(ways, e, amplifier)
    ]
    current = _peak_current(first, amplifier, answers) if answers is not None else None
    return Feedback(
        elements=tuple(e.designator for e in path),
        resistance=resistance,
        seen=min(abs(own), float(abs(mid[minus]))) if own > 0 else float(abs(mid[minus])),
        load=_load_of(first, amplifier, passive),
        capacitance=capacitance,
        current=current,
    )


def _leads_to(ways: Ways, element: Element, amplifier: Amplifier) -> bool:
    other = element.nets[1] if element.nets[0] == amplifier.output else element.nets[0]
    if other == amplifier.minus:
        return True
    if other in ways.held or other in ways.outputs:
        return False
    return ways.shortest(other, amplifier.minus, "R") is not None


def _load_of(first: list[Element], amplifier: Amplifier, passive: Passive) -> float | None:
    network = passive.network
    branch = network.outputs.get(amplifier.designator, -1)
    if not first or branch < 0:
        return None
    x = passive.dc.forward(network.right_hand_side([(amplifier.designator, 1.0)])).real
    siemens = 0.0
    for element in first:
        other = element.nets[1] if element.nets[0] == amplifier.output else element.nets[0]
        row = network.row(other)
        siemens += (1.0 - (x[row] if row >= 0 else 0.0)) / (element.value or np.inf)
    return float(1.0 / siemens) if siemens > TINY else None


def _peak_current(first: list[Element], amplifier: Amplifier, answers: Answers) -> float:
    network = answers.network
    out = network.row(amplifier.output)
    level, swing = 0.0, 0.0
    for element in first:
        other = element.nets[1] if element.nets[0] == amplifier.output else element.nets[0]
        row = network.row(other)
        siemens = 1.0 / (element.value or np.inf)
        level += siemens * (answers.x[out] - (answers.x[row] if row >= 0 else 0.0))
    for tone in answers.tones:
        peaks = []
        for worst in tone.worst:
            total = 0j
            for element in first:
                other = element.nets[1] if element.nets[0] == amplifier.output else element.nets[0]
                row = network.row(other)
                siemens = 1.0 / (element.value or np.inf)
                total += siemens * (worst.x[out] - (worst.x[row] if row >= 0 else 0.0))
            peaks.append(abs(total))
        swing += max(peaks, default=0.0)
    return float(abs(level) + swing)


def output_load(amplifier: Amplifier, passive: Passive) -> float | None:
    """Return the resistance an output works into at DC, its feedback network included, ohm."""
    network = passive.network
    branch = network.outputs.get(amplifier.designator, -1)
    if branch < 0:
        return None
    x = passive.dc.forward(network.right_hand_side([(amplifier.designator, 1.0)])).real
    amps = float(x[branch])
    return 1.0 / amps if amps > TINY else None


def load_capacitance(amplifier: Amplifier, ways: Ways) -> float:
    """Return the capacitance straight from an output to a held net, F."""
    total = 0.0
    for element in ways.around.get(amplifier.output, ()):
        if element.kind != "C" or element.value is None:
            continue
        other = element.nets[1] if element.nets[0] == amplifier.output else element.nets[0]
        if other in ways.held:
            total += element.value
    return total


def heaviest_load(amplifier: Amplifier, ways: Ways) -> str:
    """Return the designator of the smallest resistor on an output, or ""."""
    resistors = [e for e in ways.around.get(amplifier.output, ()) if e.kind == "R" and e.value]
    return min(resistors, key=lambda e: abs(e.value or 0.0)).designator if resistors else ""


def divider_at(net: str, ways: Ways, rails: frozenset[str]) -> Divider | None:
    """Return the resistive divider between a rail and a return that sets a net's level."""
    up, down = [], []
    bypass, unknown = 0.0, ""
    for element in ways.around.get(net, ()):
        if len(element.nets) < 2:
            continue
        other = element.nets[1] if element.nets[0] == net else element.nets[0]
        if element.kind == "R" and element.value:
            if other in rails:
                up.append(element)
            elif other == GROUND:
                down.append(element)
        elif is_capacitor(element) and (other == GROUND or other in rails):
            bypass += element.value or 0.0
            unknown = unknown or ("" if element.value else element.designator)
    sides = [*up, *down]
    if not up or len(sides) < 2:
        return None
    siemens = sum(1.0 / (e.value or np.inf) for e in sides)
    return Divider(tuple(e.designator for e in sides), 1.0 / siemens, bypass, unknown)


def series_resistance(net: str, dc: DcMap, limit: int = 200) -> float | None:
    """Return the least series resistance from a net to what drives it, ohm; None: not known."""
    best: dict[str, float] = {net: 0.0}
    queue = [(0.0, net)]
    while queue and limit:
        limit -= 1
        queue.sort()
        ohms, at = queue.pop(0)
        if dc.is_potential(at):
            return ohms
        for element in dc.at(at):
            if leaves_sheet(element) and at != net:
                return ohms
            if element.kind in ("R", "L", "link", "C") and len(element.nets) >= 2:
                step = (element.value or 0.0) if element.kind == "R" else 0.0
                for other in element.nets[:2]:
                    if other != at and ohms + step < best.get(other, np.inf):
                        best[other] = ohms + step
                        queue.append((ohms + step, other))
    return None


MOST_AT_A_TAP = 12
"""Resistors on the tap of a half-bridge: its own two, and what an amplifier adds."""


def bridge_resistors(
    elements: Iterable[Element], amplifiers: Iterable[Amplifier]
) -> frozenset[str]:
    """Return the resistors of bridges: two half-bridges between the same nets, a sensor's own.

    Their mismatch is the measured quantity, so no default tolerance applies to them. Where other
    dividers stand between those nets, the two taps that one instrumentation amplifier compares.
    """
    amplifiers = tuple(amplifiers)
    if not amplifiers:
        return frozenset()
    resistors = [e for e in elements if e.kind == "R" and e.fitted and e.value]
    ohms = {e.designator: e.value or 0.0 for e in resistors}
    around: dict[str, list[Element]] = defaultdict(list)
    for element in resistors:
        for net in element.nets[:2]:
            around[net].append(element)
    inputs = {net for a in amplifiers for net in (a.plus, a.minus)}
    halves: dict[frozenset[str], list[tuple[str, tuple[str, str]]]] = defaultdict(list)
    for net, found in around.items():
        if len(found) > MOST_AT_A_TAP:
            continue  # a rail or a return
        for i, first in enumerate(found):
            for second in found[i + 1 :]:
                ends = frozenset({n for e in (first, second) for n in e.nets[:2] if n != net})
                if len(ends) == 2:
                    halves[ends].append((net, (first.designator, second.designator)))
    bridge: set[str] = set()
    for found_halves in halves.values():
        taps = {net for net, _ in found_halves}
        names = {name for _, pair in found_halves for name in pair}
        if len(taps) == 2 and len(names) == 4 and taps & inputs and _alike(names, ohms):
            bridge.update(names)
            continue
        for i, (tap, pair) in enumerate(found_halves):
            for other, fellows in found_halves[i + 1 :]:
                both = {*pair, *fellows}
                if (
                    len(both) == 4
                    and _alike(both, ohms)
                    and _compared(tap, other, amplifiers, around)
                ):
                    bridge.update(both)
    return frozenset(bridge)


def _alike(names: set[str], ohms: Mapping[str, float]) -> bool:
    values = [ohms[name] for name in names]
    return max(values) <= BRIDGE_SPREAD * min(values)


def _compared(
    tap: str, other: str, amplifiers: tuple[Amplifier, ...], around: Mapping[str, list[Element]]
) -> bool:
    """Tell whether two nets are the inputs of amplifiers that a resistor joins: of two or three."""
    first = [a for a in amplifiers if a.plus == tap]
    second = [a for a in amplifiers if a.plus == other]
    return tap != other and any(
        _joined(one, two, around) or _joined(two, one, around) for one in first for two in second
    )


def _joined(one: Amplifier, two: Amplifier, around: Mapping[str, list[Element]]) -> bool:
    ends = {one.minus, one.output}
    return any(ends & set(e.nets[:2]) for e in around.get(two.minus, ()))
