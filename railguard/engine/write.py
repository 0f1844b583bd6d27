"""Writes elements of the flat circuit as a deck for ngspice, from values only.

Nothing of a netlist's own text reaches the deck: nets are renamed n1, n2, ..., elements are
counted, numbers are printed by us, models carry known parameters only. PySpice's Circuit makes the
cards. What cannot be written is listed, and so is every stand-in for a model that is missing.
"""

import logging
import warnings
from collections.abc import Callable, Iterable, Mapping, Sequence
from typing import TYPE_CHECKING, Any

import msgspec

from railguard.analysis.transistors import area_of
from railguard.circuit.model import GROUND, Element, Model
from railguard.engine.semiconductors import model_for
from railguard.engine.waves import number, source_text

if TYPE_CHECKING:
    from PySpice.Spice.Netlist import Circuit as Netlist

LINK_OHMS = 1e-3
"""Resistance of what conducts without resistance: a voltage source would make loops."""
STRAY_SIEMENS = 1e-12
"""Conductance from every net to ground, so that a net held by capacitors only has a level."""


class Placed(msgspec.Struct, frozen=True):
    """An instance of one of the engine's own subcircuits.

    designator  of the element it stands for
    nets        circuit nets in the order of the subcircuit's pins
    """

    designator: str
    subcircuit: str
    nets: tuple[str, ...]


class Note(msgspec.Struct, frozen=True):
    """Something about one element that the deck does not show as the netlist has it."""

    designator: str
    text: str


class Written(msgspec.Struct, frozen=True):
    """A deck without analyses, and the way back from its names.

    nodes      by net
    sources    name in the deck of each written V element, by designator: its current can be read
    left_out   elements that are not in the deck, with the reason
    stand_ins  elements with a model that the netlist does not state
    """

    text: str
    nodes: Mapping[str, str]
    sources: Mapping[str, str]
    left_out: tuple[Note, ...]
    stand_ins: tuple[Note, ...]


def write(
    elements: Iterable[Element],
    models: Mapping[str, Model],
    placed: Sequence[Placed] = (),
    bodies: Sequence[str] = (),
    options: Mapping[str, float] | None = None,
) -> Written:
    """Write a deck.

    elements  those `placed` stands for must not be among them
    bodies    the text of the subcircuits `placed` uses: our own, never a netlist's
    options   simulator options by name, numbers only
    """
    deck = _Deck(models)
    waiting = []
    for element in elements:
        if not element.fitted:
            continue
        # What senses a current needs the name of a source that may stand further down.
        if element.kind in ("F", "H"):
            waiting.append(element)
        else:
            deck.add(element)
    for element in waiting:
        deck.add(element)
    for index, instance in enumerate(placed, start=1):
        nodes = [deck.node(net) for net in instance.nets]
        deck.netlist.X(str(index), instance.subcircuit, *nodes)
    settings = {"rshunt": 1 / STRAY_SIEMENS, **(options or {})}
    card = ".options " + " ".join(f"{name}={number(value)}" for name, value in settings.items())
    deck.netlist.raw_spice = "".join(f"{body.rstrip()}\n" for body in (card, *bodies))
    return Written(
        text=str(deck.netlist).replace("\r\n", "\n"),
        nodes=dict(deck.nodes),
        sources=dict(deck.sources),
        left_out=tuple(deck.left_out),
        stand_ins=tuple(deck.stand_ins),
    )


def new_netlist() -> "Netlist":
    """Return an empty PySpice circuit with our title, its import kept quiet."""
    # PySpice costs tens of milliseconds and is only needed once something is simulated. Its log
    # complains of versions and of nets named like keywords, neither of which matters here.
    logging.getLogger("PySpice").setLevel(logging.CRITICAL)
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        from PySpice.Spice.Netlist import Circuit as Netlist
    return Netlist("railguard")


class _Deck:
    """Collects cards, one counter per letter."""

    def __init__(self, models: Mapping[str, Model]) -> None:
        self.netlist = new_netlist()
        self.nodes: dict[str, str] = {GROUND: GROUND}
        self.sources: dict[str, str] = {}
        self.left_out: list[Note] = []
        self.stand_ins: list[Note] = []
        self._models = models
        self._written_models: dict[tuple[str, str], str] = {}
        self._counts: dict[str, int] = {}

    def node(self, net: str) -> str:
        return self.nodes.setdefault(net, f"n{len(self.nodes)}")

    def add(self, element: Element) -> None:
        writer = _WRITERS.get(element.kind)
        reason = "the engine does not write this kind of element"
        if writer is not None and len(element.nets) >= 2:
            reason = writer(self, element)
        elif element.kind in ("open", "opaque", "ic", "X"):
            reason = "nothing is known of its inside"
        if reason:
            self.left_out.append(Note(element.designator, reason))

    def name(self, letter: str) -> str:
        self._counts[letter] = self._counts.get(letter, 0) + 1
        return str(self._counts[letter])

    def model(self, element: Element) -> str | None:
        """Return the deck's name for an element's model; None where there can be none."""
        key = (element.kind, element.model.lower())
        found = model_for(element.kind, element.model, self._models)
        if found is None:
            return None
        if found.stand_in:
            what = f"model {element.model}" if element.model else "its model"
            text = f"{what} is not in the netlist; a usual {found.type} stands in"
            self.stand_ins.append(Note(element.designator, text))
        if key not in self._written_models:
            name = f"m{len(self._written_models) + 1}"
            self._written_models[key] = name
            parameters = {word: number(value) for word, value in found.parameters.items()}
            self.netlist.model(name, found.type, **parameters)
        return self._written_models[key]


Writer = Callable[[_Deck, Element], str]
"""Writes one element; returns why it could not, or ""."""

_NO_VALUE = "its value is not known"


def _passive(deck: _Deck, element: Element) -> str:
    value = element.value
    if value is None:
        return _NO_VALUE
    letter = element.kind
    if letter == "R" and abs(value) < LINK_OHMS:
        value = LINK_OHMS
    if letter in "CL" and value == 0:
        return "" if letter == "C" else _link(deck, element)
    nodes = [deck.node(net) for net in element.nets[:2]]
    getattr(deck.netlist, letter)(deck.name(letter), *nodes, number(value))
    return ""


def _link(deck: _Deck, element: Element) -> str:
    ohms = max(element.value or 0.0, LINK_OHMS) if element.kind == "link" else LINK_OHMS
    nodes = [deck.node(net) for net in element.nets[:2]]
    deck.netlist.R(deck.name("R"), *nodes, number(ohms))
    return ""


def _independent(deck: _Deck, element: Element) -> str:
    source = element.source
    if source is None or not source.stated:
        return "its level is not known"
    letter = "I" if element.kind == "I" else "V"
    nodes = [deck.node(net) for net in element.nets[:2]]
    name = deck.name(letter)
    getattr(deck.netlist, letter)(name, *nodes, source_text(source))
    if letter == "V":
        deck.sources[element.designator] = f"v{name}"
    return ""


def _voltage_controlled(deck: _Deck, element: Element) -> str:
    control = element.control
    if control is None or control.gain is None or len(control.nets) != 2:
        return "its relation is more than a plain factor"
    nodes = [deck.node(net) for net in (*element.nets[:2], *control.nets)]
    gain = number(control.gain)
    if element.kind == "E":
        deck.netlist.VCVS(deck.name("E"), *nodes, voltage_gain=gain)
    else:
        deck.netlist.VCCS(deck.name("G"), *nodes, transconductance=gain)
    return ""


def _current_controlled(deck: _Deck, element: Element) -> str:
    control = element.control
    if control is None or control.gain is None:
        return "its relation is more than a plain factor"
    sensed = deck.sources.get(control.element)
    if sensed is None:
        return f"the source {control.element} that steers it is not in the deck"
    nodes = [deck.node(net) for net in element.nets[:2]]
    if element.kind == "F":
        deck.netlist.CCCS(deck.name("F"), *nodes, sensed, number(control.gain))
    else:
        deck.netlist.CCVS(deck.name("H"), *nodes, sensed, number(control.gain))
    return ""


def _semiconductor(deck: _Deck, element: Element) -> str:
    wanted = {"D": 2, "Q": 3, "J": 3, "M": 4}[element.kind]
    nets = list(element.nets)
    if element.kind == "M" and len(nets) == 3:
        # A power transistor's bulk is its source.
        nets.append(nets[2])
    if len(nets) < wanted:
        return "it has too few nets"
    model = deck.model(element)
    if model is None:
        return "neither the netlist nor its order code says which polarity it has"
    nodes = [deck.node(net) for net in nets[:wanted]]
    sizes: dict[str, Any] = {}
    many = element.parameters.get("m", 1.0)
    if element.kind != "M":
        area = area_of(element) * many
        if area > 0 and area != 1.0:
            sizes["area"] = number(area)
    else:
        for ours, theirs in (("w", "width"), ("l", "length")):
            size = element.parameters.get(ours)
            if size is not None and size > 0:
                sizes[theirs] = number(size)
        if many >= 2:
            sizes["multiplier"] = round(many)
    getattr(deck.netlist, element.kind)(deck.name(element.kind), *nodes, model=model, **sizes)
    return ""


_WRITERS: Mapping[str, Writer] = {
    **dict.fromkeys("RCL", _passive),
    "link": _link,
    **dict.fromkeys(("V", "I", "battery"), _independent),
    **dict.fromkeys("EG", _voltage_controlled),
    **dict.fromkeys("FH", _current_controlled),
    **dict.fromkeys("DQJM", _semiconductor),
}
