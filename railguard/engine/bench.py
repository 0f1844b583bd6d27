"""A design as decks for ngspice: its op-amps as macromodels, its signals in its sources."""

import itertools
from collections import defaultdict
from collections.abc import Iterable, Mapping
from typing import Literal

import msgspec
import numpy as np

from railguard.analysis.dcpaths import is_linear
from railguard.analysis.recognise import Amplifier, recognise
from railguard.analysis.signals import Prepared, Tone, levels_and_tones, prepare
from railguard.analysis.stage import Design
from railguard.analysis.supplies import feeds, supply_nets
from railguard.analysis.transient import window
from railguard.analysis.transistors import scoped
from railguard.circuit.model import GROUND, Control, Element
from railguard.circuit.sources import Piecewise, Sine, Source
from railguard.devices.catalogue import Catalogue
from railguard.engine.figures import figures_of
from railguard.engine.macromodel import limited
from railguard.engine.relations import linear_currents, relation
from railguard.engine.requests import Transient
from railguard.engine.write import Placed, Written, write

PERIODS = 3
POINTS_A_PERIOD = 200
MOST_POINTS = 12_000
MOST_BEAT_POINTS = 40_000
"""Points of a run that lets two tones meet."""
LEAST_POINTS = 50
"""Points a period that show its peak within a fifth of a per cent."""
FAR_APART = 8.0
"""The peaks of two tones further apart than this ratio meet in every period of the slower one."""
BEATS = 1.8
"""Periods of the difference of two tones: one of them lies in what counts."""
SETTLED = 0.6
"""The last share of the run that is looked at: before it, couplings charge."""
SLOW_HERTZ = 10.0
"""Frequency a slow change is simulated at."""
RAMP_SECONDS = 1e-3
"""Time in which a ramped supply comes up."""

Manner = Literal["limited", "straight", "ramp"]
"""Macromodels with all limits; without slew rate; with all limits on supplies that come up."""


class Bench(msgspec.Struct, frozen=True):
    """What is run.

    decks       by manner
    written     the deck of the first manner: names are the same in all
    amplifiers  those that are in the decks, by designator
    request     the transient over the signals
    settled     seconds from which its waves count: before, couplings charge
    meets       False where its tones would need a longer run to meet at their worst
    remarks     what the decks do not show as it is
    """

    decks: Mapping[Manner, str]
    written: Written
    amplifiers: Mapping[str, Amplifier]
    request: Transient
    settled: float
    meets: bool
    remarks: tuple[str, ...]

    def output(self, name: str) -> str:
        """Return the node of an amplifier's output."""
        return self.written.nodes[self.amplifiers[name].output]

    def inputs(self, name: str) -> tuple[str, str]:
        """Return the nodes of an amplifier's inputs."""
        amplifier = self.amplifiers[name]
        return self.written.nodes[amplifier.plus], self.written.nodes[amplifier.minus]

    def sensed(self, name: str) -> str:
        """Return the source that carries an amplifier's output current."""
        return self.written.sources[f"sense {name}"]


def bench_of(design: Design, catalogue: Catalogue) -> Bench:
    """Write a design's decks."""
    circuit, settings = design.circuit, design.settings
    amplifiers = recognise(circuit, catalogue, settings).amplifiers
    fed = feeds(supply_nets(amplifiers), circuit.elements, settings, amplifiers)
    prepared = prepare(circuit.elements, settings, fed)
    own = {id(a.element) for a in amplifiers}
    elements = [scoped(e, circuit.models) for e in _driven(prepared, design) if id(e) not in own]
    plain, placed, bodies = _related(elements)
    models: dict[Manner, list[str]] = {"limited": [*bodies], "straight": [*bodies]}
    present: dict[str, Amplifier] = {}
    remarks: list[str] = []
    stand_ins: dict[str, list[str]] = defaultdict(list)
    for number, amplifier in enumerate(amplifiers):
        inner = f"{amplifier.designator} pin"
        rails = _rails(design, amplifier)
        if amplifier.has_supply and rails is None:
            remarks.append(f"{amplifier.designator} is left out: it has no supply")
            continue
        present[amplifier.designator] = amplifier
        plain.append(_sense(amplifier, inner))
        if rails is None:
            plain.append(_ideal(amplifier, inner))
            continue
        figures, assumed = figures_of(amplifier.match.device, *rails, gain=amplifier.gain)
        name = f"amp{number}"
        models["limited"].append(limited(name, figures))
        models["straight"].append(limited(name, figures, straight=True))
        if assumed:
            stand_ins[", ".join(assumed)].append(amplifier.designator)
        pins = (amplifier.plus, amplifier.minus, amplifier.positive, amplifier.negative, inner)
        placed.append(Placed(amplifier.designator, name, pins))
    written = write(plain, circuit.models, placed, models["limited"])
    decks: dict[Manner, str] = {
        "limited": written.text,
        "straight": write(plain, circuit.models, placed, models["straight"]).text,
        "ramp": write([_ramped(e) for e in plain], circuit.models, placed, models["limited"]).text,
    }
    remarks += [
        f"{', '.join(names)}: {text} by common practice" for text, names in stand_ins.items()
    ]
    notes = [f"{n.designator}: {n.text}" for n in (*written.left_out, *written.stand_ins)]
    return Bench(decks, written, present, *_transient(prepared, design), (*notes, *remarks))


def _related(elements: list[Element]) -> tuple[list[Element], list[Placed], list[str]]:
    """Turn sources with expressions into instances of subcircuits made for them."""
    plain: list[Element] = []
    placed: list[Placed] = []
    bodies: list[str] = []
    for element in elements:
        if element.kind in ("F", "H") and not is_linear(element):
            plain += linear_currents(element) or (element,)
        elif element.kind == "B" or (element.kind in ("E", "G") and not is_linear(element)):
            made = relation(element, f"rel{len(placed) + 1}")
            if made is None:
                plain.append(element)
            else:
                placed.append(made.placed)
                bodies.append(made.body)
        else:
            plain.append(element)
    return plain, placed, bodies


def _rails(design: Design, amplifier: Amplifier) -> tuple[float, float] | None:
    stage = next(s for s in design.stages if s.designator == amplifier.designator)
    positive, negative = stage.supply.positive, stage.supply.negative
    if positive is None or negative is None or positive <= negative:
        return None
    return positive, negative


def _sense(amplifier: Amplifier, inner: str) -> Element:
    return Element(
        kind="V",
        designator=f"sense {amplifier.designator}",
        nets=(inner, amplifier.output),
        source=Source(0.0),
    )


def _ideal(amplifier: Amplifier, output: str) -> Element:
    control = Control(gain=1e5, nets=(amplifier.plus, amplifier.minus))
    return Element(
        kind="E", designator=f"ideal {amplifier.designator}", nets=(output, GROUND), control=control
    )


def _ramped(element: Element) -> Element:
    """Return a source that comes up from zero to its level and stays there, without its signal."""
    source = element.source
    if element.kind not in ("V", "I", "battery") or source is None or not source.stated:
        return element
    level = levels_and_tones(source)[0]
    ramp = Piecewise(((0.0, 0.0), (RAMP_SECONDS, level)))
    return msgspec.structs.replace(element, source=Source(0.0, None, ramp))


def _driven(prepared: Prepared, design: Design) -> Iterable[Element]:
    """Return the elements with the user's levels and signals in their sources."""
    levels = {d.injection: d.value for d in prepared.levels}
    sines: dict[str, Sine] = {}
    for tone in prepared.tones:
        if tone.basis != "user":
            continue
        hertz = _hertz(tone, design)
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


def _hertz(tone: Tone, design: Design) -> float:
    """Return the frequency a tone is simulated at: of a user's band, the worst one."""
    if tone.basis != "user":
        top = tone.frequencies[-1]
        return top if top > 0 else SLOW_HERTZ
    slow = _slow(tone.frequencies) if 0.0 in tone.frequencies else min(tone.frequencies)
    return max(_worst(design, tone.frequencies) or slow, slow)


def _transient(prepared: Prepared, design: Design) -> tuple[Transient, float, bool]:
    """Return the run over the signals, from when it counts, and whether its tones meet in it."""
    hertz = sorted({_hertz(tone, design) for tone in prepared.tones}) or [SLOW_HERTZ]
    slow, fast = hertz[0], hertz[-1]
    stop, meets = PERIODS / slow, True
    beats = [b - a for a, b in itertools.pairwise(hertz) if 1e-9 * b < b - a and b < FAR_APART * a]
    if beats:
        # Two sines meet at their worst once in the period of their difference.
        meeting = BEATS / min(beats)
        meets = meeting <= stop or (stop + meeting) * fast * LEAST_POINTS <= MOST_BEAT_POINTS
        stop += meeting if meets else 0.0
    settled = stop * (1 - SETTLED)
    lengths = [window(tone.wave)[0] for tone in prepared.tones if tone.wave is not None]
    if lengths:
        # A wave of its own shape is followed from its beginning, where the circuit is at rest.
        stop, settled = max(stop, *lengths), 0.0
    most = MOST_BEAT_POINTS if beats else MOST_POINTS
    step = max(1 / (POINTS_A_PERIOD * fast), stop / most)
    return Transient(step=step, stop=stop), settled, meets
