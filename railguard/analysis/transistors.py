"""What a transistor's card, its model and its name say of it: enough to work out what it asks for.

A bipolar transistor in its active region is a voltage from base to emitter and a current gain; a
field-effect transistor in saturation follows the square law of SPICE's level 1. Nothing here knows
the circuit round it.
"""

import math
import re
from collections.abc import Iterable, Mapping

import msgspec

from railguard.circuit.model import Element, Model

BASE_EMITTER_VOLTS = 0.7
"""From base to emitter where the model gives no IS: common practice, no source."""
BASE_EMITTER_SPREAD = 0.1
"""How far that may be off with current, temperature and sort, V: common practice, no source."""
PRACTICE_GAIN = 50.0
"""Current gain where nobody states one: what general-purpose transistors are guaranteed to have at
a good part of their rated current. Common practice, no source."""
DARLINGTON_GAIN = 1000.0
"""The same of the usual Darlington transistors. Common practice, no source."""
THERMAL_VOLTS = 0.02585
"""kT/q at 27 degrees Celsius, SPICE's own temperature, V."""
DEFAULT_WIDTH = 1e-4
"""SPICE's default width and length of a MOS channel, m."""
OXIDE_PERMITTIVITY = 3.9 * 8.854e-12
"""F/m."""
_SQUARE_LAW_LEVELS = (1.0,)

_P_CHANNEL = re.compile(
    r"^(2N(290[5-7]|390[56]|440[23]|5087|4403|540[01])|MMBT(390[56]|2907|4403|5401)|"
    r"PN2907|BC(32[78]|55[6-9]|560|80[78]|85[6-9]|860|17[7-9]|212|213|214)|BD(136|138|140|23[68])|"
    r"TIP(30|32|42|105|107|12[567]|2955)|MJE?(350|2955|172|15029|15031|15033)|S(8550|9012|9015)|"
    r"SS8550|2SA|2SB|2SJ|A1015|J17[4-7]|2N546[0-2]|MMBFJ17[5-7]|BS250|BSS84|BSS110|IRF9|IRLML640|"
    r"IRLML(5|6402)|AO3401|DMP|SI23(01|05|33)|FDN34|FDN30[246]|VP0|TP0|ZVP|NTR4101)",
    re.IGNORECASE,
)
_N_CHANNEL = re.compile(
    r"^(2N(222[12]|390[34]|440[01]|5088|5551|305[35]|1711|2219|5210|700[02])|MMBT(390[34]|2222|"
    r"4401|5551)|PN2222|BC(33[78]|54[6-9]|550|81[78]|84[6-9]|850|10[7-9]|182|183|184)|"
    r"BD(135|137|139|23[57])|TIP(29|31|41|100|102|12[012]|3055)|MJE?(340|3055|182|15028|15030)|"
    r"S(8050|9013|9014)|SS8050|2SC|2SD|2SK|C1815|J(10[5-9]|11[1-3]|20[1-4]|30[89]|310)|2N5(457|458|"
    r"459|484|485|486)|2N381[9]|MMBFJ|BF(24[45]|256)|BS170|BSS1[23]|IRF[1-8]|IRL[A-Z]*[1-35]|"
    r"AO3400|DMN|SI23(02|04|12)|FDN33|FDV30[13]|VN|TN0|ZVN|2N7002)",
    re.IGNORECASE,
)
_DARLINGTON = re.compile(
    r"^(TIP(1[0-4]\d)|MPSA(1[2-4]|2[5-9]|6[34])|BC51[67]|BD6(4[3-9]|5\d|7[5-9]|8[0-2])|"
    r"BDX(33|34|53|54)|2N6(03[4-9]|04\d|38[2-8])|MJ110\d\d)",
    re.IGNORECASE,
)
_SCOPED = ("D", "Q", "J", "M")
_CHANNELS = {"NPN": 0, "NMOS": 0, "NJF": 0, "PNP": 1, "PMOS": 1, "PJF": 1}


class Bipolar(msgspec.Struct, frozen=True, kw_only=True):
    """A bipolar transistor.

    sign        1 for NPN, -1 for PNP
    gain        collector over base current; `gain_stated` where the model says so
    saturation  A, of the base-emitter junction with its area; None: the model gives none
    emission    its emission coefficient
    """

    designator: str
    collector: str
    base: str
    emitter: str
    sign: int
    gain: float
    gain_stated: bool
    volts: float = BASE_EMITTER_VOLTS
    saturation: float | None = None
    emission: float = 1.0


class FieldEffect(msgspec.Struct, frozen=True, kw_only=True):
    """A field-effect transistor: |id| = factor / 2 (|vgs| - threshold)^2 in saturation.

    sign       1 for an N channel, -1 for a P channel
    threshold  V, counted in the direction that opens the channel: positive for enhancement
    factor     A/V^2
    to_source, to_drain  F, from the gate; None: the model gives none
    """

    designator: str
    drain: str
    gate: str
    source: str
    sign: int
    threshold: float
    factor: float
    to_source: float | None = None
    to_drain: float | None = None


Transistor = Bipolar | FieldEffect


def transistors_of(
    elements: Iterable[Element], models: Mapping[str, Model]
) -> tuple[tuple[Transistor, ...], dict[str, str]]:
    """Return the transistors of a circuit, and why each of the others cannot be worked with.

    models  of the deck, by lower-cased name
    """
    found: list[Transistor] = []
    left: dict[str, str] = {}
    for card in elements:
        if card.kind not in ("Q", "J", "M") or not card.fitted or len(card.nets) < 3:
            continue
        element = scoped(card, models)
        model = models.get(element.model.casefold())
        made = _bipolar(element, model) if card.kind == "Q" else _field_effect(element, model)
        if isinstance(made, str):
            left[card.designator] = made
        else:
            found.append(made)
    return tuple(found), left


def _channel(element: Element, model: Model | None) -> int | None:
    """Return 0 for NPN and N channel, 1 for PNP and P channel, None where nothing says it."""
    if model is not None and model.type.upper() in _CHANNELS:
        return _CHANNELS[model.type.upper()]
    if model is not None and model.type.upper() == "VDMOS":
        return int(model.parameters.get("vto", 1.0) < 0)
    return polarity(element.model)


def _bipolar(element: Element, model: Model | None) -> Bipolar | str:
    channel = _channel(element, model)
    if channel is None:
        return "whose polarity nothing says"
    given = model.parameters if model is not None else {}
    double = model is None and _DARLINGTON.match(element.model) is not None
    gain = given.get("bf", DARLINGTON_GAIN if double else PRACTICE_GAIN)
    if not (math.isfinite(gain) and gain > 0):
        return f"whose model gives a current gain of {gain:g}"
    saturation = given.get("is")
    area = area_of(element) * element.parameters.get("m", 1.0)
    usable = saturation is not None and saturation > 0 and area > 0
    collector, base, emitter = element.nets[:3]
    return Bipolar(
        designator=element.designator,
        collector=collector,
        base=base,
        emitter=emitter,
        sign=-1 if channel else 1,
        gain=gain,
        gain_stated="bf" in given,
        volts=2 * BASE_EMITTER_VOLTS if double else BASE_EMITTER_VOLTS,
        saturation=saturation * area if usable and saturation is not None else None,
        emission=given.get("nf", 1.0) or 1.0,
    )


def area_of(element: Element) -> float:
    """Return how many times the model's area a device has: named, or a number behind the model."""
    word = element.text.split()[0] if element.text.split() else ""
    plain = re.fullmatch(r"\d+(\.\d*)?", word)
    return element.parameters.get("area", float(plain[0]) if plain else 1.0)


def _field_effect(element: Element, model: Model | None) -> FieldEffect | str:
    channel = _channel(element, model)
    if channel is None:
        return "whose polarity nothing says"
    if model is None:
        return "which has no model"
    given = model.parameters
    sign = -1 if channel else 1
    width = element.parameters.get("w", given.get("w", DEFAULT_WIDTH))
    length = element.parameters.get("l", given.get("l", DEFAULT_WIDTH))
    many = element.parameters.get("m", 1.0)
    if element.kind == "J":
        # SPICE writes a JFET's law without the half, and its threshold alike for both channels.
        threshold, factor = given.get("vto"), 2.0 * given.get("beta", 0.0)
        factor *= area_of(element)
    else:
        threshold, factor = given.get("vto"), given.get("kp", 0.0)
        threshold = sign * threshold if threshold is not None else None
        if model.type.upper() != "VDMOS":
            if given.get("level", 1.0) not in _SQUARE_LAW_LEVELS:
                return "whose model is no square law"
            factor *= width / length if length > 0 else 0.0
    factor *= many
    if threshold is None or factor <= 0:
        return "whose model gives no VTO and KP"
    to_source, to_drain = _gate_farads(given, width * many, length)
    drain, gate, source = element.nets[:3]
    return FieldEffect(
        designator=element.designator,
        drain=drain,
        gate=gate,
        source=source,
        sign=sign,
        threshold=threshold,
        factor=factor,
        to_source=to_source,
        to_drain=to_drain,
    )


def _gate_farads(
    given: Mapping[str, float], width: float, length: float
) -> tuple[float | None, float | None]:
    """Return the capacitance from gate to source and to drain, F, in saturation.

    Source  A. Vladimirescu and S. Liu, The Simulation of MOS Integrated Circuits Using SPICE2,
            UCB/ERL M80/7 (overlap per width; two thirds of the oxide to the source), from memory
    """
    to_source = to_drain = None
    if "cgso" in given or "tox" in given:
        tox = given.get("tox", 0.0)
        oxide = OXIDE_PERMITTIVITY / tox * width * length if tox > 0 else 0.0
        to_source = given.get("cgso", 0.0) * width + oxide * 2 / 3
        to_drain = given.get("cgdo", 0.0) * width
    elif "cgs" in given:
        to_source = given["cgs"]
        to_drain = given.get("cgdmax", given.get("cgd", 0.0))
    return to_source, to_drain


def scoped(element: Element, models: Mapping[str, Model]) -> Element:
    """Name a device's model by the subcircuit it stands in, looked for from the inside out."""
    if element.kind not in _SCOPED or not element.model:
        return element
    scope = element.designator.casefold()
    while scope:
        scope = scope.rpartition(".")[0]
        key = f"{scope}.{element.model.casefold()}".lstrip(".")
        if key in models:
            return msgspec.structs.replace(element, model=key)
    return element


def polarity(name: str) -> int | None:
    """Return 0 for NPN and N channel, 1 for PNP and P channel, None where the name is not known."""
    upper = name.upper()
    for index, words in enumerate((("NPN", "NMOS", "NJF"), ("PNP", "PMOS", "PJF"))):
        if any(word in upper for word in words):
            return index
    if _P_CHANNEL.match(name):
        return 1
    return 0 if _N_CHANNEL.match(name) else None
