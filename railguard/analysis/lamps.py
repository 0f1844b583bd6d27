"""Diodes between a supply and a transistor that sinks its current: lamps, strings of them.

What such a diode drops does not move what its transistor's loop holds; it only says whether enough
is left across the transistor. So it is taken for the most it may drop.
"""

import math
from collections.abc import Iterable, Mapping

from railguard.analysis.network import Network
from railguard.analysis.transistors import THERMAL_VOLTS, scoped
from railguard.circuit.model import Element, Model

MOST_VOLTS = 4.0
"""Across a diode without a model, the brightest lamps included: common practice, no source."""
MOST_AMPS = 0.1
"""At which a diode with a model is looked at: common practice, no source."""
SERIES_OHMS = 1.0
_PASSING = frozenset({"R", "L", "link"})


def lamps_at(
    net: str, sign: int, network: Network, elements: Iterable[Element]
) -> tuple[Element, ...]:
    """Return the diodes that feed a net which nothing else gives a DC level.

    sign     1 where current flows out of the net into a transistor, -1 the other way
    network  without the transistors and the diodes
    """
    if net not in network.floating:
        return ()
    near = [e for e in elements if e.fitted and len(e.nets) >= 2 and e.kind in {"D", *_PASSING}]
    found: dict[str, Element] = {}
    seen, queue = {net}, [net]
    while queue:
        at = queue.pop()
        for element in near:
            ends = element.nets[:2] if sign > 0 else element.nets[1::-1]
            if element.kind == "D" and ends[1] == at:
                other = ends[0]
                found[element.designator] = element
            elif element.kind in _PASSING and at in ends:
                other = ends[0] if ends[1] == at else ends[1]
            else:
                continue
            if other in network.floating and other not in seen:
                seen.add(other)
                queue.append(other)
    return tuple(found.values())


def drop_of(diode: Element, models: Mapping[str, Model]) -> float:
    """Return the most a diode drops, V: n kT/q ln(I/IS) where its model gives IS."""
    model = models.get(scoped(diode, models).model.casefold())
    given = model.parameters if model is not None else {}
    saturation = given.get("is", 0.0)
    if saturation <= 0:
        return MOST_VOLTS
    slope = (given.get("n", 1.0) or 1.0) * THERMAL_VOLTS
    volts = slope * math.log(max(MOST_AMPS / saturation, 1.0)) + MOST_AMPS * given.get("rs", 0.0)
    return min(max(volts, 0.0), MOST_VOLTS)


def injection_of(diode: Element) -> str:
    """Return the name of the source that stands for what a diode drops."""
    return f"voltage of {diode.designator}"


def elements_of(diode: Element) -> list[Element]:
    """Return what stands for a conducting diode in the equations."""
    anode, cathode = diode.nets[:2]
    inner = f"{diode.designator} inside"
    return [
        Element(kind="V", designator=injection_of(diode), nets=(anode, inner)),
        Element(
            kind="R",
            designator=f"junction of {diode.designator}",
            nets=(inner, cathode),
            value=SERIES_OHMS,
        ),
    ]
