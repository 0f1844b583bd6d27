"""Whether an input has a DC path, and to what.

An input is held when its net reaches a net of defined potential through elements that conduct at
DC: resistors, inductors, links, voltage sources. Capacitors, current sources and op-amp inputs do
not conduct; op-amp outputs, sources and rails define a potential. A net that leaves what can be
seen is open, not unbiased.
"""

import re
from collections import defaultdict, deque
from collections.abc import Iterable, Mapping
from typing import Literal, NamedTuple

import msgspec

from railguard.analysis.recognise import Amplifier
from railguard.circuit.model import GROUND, Element

_CONDUCTS = frozenset({"R", "L", "link", "V", "E", "H", "battery"})
_UNSEEN = frozenset({"open", "ic", "opaque", "X", "B", "S", "W", "T", "G", "F"})
_NON_LINEAR = frozenset({"D", "Q", "J", "M"})


State = Literal["held", "open", "floating", "held-by-own-output"]


class DcPath(msgspec.Struct, frozen=True):
    """What a search from an input met.

    state  "held", "held-by-own-output", "open" or "floating"
    via    designators of the way to the potential; for "open" and "floating" what the net hangs on
    """

    state: State
    via: tuple[str, ...]


class _Met(NamedTuple):
    """What stands on a net: (net behind, designator) of what conducts, designators of the rest."""

    conducting: list[tuple[str, str]]
    unseen: list[str]
    hanging: list[str]


class DcMap:
    """The circuit's nets and what conducts between them at DC."""

    def __init__(
        self,
        elements: Iterable[Element],
        amplifiers: Iterable[Amplifier],
        stated: Iterable[str],
    ) -> None:
        """Index the elements.

        stated  nets whose potential the user or a rail's name states
        """
        self._around: Mapping[str, list[Element]] = defaultdict(list)
        own = {id(a.element) for a in amplifiers}
        for element in elements:
            if element.fitted and id(element) not in own:
                for net in dict.fromkeys(element.nets):
                    self._around[net].append(element)
        self._outputs: dict[str, set[str]] = defaultdict(set)
        for amplifier in amplifiers:
            self._outputs[amplifier.output].add(amplifier.designator)
        self._potentials = {GROUND, *stated}
        self._sorted: dict[str, _Met] = {}

    def at(self, net: str) -> list[Element]:
        """Return the elements on a net, amplifiers left out."""
        return self._around.get(net, [])

    def is_potential(self, net: str) -> bool:
        """Tell whether a net's potential is stated or driven."""
        return net in self._potentials or net in self._outputs

    def _met(self, net: str) -> "_Met":
        """Sort the elements on a net, once however many inputs are searched from."""
        found = self._sorted.get(net)
        if found is None:
            found = self._sorted[net] = _Met([], [], [])
            for element in self.at(net):
                name = element.designator
                if element.kind in _CONDUCTS and len(element.nets) >= 2:
                    found.conducting.extend((o, name) for o in element.nets[:2] if o != net)
                elif element.kind in _NON_LINEAR or _leaves(element):
                    found.unseen.append(name)
                else:
                    found.hanging.append(name)
        return found

    def path(self, net: str, own: str) -> DcPath:
        """Search from the net of an input; `own` is its amplifier's designator."""
        seen = {net}
        queue: deque[tuple[str, tuple[str, ...]]] = deque([(net, ())])
        through_own: tuple[str, ...] | None = None
        unseen: list[str] = []
        hangs: list[str] = []
        while queue:
            at, way = queue.popleft()
            if at in self._potentials:
                return DcPath("held", way)
            drivers = self._outputs.get(at, set())
            if drivers - {own}:
                return DcPath("held", way)
            if own in drivers:
                through_own = way
                continue
            met = self._met(at)
            for other, name in met.conducting:
                if other not in seen:
                    seen.add(other)
                    queue.append((other, (*way, name)))
            unseen += met.unseen
            hangs += met.hanging
        if unseen:
            return DcPath("open", tuple(dict.fromkeys(unseen)))
        if through_own is not None:
            return DcPath("held-by-own-output", through_own)
        return DcPath("floating", tuple(dict.fromkeys(hangs)))


def _leaves(element: Element) -> bool:
    if element.designator.upper().lstrip("X").startswith("TP"):
        return False  # a test point is a place to put a probe, nothing comes from it
    if element.kind in ("G", "F") and is_linear(element):
        return False  # its current is a factor of another quantity: the equations hold it
    return element.kind in _UNSEEN


def is_linear(element: Element) -> bool:
    """Tell whether a controlled source (E, F, G, H) is a plain factor of what steers it."""
    control = element.control
    if control is None or control.gain is None:
        return False
    return bool(control.element) if element.kind in ("F", "H") else len(control.nets) == 2


def is_capacitor(element: Element) -> bool:
    """Tell whether an element is a capacitor, though perhaps one whose card gives no value."""
    named = element.kind == "opaque" and re.match(r"(?i)C\d", element.designator.split(".")[-1])
    return len(element.nets) == 2 and (element.kind == "C" or bool(named))


def leaves_sheet(element: Element) -> bool:
    """Tell whether what an element does to its nets cannot be seen from the netlist."""
    return element.kind not in _NON_LINEAR and _leaves(element)
