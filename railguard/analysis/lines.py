"""Transistors as straight lines: what stands for one in the solved circuit, and where it holds.

A bipolar transistor is a voltage from base to emitter and a current gain; a field-effect one the
tangent of its square law. A pair of followers that share base and emitter is one that takes 0.7 V
either way. Each comes with the limits within which it is a line.
"""

import math
from collections.abc import Iterable

import msgspec

from railguard.analysis.network import Network
from railguard.analysis.transistors import (
    BASE_EMITTER_SPREAD,
    THERMAL_VOLTS,
    Bipolar,
    FieldEffect,
    Transistor,
)
from railguard.circuit.model import Control, Element

JUNCTION_OHMS = 1.0
"""In series with the base before its current is known: keeps a base on an output solvable."""
SATURATED_VOLTS = 0.2
"""From collector to emitter below this a bipolar transistor has no current gain left: common
practice, no source."""
LEAST_JUNCTION, MOST_JUNCTION = 0.2, 1.2
"""What a base-emitter junction may come out at, V."""
LEAST_AMPS = 1e-6
"""Below this a transistor rests and its junction has no slope to speak of."""
SMALLEST_OVERDRIVE = 1e-3
FIRST_OVERDRIVE = 1.0
"""Volts beyond its threshold that a field-effect transistor starts from."""

Entries = tuple[tuple[int, float], ...]


class Pair(msgspec.Struct, frozen=True, kw_only=True):
    """An NPN and a PNP follower with one base net and one emitter net: either one conducts."""

    npn: Bipolar
    pnp: Bipolar

    @property
    def designator(self) -> str:
        """Both names."""
        return f"{self.npn.designator} and {self.pnp.designator}"

    @property
    def gain(self) -> float:
        """The smaller current gain."""
        return min(self.npn.gain, self.pnp.gain)

    @property
    def gain_stated(self) -> bool:
        """Whether both models say it."""
        return self.npn.gain_stated and self.pnp.gain_stated

    @property
    def volts(self) -> float:
        """From base to emitter, either way."""
        return max(self.npn.volts, self.pnp.volts)


Carried = Bipolar | Pair | FieldEffect


class Line(msgspec.Struct, frozen=True):
    """The straight line a transistor is taken for.

    volts  from base to emitter or gate to source at no current, counted in its own direction
    slope  ohm in series with the base; of a field-effect one A/V
    """

    volts: float
    slope: float


class Limit(msgspec.Struct, frozen=True):
    """What holds while a transistor is a line: the sum of `entries` of x is at least `least`.

    why  what it does where that does not hold: `saturates`
    """

    why: str
    entries: Entries
    least: float = 0.0


def paired(transistors: Iterable[Transistor]) -> list[Carried]:
    """Return transistors with complementary followers as pairs."""
    result: list[Carried] = []
    waiting: dict[tuple[str, str], Bipolar] = {}
    for one in transistors:
        if isinstance(one, FieldEffect):
            result.append(one)
            continue
        place = (one.base, one.emitter)
        other = waiting.get(place)
        if other is None or other.sign == one.sign:
            waiting.setdefault(place, one)
            result.append(one)
            continue
        result.remove(other)
        npn, pnp = (one, other) if one.sign > 0 else (other, one)
        result.append(Pair(npn=npn, pnp=pnp))
        del waiting[place]
    return result


def names_of(carried: Carried) -> tuple[str, ...]:
    """Return the designators on the cards."""
    if isinstance(carried, Pair):
        return carried.npn.designator, carried.pnp.designator
    return (carried.designator,)


def injection_of(carried: Carried) -> str:
    """Return the name of the source that stands for its voltage: a report may show it."""
    kind = "gate" if isinstance(carried, FieldEffect) else "base-emitter"
    return f"{kind} voltage of {carried.designator}"


def steering(carried: Carried) -> str:
    """Return the net that steers it."""
    if isinstance(carried, Pair):
        return carried.npn.base
    return carried.gate if isinstance(carried, FieldEffect) else carried.base


def feeding(carried: Carried) -> tuple[str, ...]:
    """Return the nets its current comes from: collector or drain."""
    if isinstance(carried, Pair):
        return carried.npn.collector, carried.pnp.collector
    return (carried.drain if isinstance(carried, FieldEffect) else carried.collector,)


def first_line(carried: Carried) -> Line:
    """Return the line to begin with."""
    if isinstance(carried, FieldEffect):
        return _tangent(carried, FIRST_OVERDRIVE)
    return Line(carried.volts, JUNCTION_OHMS)


def touching(carried: Carried, line: Line, amps: float) -> Line:
    """Return the line that touches a transistor's curve at a current, A.

    The base-emitter junction follows V = n kT/q ln(I/IS); without IS it stands at its practice
    figure there, with the same slope.
    """
    if isinstance(carried, FieldEffect):
        before = line.slope / carried.factor
        if amps <= 0:
            return _tangent(carried, before / 4)
        return _tangent(carried, math.sqrt(2 * amps / carried.factor))
    if isinstance(carried, Pair) or amps <= LEAST_AMPS:
        return line
    thermal, volts = carried.emission * THERMAL_VOLTS, carried.volts
    if carried.saturation is not None:
        volts = thermal * math.log(max(amps / carried.saturation, 1.0))
        volts = min(max(volts, LEAST_JUNCTION), MOST_JUNCTION)
    return Line(volts - thermal, thermal * carried.gain / amps)


def _tangent(transistor: FieldEffect, overdrive: float) -> Line:
    over = max(overdrive, SMALLEST_OVERDRIVE)
    return Line(transistor.threshold + over / 2, transistor.factor * over)


def share_off(carried: Carried, line: Line) -> float:
    """Return the share that its voltage may be off; a threshold is taken as the model gives it."""
    if isinstance(carried, FieldEffect) or line.volts <= 0:
        return 0.0
    return BASE_EMITTER_SPREAD / line.volts


def elements_of(carried: Carried, line: Line) -> list[Element]:
    """Return what stands for a transistor in the equations."""
    name, inner = injection_of(carried), f"{carried.designator} inside"
    if isinstance(carried, FieldEffect):
        drain, gate, source = carried.drain, carried.gate, carried.source
        made = [
            Element(kind="V", designator=name, nets=(gate, inner)),
            Element(
                kind="G",
                designator=f"channel of {carried.designator}",
                nets=(drain, source),
                control=Control(gain=line.slope, nets=(inner, source)),
            ),
        ]
        for farads, net in ((carried.to_source, source), (carried.to_drain, drain)):
            if farads:
                made.append(
                    Element(
                        kind="C",
                        designator=f"gate of {carried.designator}",
                        nets=(gate, net),
                        value=farads,
                    )
                )
        return made
    parts = (carried.npn, carried.pnp) if isinstance(carried, Pair) else (carried,)
    base, emitter = parts[0].base, parts[0].emitter
    return [
        Element(kind="V", designator=name, nets=(base, inner)),
        Element(
            kind="R",
            designator=f"junction of {carried.designator}",
            nets=(inner, emitter),
            value=line.slope,
        ),
        *(
            Element(
                kind="F",
                designator=f"collector of {part.designator}",
                nets=(part.collector, emitter),
                control=Control(gain=carried.gain / len(parts), element=name),
            )
            for part in parts
        ),
    ]


def taken(carried: Carried, network: Network) -> Entries:
    """Return its base current as entries of x, A, positive into the base; () for a gate."""
    if isinstance(carried, FieldEffect):
        return ()
    return ((network.injections[injection_of(carried)].row, 1.0),)


def control(carried: Carried, network: Network) -> Entries:
    """Return its voltage from base to emitter or gate to source as entries of x."""
    emitter = carried.npn.emitter if isinstance(carried, Pair) else _emitter(carried)
    return _entries((network.row(steering(carried)), 1.0), (network.row(emitter), -1.0))


def _emitter(transistor: Transistor) -> str:
    return transistor.source if isinstance(transistor, FieldEffect) else transistor.emitter


def current(carried: Carried, line: Line, network: Network) -> Entries:
    """Return the current from collector to emitter or drain to source as entries of x, A."""
    if isinstance(carried, FieldEffect):
        inner = network.row(f"{carried.designator} inside")
        return _entries((inner, line.slope), (network.row(carried.source), -line.slope))
    return tuple((row, carried.gain * unit) for row, unit in taken(carried, network))


def limits(carried: Carried, line: Line, network: Network, peak: float) -> list[Limit]:
    """Return what must hold over the whole range of every signal.

    peak  of its current, A
    """
    if isinstance(carried, Pair):
        return [*_open(carried.npn, network), *_open(carried.pnp, network)]
    sign = carried.sign
    flows = Limit(
        "stops conducting",
        tuple((row, sign * unit) for row, unit in current(carried, line, network)),
    )
    if isinstance(carried, Bipolar):
        return [flows, *_open(carried, network)]
    overdrive = math.sqrt(2 * max(peak, 0.0) / carried.factor)
    ends = ((network.row(carried.drain), sign), (network.row(carried.source), -sign))
    return [flows, Limit("is no current source any more", _entries(*ends), overdrive)]


def _open(transistor: Bipolar, network: Network) -> list[Limit]:
    ends = (
        (network.row(transistor.collector), transistor.sign),
        (network.row(transistor.emitter), -transistor.sign),
    )
    return [Limit("saturates", _entries(*ends), SATURATED_VOLTS)]


def _entries(*entries: tuple[int, float]) -> Entries:
    return tuple((row, unit) for row, unit in entries if row >= 0)
