"""Which elements are amplifiers, with which device and pins.

Here the circuit and the catalogue meet. An amplifier comes from a closed X card or an IC of a
board export whose name the catalogue knows (or which is called just OPAMP), or from an E source
wired as an amplifier. What is an IC but no op-amp stays opaque.
"""

from collections import defaultdict
from collections.abc import Mapping
from functools import cache

import msgspec

from railguard.analysis.wiring import joined_nets, order_by_wiring, stiff_nets, wired_as_one
from railguard.circuit.flatten import Closed
from railguard.circuit.model import GROUND, Circuit, Element
from railguard.devices.catalogue import Catalogue
from railguard.devices.model import Match
from railguard.devices.names import package_of, schematic_name
from railguard.devices.pinouts import pin_order
from railguard.notices import Remark
from railguard.settings.model import Settings

CONTROLLED_GAIN = 1000.0
"""An E source with at least this gain, fed from a net no source holds, is an amplifier."""


class Amplifier(msgspec.Struct, frozen=True, kw_only=True):
    """One op-amp channel as it is wired.

    positive, negative  supply nets; "" where the card has no such pin
    gain                open-loop gain of an E source; None: the device's
    """

    designator: str
    schematic: str
    package: str
    element: Element
    match: Match
    plus: str
    minus: str
    positive: str
    negative: str
    output: str
    gain: float | None = None

    @property
    def has_supply(self) -> bool:
        """Tell whether the card has supply pins at all."""
        return bool(self.positive and self.negative)


class Recognised(msgspec.Struct, frozen=True):
    """The amplifiers of a circuit, the ICs that are none, and what had to be assumed.

    unknown  elements that may be op-amps but whose name nobody knows
    """

    amplifiers: tuple[Amplifier, ...]
    others: tuple[tuple[Element, Match], ...]
    unknown: tuple[tuple[Element, Match], ...]
    remarks: tuple[Remark, ...]


def keeps_closed(catalogue: Catalogue) -> Closed:
    """Return the predicate flattening asks: is this subcircuit a device, not a sheet?

    A name nobody knows is one where its header or the comment beside it names an op-amp's pins and
    its body calls no other subcircuit: a macromodel, whose inside is no part of the design.
    """

    @cache
    def closed(name: str, ports: tuple[str, ...], notes: tuple[str, ...], calls: bool) -> bool:
        match = catalogue.match(name, suggest=False)
        if match.sort == "unknown":
            return not calls and _named_pins(match, ports, notes)
        if match.sort == "generic":
            return 3 <= len(ports) <= 8
        return len(ports) >= 3

    return closed


def recognise(circuit: Circuit, catalogue: Catalogue, settings: Settings) -> Recognised:
    """Find every amplifier of the flat circuit.

    A stated pin order (`pins` of `[stages]`) wins over the header, the header over the usual order.
    """
    amplifiers: list[Amplifier] = []
    others: list[tuple[Element, Match]] = []
    unknown: list[tuple[Element, Match]] = []
    assumed: dict[str, list[str]] = defaultdict(list)
    rails, joined = stiff_nets(circuit), joined_nets(circuit)
    for element in circuit.elements:
        if not element.fitted:
            continue
        if element.kind in ("X", "ic"):
            match = catalogue.match(element.model)
            wired = _named_pins(match, element.ports, element.pin_notes) or wired_as_one(
                element, rails
            )
            if match.sort == "unknown" and not wired:
                unknown.append((element, match))
                continue
            if match.sort not in ("op-amp", "generic", "unknown"):
                others.append((element, match))
                continue
            found, remark = _channels(element, match, settings, rails, joined)
            if not found:
                unknown.append((element, match))
            amplifiers += found
            if remark:
                assumed[remark].append(element.designator)
            if match.also and match.device is not None:
                names = " or ".join((match.device.family, *match.also))
                text = f"{match.name} may be {names}; taken for the first"
                assumed[text].append(element.designator)
        elif element.kind in ("E", "G") and (gain := _gain_of(element, circuit)) is not None:
            amplifiers.append(_controlled(element, gain))
    remarks = tuple(
        Remark(message=f"{_names(subjects)}: {text}") for text, subjects in assumed.items()
    )
    return Recognised(_grouped(amplifiers), tuple(others), tuple(unknown), remarks)


def _named_pins(match: Match, ports: tuple[str, ...], notes: tuple[str, ...]) -> bool:
    """Tell whether header or comment say which pin is which on an op-amp with its supply."""
    order = pin_order(match, len(ports), ports, notes) if len(ports) >= 5 else None
    if order is None or order.basis != "netlist" or len(order.channels) != 1:
        return False
    channel = order.channels[0]
    return channel.positive is not None and channel.negative is not None


def _names(subjects: list[str]) -> str:
    shown = ", ".join(subjects[:6])
    return shown if len(subjects) <= 6 else f"{shown} and {len(subjects) - 6} more"


def _stated_pins(element: Element, settings: Settings) -> tuple[str, ...]:
    for name in (element.designator, schematic_name(element.designator)):
        if name in settings.pins:
            return settings.pins[name]
    return ()


def _channels(
    element: Element,
    match: Match,
    settings: Settings,
    rails: Mapping[str, float | None],
    joined: frozenset[frozenset[str]],
) -> tuple[list[Amplifier], str]:
    order = pin_order(
        match,
        len(element.nets),
        element.ports,
        element.pin_notes,
        _stated_pins(element, settings),
        element.kind == "ic",
    )
    if order is None:
        return [], ""
    order = order_by_wiring(element, order, rails, joined)
    found = []
    package, _unit = package_of(element.designator)
    for channel in order.channels:
        suffix = channel.suffix if len(order.channels) > 1 else ""
        nets = element.nets
        found.append(
            Amplifier(
                designator=element.designator + suffix,
                schematic=schematic_name(element.designator) + suffix,
                package=schematic_name(element.designator) if suffix else package,
                element=element,
                match=match,
                plus=nets[channel.plus],
                minus=nets[channel.minus],
                positive="" if channel.positive is None else nets[channel.positive],
                negative="" if channel.negative is None else nets[channel.negative],
                output=nets[channel.output],
            )
        )
    return found, order.remark if order.basis == "assumed" else ""


def _grouped(amplifiers: list[Amplifier]) -> tuple[Amplifier, ...]:
    """Undo the grouping of sub-units that are not one package.

    `XU3A` and `XU3B` are one package only where both exist and carry the same device; a lone
    `XUA` or a device with one channel is its own package.
    """
    by_package: dict[str, list[Amplifier]] = defaultdict(list)
    for amplifier in amplifiers:
        by_package[amplifier.package].append(amplifier)
    result = []
    for amplifier in amplifiers:
        mates = by_package[amplifier.package]
        same = {m.match.device.family if m.match.device else m.match.name for m in mates}
        channels = amplifier.match.channels
        fits = channels is None or len(mates) <= max(channels, 1)
        alone = len(mates) == 1 and amplifier.element.kind != "ic"
        if len(same) > 1 or not fits or alone:
            result.append(msgspec.structs.replace(amplifier, package=amplifier.schematic))
        else:
            result.append(amplifier)
    return tuple(result)


def _gain_of(element: Element, circuit: Circuit) -> float | None:
    """Return the open-loop gain of a controlled source wired as an amplifier, V/V; else None.

    An E source with its own gain, a G source with the one it makes of the resistor at its output.
    A supply or a test source with a high gain has both ends of its control on one net or its
    output on ground.
    """
    control = element.control
    if control is None or control.gain is None or len(set(control.nets)) != 2:
        return None
    out, back = element.nets[:2]
    gain = control.gain
    if element.kind == "G":
        # Current leaves the first net through the source, so driven nets fall with a positive gain.
        if back != GROUND and out == GROUND:
            out, back = back, out
        else:
            gain = -gain
        siemens = sum(
            1.0 / e.value
            for e in circuit.elements
            if e.kind == "R" and e.value and set(e.nets[:2]) == {out, GROUND}
        )
        gain = gain / siemens if siemens else 0.0
    if out == GROUND or back != GROUND or abs(gain) < CONTROLLED_GAIN:
        return None
    return gain


def _controlled(element: Element, gain: float) -> Amplifier:
    nets = element.control.nets if element.control is not None else ("", "")
    plus, minus = nets if gain > 0 else nets[::-1]
    output = next(net for net in element.nets[:2] if net != GROUND)
    return Amplifier(
        designator=element.designator,
        schematic=element.designator,
        package=element.designator,
        element=element,
        match=Match(name="controlled source", sort="generic"),
        plus=plus,
        minus=minus,
        positive="",
        negative="",
        output=output,
        gain=abs(gain),
    )
