"""Models of non-linear devices as the engine writes them: known types, known numeric parameters.

A deck without a model card for a device gets a stand-in by its sort, and the caller says so. For a
transistor the stand-in needs a polarity, which is taken from the order code where that is a usual
one; where it is not known the device is not written at all.
"""

from collections.abc import Mapping

import msgspec

from railguard.analysis.transistors import polarity
from railguard.circuit.model import Model

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


class WrittenModel(msgspec.Struct, frozen=True):
    """A model as it goes into a deck. `stand_in` is True where the netlist has none."""

    type: str
    parameters: Mapping[str, float]
    stand_in: bool = False


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
    channel = polarity(name)
    if kind == "D":
        return WrittenModel("D", _STAND_INS["D"], stand_in=True)
    if channel is None:
        return None
    parameters = dict(_STAND_INS[kind])
    if kind == "M" and channel:
        parameters["vto"] = -parameters["vto"]
    return WrittenModel(_TYPES[kind][channel], parameters, stand_in=True)


def _stated(kind: str, model: Model) -> WrittenModel | None:
    word = model.type.upper()
    if kind == "M" and word == "VDMOS":
        # The channel is a bare word on such a card; the sign of the threshold tells the same.
        channel = "PMOS" if model.parameters.get("vto", 1.0) < 0 else "NMOS"
        return WrittenModel(channel, {"level": 1.0, **_kept(model, "vto kp lambda rd rs")})
    if word not in _TYPES[kind]:
        return None
    kept = _kept(model, _PARAMETERS[kind])
    if kind == "M" and kept.get("level", 1.0) not in _LEVELS:
        return None
    return WrittenModel(word, kept)


def _kept(model: Model, names: str) -> dict[str, float]:
    known = names.split()
    return {name: value for name, value in model.parameters.items() if name in known}
