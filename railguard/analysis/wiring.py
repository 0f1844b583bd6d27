"""What the wiring of a card says: which nets are stiff, and where an output cannot be."""

from collections.abc import Mapping

from railguard.circuit.model import GROUND, Circuit, Element
from railguard.circuit.rails import level_from_name
from railguard.devices.model import Channel, PinOrder
from railguard.devices.pinouts import USUAL, USUAL_CHANNEL


def stiff_nets(circuit: Circuit) -> dict[str, float | None]:
    """Return the nets that a standing source holds or whose name states a level, with the level.

    None where the source stands on another one.
    """
    held: dict[str, float | None] = {}
    for e in circuit.elements:
        for net in e.nets:
            level = level_from_name(net)
            if level is not None:
                held.setdefault(net, level)
    for e in circuit.elements:
        source = e.source
        if e.kind != "V" or source is None or not source.dc or source.wave or source.ac is not None:
            continue
        up, down = e.nets[:2]
        if up != GROUND:
            held[up] = source.dc if down == GROUND else None
        if down != GROUND:
            held[down] = -source.dc if up == GROUND else None
    return held


def wired_as_one(element: Element, rails: Mapping[str, float | None]) -> bool:
    """Tell whether a card nobody knows is wired as an op-amp in the usual order is.

    Five nets, the third a rail, the fourth another rail or ground, the fifth neither.
    """
    if len(element.nets) != 5 or element.ports:
        return False
    positive, negative, output = element.nets[2:]
    ends = positive in rails and (negative in rails or negative == GROUND)
    ends = ends and positive != negative
    return ends and output not in rails and output != GROUND


def joined_nets(circuit: Circuit) -> frozenset[frozenset[str]]:
    """Return the pairs of nets that a resistor or a capacitor joins."""
    return frozenset(frozenset(e.nets[:2]) for e in circuit.elements if e.kind in ("R", "C"))


def order_by_wiring(
    element: Element,
    order: PinOrder,
    rails: Mapping[str, float | None],
    joined: frozenset[frozenset[str]],
) -> PinOrder:
    """Return the pin order that a card's wiring shows where the usual one contradicts it.

    Some libraries put the output before the supplies. Taken so only where the usual order would
    drive a supply with the output and leave a supply pin without one, and the third net feeds the
    inverting input back, which no supply does.
    """
    nets = element.nets
    if order.basis != "assumed" or order.channels != USUAL_CHANNEL or len(nets) != len(USUAL):
        return order

    def feeds(*pins: int) -> bool:
        return all(nets[pin] in rails or nets[pin] == GROUND for pin in pins)

    if not feeds(4) or feeds(2, 3):
        return order
    if not feeds(3, 4) or feeds(2) or nets[3] == nets[4]:
        return order
    if nets[2] != nets[1] and frozenset(nets[1:3]) not in joined:
        return order
    first, second = (0.0 if nets[pin] == GROUND else rails[nets[pin]] for pin in (3, 4))
    turned = first is not None and second is not None and first < second
    positive, negative = (4, 3) if turned else (3, 4)
    words = "non-inverting, inverting, output, " + (
        "negative supply, positive supply" if turned else "positive supply, negative supply"
    )
    return PinOrder(
        channels=(Channel(plus=0, minus=1, positive=positive, negative=negative, output=2),),
        basis="assumed",
        remark=f"the pin order is taken from what stands on the nets ({words})",
    )
