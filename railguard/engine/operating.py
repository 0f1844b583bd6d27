"""A design in ngspice: what its op-amps really do, non-linear devices included.

Every op-amp is our own macromodel with typical figures; everything else is written from the parsed
circuit. Two uses: stages whose numbers rest on a device the built-in solver does not follow get
them from here, and findings on range and current are confirmed or refuted.
"""

from collections.abc import Iterable, Mapping

import msgspec
import numpy as np

from railguard.analysis.recognise import Amplifier, recognise
from railguard.analysis.signals import Prepared, prepare
from railguard.analysis.stage import Design, Range
from railguard.analysis.supplies import feeds, supply_nets
from railguard.circuit.model import GROUND, Control, Element
from railguard.circuit.sources import Sine, Source
from railguard.devices.catalogue import Catalogue
from railguard.engine.figures import figures_of
from railguard.engine.macromodel import limited
from railguard.engine.ngspice import Ngspice
from railguard.engine.requests import OperatingPoint, Transient
from railguard.engine.write import Placed, write
from railguard.errors import EngineError

PERIODS = 3
POINTS_A_PERIOD = 200
MOST_POINTS = 12_000
SLOW_HERTZ = 10.0
"""Frequency a slow change is simulated at."""
SETTLED = 0.6
"""The last share of the run that is looked at: before it, couplings charge."""


class Simulated(msgspec.Struct, frozen=True):
    """What one amplifier did, V and A.

    current  out of the output pin
    """

    output: Range
    current: Range
    level: float


class Simulation(msgspec.Struct, frozen=True):
    """What a design did in ngspice, by amplifier, and what the run does not show as it is.

    remarks  elements left out or given a stand-in model, figures that stood in
    """

    stages: Mapping[str, Simulated]
    remarks: tuple[str, ...]


def simulate(design: Design, catalogue: Catalogue, engine: Ngspice) -> Simulation:
    """Run a design: operating point, then a transient over its signals.

    Raises:
        EngineError: ngspice gave nothing that can be trusted; an operating point from its last
            resort counts as nothing.
    """
    circuit, settings = design.circuit, design.settings
    amplifiers = recognise(circuit, catalogue, settings).amplifiers
    fed = feeds(supply_nets(amplifiers), circuit.elements, settings, amplifiers)
    prepared = prepare(circuit.elements, settings, fed)
    own = {id(a.element) for a in amplifiers}
    elements = [e for e in _driven(prepared, design) if id(e) not in own]
    placed, bodies, missing = [], {}, []
    for number, amplifier in enumerate(amplifiers):
        inner = f"{amplifier.designator} pin"
        elements.append(
            Element(
                kind="V",
                designator=f"sense {amplifier.designator}",
                nets=(inner, amplifier.output),
                source=Source(0.0),
            )
        )
        if not amplifier.has_supply:
            elements.append(_ideal(amplifier, inner))
            continue
        rails = _rails(design, amplifier)
        if rails is None:
            missing.append(f"{amplifier.designator} is left out: it has no supply")
            continue
        figures, assumed = figures_of(amplifier.match.device, *rails, gain=amplifier.gain)
        name = f"amp{number}"
        bodies[name] = limited(name, figures)
        if assumed:
            missing.append(f"{amplifier.designator}: {', '.join(assumed)} by common practice")
        pins = (amplifier.plus, amplifier.minus, amplifier.positive, amplifier.negative, inner)
        placed.append(Placed(amplifier.designator, name, pins))
    deck = write(elements, circuit.models, placed, tuple(bodies.values()))
    request = _transient(prepared)
    run = engine.run(deck.text, OperatingPoint(), request)
    if run.fallback:
        raise EngineError("ngspice found no operating point it would stand by.")
    point, waves = run.plots
    kept = waves.real("time") >= request.stop * (1 - SETTLED)
    stages = {}
    for amplifier in amplifiers:
        if amplifier.has_supply and _rails(design, amplifier) is None:
            continue
        node = deck.nodes[amplifier.output]
        volts = waves.voltage(node)[kept]
        amps = waves.current(deck.sources[f"sense {amplifier.designator}"])[kept]
        stages[amplifier.designator] = Simulated(
            output=Range(float(np.min(volts)), float(np.max(volts))),
            current=Range(float(np.min(amps)), float(np.max(amps))),
            level=float(point.voltage(node)[0]),
        )
    notes = [f"{n.designator}: {n.text}" for n in (*deck.left_out, *deck.stand_ins)]
    return Simulation(stages, (*notes, *missing))


def _rails(design: Design, amplifier: Amplifier) -> tuple[float, float] | None:
    stage = next(s for s in design.stages if s.designator == amplifier.designator)
    positive, negative = stage.supply.positive, stage.supply.negative
    if positive is None or negative is None or positive <= negative:
        return None
    return positive, negative


def _ideal(amplifier: Amplifier, output: str) -> Element:
    control = Control(gain=1e5, nets=(amplifier.plus, amplifier.minus))
    return Element(
        kind="E", designator=f"ideal {amplifier.designator}", nets=(output, GROUND), control=control
    )


def _driven(prepared: Prepared, design: Design) -> Iterable[Element]:
    """Return the elements with the user's levels and signals in their sources."""
    levels = {d.injection: d.value for d in prepared.levels}
    sines: dict[str, Sine] = {}
    for tone in prepared.tones:
        if tone.basis != "user":
            continue
        slow = _slow(tone.frequencies) if 0.0 in tone.frequencies else min(tone.frequencies)
        hertz = max(_worst(design, tone.frequencies) or slow, slow)
        for name, half in tone.drives:
            sines[name] = Sine(levels.get(name, 0.0), float(np.real(half)), hertz)
    for element in prepared.elements:
        name = element.designator
        if name in sines:
            source = Source(levels.get(name, 0.0), None, sines[name])
        elif element.source is None and name in levels:
            source = Source(levels[name])
        elif element.kind == "battery" and element.source is not None:
            source = Source(levels.get(name, element.source.level))
        else:
            yield element
            continue
        kind = "I" if element.kind == "I" else "V"
        yield Element(kind=kind, designator=name, nets=element.nets, source=source)


def _slow(frequencies: tuple[float, ...]) -> float:
    """Return the frequency a slow change within a band is simulated at, hertz."""
    top = max(frequencies)
    return min(SLOW_HERTZ, top / 10) if top > 0 else SLOW_HERTZ


def _worst(design: Design, frequencies: tuple[float, ...]) -> float | None:
    """Return the frequency of a band at which most stages are asked for most."""
    asked = [s.output.frequency or 0.0 for s in design.stages]
    inside = [f for f in asked if min(frequencies) <= f <= max(frequencies)]
    return max(set(inside), key=inside.count) if inside else None


def _transient(prepared: Prepared) -> Transient:
    hertz = [f for tone in prepared.tones for f in (tone.frequencies[-1],) if f > 0]
    hertz += [_slow(tone.frequencies) for tone in prepared.tones if 0.0 in tone.frequencies]
    slow, fast = (min(hertz), max(hertz)) if hertz else (SLOW_HERTZ, SLOW_HERTZ)
    stop = PERIODS / slow
    step = max(1 / (POINTS_A_PERIOD * fast), stop / MOST_POINTS)
    return Transient(step=step, stop=stop)
