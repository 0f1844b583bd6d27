"""Figures of an input that more than one rule compares with."""

import msgspec

from railguard.analysis.stage import Design, Stage
from railguard.rules.protocol import Limit
from railguard.units import si
from railguard.words import Basis

DOUBLING_KELVIN = 10.0
"""K; the bias current of a FET input doubles every ten. S. Franco, 3rd ed., ch. 5; ST TL072."""
ROOM = 25.0
"""Degrees Celsius at which data sheets list their figures."""


LEAST_UNEQUAL = Limit(
    name="least",
    default=10e3,
    unit="Ω",
    meaning="difference of the resistances at both inputs below which only a far error counts",
    source="Analog Devices AD8223 data sheet: more than 10 kΩ between the inputs makes offset",
)


class BiasCurrent(msgspec.Struct, frozen=True):
    """A device's bias current where it is used: amperes, where from, and in words."""

    amps: float
    basis: Basis
    note: str


def bias_current(stage: Stage, design: Design) -> BiasCurrent | None:
    """Return the bias current of a stage's device at the hottest ambient; None: not listed."""
    family = stage.family
    if family is None or family.bias_current.best is None:
        return None
    figure = family.bias_current
    guaranteed = figure.guaranteed is not None
    basis = figure.guaranteed_basis if guaranteed else figure.typical_basis
    kind = "guaranteed" if guaranteed else "typical"
    hottest = design.settings.ambient[1] if design.settings.ambient else ROOM
    amps = family.bias_current.best
    if hottest <= ROOM or amps is None:
        return BiasCurrent(amps or 0.0, basis, kind)
    if figure.hot is not None:
        return BiasCurrent(figure.hot, basis, "guaranteed over temperature")
    if family.technology.lower() in ("jfet", "cmos", "bifet", "fet"):
        amps *= 2 ** ((hottest - ROOM) / DOUBLING_KELVIN)
        return BiasCurrent(amps, basis, f"{kind}, carried to {si(hottest, '°C')}")
    return BiasCurrent(amps, basis, kind)


def output_span(stage: Stage) -> tuple[float | None, Basis]:
    """Return the span an error at the output is measured against: the demand, else the supply.

    Where the signal comes through a capacitor a level that is off costs range only.
    """
    if stage.ac_coupled and stage.output.available.span:
        return stage.output.available.span, stage.output.high.typical_basis
    span = stage.output.demand.span
    if span:
        return span, stage.output.high.demand_basis
    return stage.supply.total, "assumed"
