"""Takes an op-amp's macromodel out of a deck, flat, as values that can be simulated."""

from collections.abc import Mapping

import msgspec

from railguard.analysis.transistors import scoped
from railguard.circuit.flatten import flatten
from railguard.circuit.model import Element, Model
from railguard.deck.files import Deck
from railguard.deck.lines import Line
from railguard.devices.model import Match
from railguard.devices.pinouts import pin_order
from railguard.engine.relations import Relation, linear_currents, relation
from railguard.engine.write import Placed
from railguard.errors import EngineError, UsageError

PINS = ("in+", "in-", "v+", "v-", "out")
"""Nets the amplifier's pins stand on."""

_INSTANCE = "Xmeasured"


class Specimen(msgspec.Struct, frozen=True):
    """A macromodel, flat, with its pins on the nets of `PINS`."""

    name: str
    elements: tuple[Element, ...]
    models: Mapping[str, Model]
    placed: tuple[Placed, ...] = ()
    bodies: tuple[str, ...] = ()


def specimen(deck: Deck, name: str, pins: tuple[str, ...] = ()) -> Specimen:
    """Take a subcircuit out of a deck, flat, its pins on the nets of `PINS`.

    pins  the order of its ports as the user states it

    Raises:
        UsageError: there is no such subcircuit, or its pins cannot be told.
        EngineError: it holds something that cannot be simulated from values alone.
    """
    found = flatten(deck).subcircuits.get(name.lower())
    if found is None:
        raise UsageError(f"{deck.path} defines no subcircuit {name}.")
    count = len(found.ports)
    order = pin_order(Match(name, "op-amp", channels=1), count, found.ports, found.notes, pins)
    channel = order.channels[0] if order else None
    if channel is None or channel.positive is None or channel.negative is None:
        raise UsageError(
            f"{name} has {count} ports ({' '.join(found.ports)}); an op-amp with supply pins is "
            "needed.",
            found.location,
            "State their order with --pins, one name for each port: in+ in- v+ v- out nc.",
        )
    nets = [f"port{place}" for place in range(count)]
    places = (channel.plus, channel.minus, channel.positive, channel.negative, channel.output)
    for place, pin in zip(places, PINS, strict=True):
        nets[place] = pin
    card = f"{_INSTANCE} {' '.join(nets)} {found.name}"
    line = Line(deck.path, card, 1)
    circuit = flatten(msgspec.structs.replace(deck, lines=(*deck.lines, line)))
    inside = [e for e in circuit.elements if e.designator.startswith(f"{_INSTANCE}.")]
    if not inside:
        raise EngineError(f"Nothing of {name}'s inside could be read.", found.location)
    return _writable(found.name, inside, circuit.models)


def _writable(name: str, inside: list[Element], models: Mapping[str, Model]) -> Specimen:
    """Turn sources with expressions and polynomials into what the deck writer takes."""
    plain: list[Element] = []
    made: list[Relation] = []
    for element in inside:
        control = element.control
        factor = element.kind != "B" and control is not None and control.gain is not None
        if element.kind in "DQJM":
            plain.append(_with_model(element, models))
        elif element.kind not in "BEGFH" or factor:
            plain.append(element)
        elif element.kind in "FH":
            terms = linear_currents(element)
            if terms is None:
                raise _not_simulated(element)
            plain += terms
        else:
            written = relation(element, f"rel{len(made) + 1}")
            if written is None:
                raise _not_simulated(element)
            made.append(written)
    return Specimen(
        name,
        tuple(plain),
        models,
        tuple(one.placed for one in made),
        tuple(one.body for one in made),
    )


def _with_model(element: Element, models: Mapping[str, Model]) -> Element:
    """Name a device's model by the scope it stands in, looked for from the inside out."""
    found = scoped(element, models)
    if found.model in models:
        return found
    raise EngineError(
        f"{element.designator.partition('.')[2]} of the model cannot be simulated: its model "
        f"{element.model} is not in the file.",
        element.location,
    )


def _not_simulated(element: Element) -> EngineError:
    text = element.control.text if element.control else ""
    return EngineError(
        f"{element.designator.partition('.')[2]} of the model cannot be simulated: its relation "
        f"({text[:60]}) is not made of plain numbers, voltages and common functions.",
        element.location,
    )
