"""Models of non-linear devices as the engine writes them: known types, known numeric parameters.

A deck without a model card for a device gets a stand-in by its sort, and the caller says so. For a
transistor the stand-in needs a polarity, which is taken from the order code where that is a usual
one; where it is not known the device is not written at all.
"""

import re
from collections.abc import Mapping

import msgspec

from railguard.circuit.model import Element, Model

_TYPES = {
    "D": ("D",),
    "Q": ("NPN", "PNP"),
    "J": ("NJF", "PJF"),
    "M": ("NMOS", "PMOS"),
}

_PARAMETERS = {
    "D": "is rs n tt cjo cj0 vj m eg xti fc bv ibv tnom",
    "Q": "is bf nf vaf ikf ise ne br nr var ikr isc nc rb irb rbm re rc cje vje mje tf xtf vtf itf "
    "ptf cjc vjc mjc xcjc tr cjs vjs mjs xtb eg xti fc tnom",
    "J": "vto beta lambda rd rs cgs cgd pb is fc tnom",
    "M": "level vto kp gamma phi lambda rd rs cbd cbs is pb cgso cgdo cgbo rsh cj mj cjsw mjsw js "
    "tox nsub nss nfs tpg xj ld uo ucrit uexp vmax neff fc delta theta eta kappa tnom",
}
_LEVELS = (1.0, 2.0, 3.0)
"""MOS models that need no more than the parameters above."""


_STAND_INS: Mapping[str, Mapping[str, float]] = {
    "D": {"is": 4e-9, "n": 1.8, "rs": 0.6, "cjo": 2e-12, "tt": 6e-9},
    "Q": {"is": 1e-14, "bf": 150.0, "vaf": 100.0, "rb": 10.0, "cje": 8e-12, "cjc": 4e-12,
          "tf": 4e-10},
    "J": {"vto": -2.0, "beta": 1e-3, "lambda": 1e-2},
    "M": {"level": 1.0, "vto": 2.0, "kp": 0.2, "lambda": 1e-2},
}  # fmt: skip
"""Small-signal silicon of the usual sort: common practice, no source."""

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


class WrittenModel(msgspec.Struct, frozen=True):
    """A model as it goes into a deck. `stand_in` is True where the netlist has none."""

    type: str
    parameters: Mapping[str, float]
    stand_in: bool = False


def scoped(element: Element, models: Mapping[str, Model]) -> Element:
    """Name a device's model by the subcircuit it stands in, looked for from the inside out."""
    if element.kind not in _TYPES or not element.model:
        return element
    scope = element.designator.casefold()
    while scope:
        scope = scope.rpartition(".")[0]
        key = f"{scope}.{element.model.casefold()}".lstrip(".")
        if key in models:
            return msgspec.structs.replace(element, model=key)
    return element


def model_for(kind: str, name: str, models: Mapping[str, Model]) -> WrittenModel | None:
    """Return what to write for a device of letter D, Q, J or M.

    name    of its model, as the card says
    models  of the deck, by lower-cased name

    Returns None where neither the deck nor its name says which polarity a transistor has.
    """
    stated = models.get(name.lower())
    if stated is not None:
        written = _stated(kind, stated)
        if written is not None:
            return written
    polarity = _polarity(name)
    if kind == "D":
        return WrittenModel("D", _STAND_INS["D"], stand_in=True)
    if polarity is None:
        return None
    parameters = dict(_STAND_INS[kind])
    if kind == "M" and polarity:
        parameters["vto"] = -parameters["vto"]
    return WrittenModel(_TYPES[kind][polarity], parameters, stand_in=True)


def _stated(kind: str, model: Model) -> WrittenModel | None:
    word = model.type.upper()
    if kind == "M" and word == "VDMOS":
        # The channel is a bare word on such a card; the sign of the threshold tells the same.
        polarity = "PMOS" if model.parameters.get("vto", 1.0) < 0 else "NMOS"
        return WrittenModel(polarity, {"level": 1.0, **_kept(model, "vto kp lambda rd rs")})
    if word not in _TYPES[kind]:
        return None
    kept = _kept(model, _PARAMETERS[kind])
    if kind == "M" and kept.get("level", 1.0) not in _LEVELS:
        return None
    return WrittenModel(word, kept)


def _kept(model: Model, names: str) -> dict[str, float]:
    known = names.split()
    return {name: value for name, value in model.parameters.items() if name in known}


def _polarity(name: str) -> int | None:
    """Return 0 for NPN and N channel, 1 for PNP and P channel, None where the name is not known."""
    upper = name.upper()
    for index, words in enumerate((("NPN", "NMOS", "NJF"), ("PNP", "PMOS", "PJF"))):
        if any(word in upper for word in words):
            return index
    if _P_CHANNEL.match(name):
        return 1
    return 0 if _N_CHANNEL.match(name) else None
