"""Figures of an input that more than one rule compares with."""

import msgspec

from railguard.analysis import thermal
from railguard.analysis.stage import Design, Stage
from railguard.rules.protocol import Limit
from railguard.units import si
from railguard.words import Basis

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
    figure, amps = family.bias_current, thermal.bias_current(family, design.settings)
    note = "guaranteed" if figure.guaranteed is not None else "typical"
    if amps != figure.best and figure.hot is not None:
        note = "guaranteed over temperature"
    elif amps != figure.best:
        note = f"{note}, carried to {si(thermal.hottest(design.settings), '°C')}"
    return BiasCurrent(amps, figure.best_basis, note)


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
