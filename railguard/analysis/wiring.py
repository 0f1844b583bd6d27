"""What the wiring of a card says: which nets are stiff, and where an output cannot be."""

from collections.abc import Mapping

from railguard.circuit.model import GROUND, Circuit, Element
from railguard.circuit.rails import level_from_name
from railguard.devices.model import Channel, PinOrder
from railguard.devices.pinnames import channels_from
from railguard.devices.pinouts import PACKAGES, USUAL, USUAL_CHANNEL

PACKAGE_CHANNELS = tuple(
    channel for name in ("SOT-23-5", "SC70-5") for channel in channels_from(PACKAGES[name])
)
"""Both pin-outs of single amplifiers in small packages; which a device has, its order code says."""


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
    """Return the pin order that a card's wiring shows where the assumed one contradicts it.

    An assumed order stands unless it drives a supply with the output, or ground, and leaves a
    supply pin without one. Then the first of these stands that does not: on a board card the order
    of the schematic symbol (the usual one); elsewhere the output before the supplies; on both, the
    pins 1 to 5 of a small package. All but the usual one only where the output feeds the inverting
    input back, which no supply does.
    """
    nets = element.nets
    if order.basis != "assumed" or len(order.channels) != 1 or len(nets) != len(USUAL):
        return order

    def stiff(pin: int | None) -> bool:
        return pin is not None and (nets[pin] in rails or nets[pin] == GROUND)

    def contradicted(channel: Channel) -> bool:
        supplied = stiff(channel.positive) and stiff(channel.negative)
        return stiff(channel.output) and not supplied

    def fits(channel: Channel) -> bool:
        supplied = stiff(channel.positive) and stiff(channel.negative)
        return (
            supplied
            and not stiff(channel.output)
            and nets[channel.positive or 0] != nets[channel.negative or 0]
        )

    def shows(channel: Channel) -> bool:
        back = frozenset((nets[channel.output], nets[channel.minus]))
        return fits(channel) and (len(back) == 1 or back in joined)

    (assumed,) = order.channels
    board = element.kind == "ic"
    if board and not fits(assumed) and fits(USUAL_CHANNEL[0]):
        return _shown(USUAL_CHANNEL[0])
    if (board and not shows(assumed)) or contradicted(assumed):
        others = PACKAGE_CHANNELS if board else (_output_third(nets, rails), *PACKAGE_CHANNELS)
        return next((_shown(channel) for channel in others if shows(channel)), order)
    return order


def _output_third(nets: tuple[str, ...], rails: Mapping[str, float | None]) -> Channel:
    """Return the order with the output before the supplies, the higher of them the positive one."""
    first, second = (0.0 if net == GROUND else rails.get(net) for net in nets[3:5])
    turned = first is not None and second is not None and first < second
    positive, negative = (4, 3) if turned else (3, 4)
    return Channel(plus=0, minus=1, positive=positive, negative=negative, output=2)


def _shown(channel: Channel) -> PinOrder:
    pins = (
        (channel.plus, "non-inverting"),
        (channel.minus, "inverting"),
        (channel.positive, "positive supply"),
        (channel.negative, "negative supply"),
        (channel.output, "output"),
    )
    words = ", ".join(word for _, word in sorted(pins, key=lambda pin: pin[0] or 0))
    return PinOrder(
        channels=(channel,),
        basis="assumed",
        remark=f"the pin order is taken from what stands on the nets ({words})",
    )
