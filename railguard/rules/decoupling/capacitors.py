"""A rail's capacitors, sorted by what they are good for."""

from collections.abc import Iterable

from railguard.analysis.rail import Capacitor, Rail
from railguard.circuit.model import GROUND
from railguard.rules.protocol import Limit, Limits
from railguard.rules.severity import ROUNDING
from railguard.rules.wording import NO_SOURCE, listed
from railguard.units import si

PER_PIN_SOURCE = (
    "Texas Instruments OP07C SLOS099G, OPA172 SBOS618H and TLV274 data sheets, layout sections: "
    "0.1 µF at each supply pin; Microchip DS21812E: 0.01 to 0.1 µF; Analog Devices AN462"
)
BULK_SOURCE = (
    "Microchip DS21812E asks for 1 µF within 100 mm; Analog Devices AN462 and the MCP6141 data "
    "sheet hold it for seldom needed: sources disagree"
)
USUAL = 100e-9
"""F; the value every source names."""

LEAST = Limit(
    name="least",
    default=10e-9,
    unit="F",
    meaning="smallest capacitor that counts as decoupling",
    source="Microchip DS21812E and Analog Devices AN462: 10 to 100 nF",
)
MOST = Limit(
    name="most",
    default=1e-6,
    unit="F",
    meaning="largest capacitor that counts as decoupling rather than bulk",
    source=NO_SOURCE,
)


def is_return(rail: Rail) -> bool:
    """Tell whether a net counted as a rail is the return itself."""
    return rail.net == GROUND or rail.net in rail.returns


def is_of_size(capacitor: Capacitor, limits: Limits) -> bool:
    """Tell whether a capacitor is of the size that decouples."""
    farads = capacitor.farads
    return farads is not None and (
        limits["least"] * (1 - ROUNDING) <= farads <= limits["most"] * (1 + ROUNDING)
    )


def at_pins(rail: Rail) -> tuple[Capacitor, ...]:
    """Return the capacitors on the pins' side of any series element."""
    return tuple(c for c in rail.decoupling if not c.behind)


def behind_series(rail: Rail) -> tuple[Capacitor, ...]:
    """Return the capacitors on the source side of a series element."""
    return tuple(c for c in rail.decoupling if c.behind) + rail.upstream


def decoupling_of(rail: Rail, limits: Limits) -> tuple[Capacitor, ...]:
    """Return the capacitors that decouple a rail at its pins."""
    return tuple(c for c in at_pins(rail) if is_of_size(c, limits))


def those_of_size(capacitors: Iterable[Capacitor], limits: Limits) -> tuple[Capacitor, ...]:
    """Return those of some capacitors that are of the size that decouples."""
    return tuple(c for c in capacitors if is_of_size(c, limits))


def is_bare(rail: Rail, limits: Limits) -> bool:
    """Tell whether a rail has no decoupling of any kind, here, upstream or across."""
    if is_return(rail) or not rail.packages:
        return False
    return not (
        decoupling_of(rail, limits)
        or those_of_size(behind_series(rail), limits)
        or those_of_size(rail.across, limits)
    )


def return_net(rail: Rail) -> str:
    """Return the net a rail is decoupled to."""
    return rail.returns[0] if rail.returns else GROUND


def fit_each(rail: Rail, packages: tuple[str, ...]) -> str:
    """Say what to fit at each of some packages."""
    return f"Fit {si(USUAL, 'F')} from {rail.net} to {return_net(rail)} at {each_of(packages)}."


def each_of(packages: tuple[str, ...]) -> str:
    """Name packages as in a remedy: `U1`, `each of U1 and U2`."""
    return f"each of {listed(packages)}" if len(packages) > 1 else listed(packages)
