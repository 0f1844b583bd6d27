"""What drives the circuit: levels that stand still, and tones that come on top.

Sources of the deck and statements of the user's file become the same two things: a DC drive
(what the operating point sees) and tones (a complex amplitude at one frequency or over a band).
Sources of one frequency keep their phases; tones of different groups may meet at their worst.
"""

import math
from collections import defaultdict

import msgspec
import numpy as np

from railguard.analysis.supplies import Feed
from railguard.circuit.model import GROUND, Element
from railguard.circuit.sources import (
    AmplitudeModulated,
    Exponential,
    FrequencyModulated,
    Piecewise,
    Pulse,
    Sine,
    Source,
    Wave,
)
from railguard.settings.model import Settings, Signal
from railguard.words import Basis

BAND_POINTS = 25
"""Frequencies at which a stated band is swept; the worst one is kept."""
LOWEST_SHARE = 1e-4
"""A band from DC is swept from this share of its top."""


class Drive(msgspec.Struct, frozen=True):
    """A DC level some injection holds."""

    injection: str
    value: float


class Tone(msgspec.Struct, frozen=True, kw_only=True):
    """What moves together: complex amplitudes by injection, at each frequency of a band.

    frequencies  hertz; 0 is a slow change
    wave, mean   a time function that is no sine, and the level it is superposed on: followed
                 through time, the drives then serve for sensitivities only
    """

    name: str
    drives: tuple[tuple[str, complex], ...]
    frequencies: tuple[float, ...]
    basis: Basis = "netlist"
    wave: Wave | None = None
    mean: float = 0.0

    @property
    def top(self) -> float:
        """The highest frequency of the band, hertz."""
        return max(self.frequencies)


class Unstated(msgspec.Struct, frozen=True):
    """A source that probes but states no amplitude, or a net that leaves what can be seen.

    injection  of a voltage source; "" for a net
    """

    net: str
    what: str
    add: str
    injection: str = ""


class Entry(msgspec.Struct, frozen=True):
    """Where a signal enters: what a unit of it does to each injection, and its DC level.

    rank   0 stated by the user, 1 a wave of the deck, 2 a small-signal probe, 3 a DC source
    label  the net, or the signal's own name where it stands between two nets
    unit   "V" or "A"
    """

    rank: int
    label: str
    drives: tuple[tuple[str, float], ...]
    level: float
    unit: str


class Prepared(msgspec.Struct, frozen=True, kw_only=True):
    """The elements to solve, loads and stated signals included, and what drives them.

    entries  signals that have a source: for gains and the largest input allowed
    missing  what the user's file states of nets this deck does not have
    """

    elements: tuple[Element, ...]
    levels: tuple[Drive, ...]
    tones: tuple[Tone, ...]
    unstated: tuple[Unstated, ...]
    entries: tuple[Entry, ...]
    missing: tuple[str, ...] = ()


class _Builder:
    """Collects elements, levels and tones while settings are laid over the deck."""

    def __init__(self, elements: tuple[Element, ...]) -> None:
        self.elements = list(elements)
        self.nets = {net for e in elements for net in e.nets} | {GROUND}
        self.levels: dict[str, Drive] = {}
        self.tones: list[Tone] = []
        self.unstated: list[Unstated] = []
        self.entries: list[Entry] = []
        self.coherent: dict[float, list[tuple[str, complex]]] = defaultdict(list)
        self.missing: list[str] = []

    def holder(self, net: str, to: str = GROUND) -> tuple[str, float] | None:
        """Find the deck's own source between two nets: its designator and its sign."""
        for element in self.elements:
            if element.kind in ("V", "battery") and element.nets[:2] == (net, to):
                return element.designator, 1.0
            if element.kind in ("V", "battery") and element.nets[:2] == (to, net):
                return element.designator, -1.0
        return None

    def add(self, kind: str, designator: str, nets: tuple[str, str], value: float | None) -> str:
        self.elements.append(Element(kind=kind, designator=designator, nets=nets, value=value))
        self.nets.update(nets)
        return designator

    def source_for(self, net: str, ohms: float, label: str) -> tuple[str, float]:
        """Return the injection that moves `net`, made where the deck has none, and its sign."""
        held = self.holder(net)
        if held is not None:
            return held
        if ohms > 0:
            inner = f"{label} behind its resistance"
            self.add("R", f"{label} resistance", (inner, net), ohms)
            return self.add("V", label, (inner, GROUND), None), 1.0
        return self.add("V", label, (net, GROUND), None), 1.0


def prepare(elements: tuple[Element, ...], settings: Settings, feeds: dict[str, Feed]) -> Prepared:
    """Lay rails, signals and loads over the deck's elements and collect what drives them.

    elements  of the flat circuit, amplifiers included
    feeds     of the supply nets: those with a stated or named level get a source of that level
    """
    build = _Builder(elements)
    for load in settings.loads:
        if load.net not in build.nets:
            build.missing.append(f"load {load.net}")
            continue
        if load.ohms is not None:
            build.add("R", f"load on {load.net}", (load.net, load.to), load.ohms)
        if load.farads is not None:
            build.add("C", f"load on {load.net}", (load.net, load.to), load.farads)
    stated = _hold_rails(build, settings, feeds)
    overridden = _add_signals(build, settings)
    for element in elements:
        taken = element.designator in overridden or element.designator in stated
        if element.kind in ("V", "I", "battery") and element.source is not None and not taken:
            _deck_source(build, element, element.source)
    for frequency, drives in build.coherent.items():
        build.tones.append(
            Tone(
                name=" and ".join(name for name, _ in drives),
                drives=tuple(drives),
                frequencies=(frequency,),
            )
        )
    return Prepared(
        elements=tuple(build.elements),
        levels=tuple(build.levels.values()),
        tones=tuple(build.tones),
        unstated=tuple(build.unstated),
        entries=_inputs(build.entries),
        missing=tuple(build.missing),
    )


_UNITS = {"V": "V", "battery": "V", "I": "A"}
_SIGNAL_RANKS = 3


def _inputs(entries: list[Entry]) -> tuple[Entry, ...]:
    """Keep the signals; DC sources are references where anything else is a signal."""
    signals = [entry for entry in entries if entry.rank < _SIGNAL_RANKS]
    return tuple(dict.fromkeys(signals or entries))


def _hold_rails(build: _Builder, settings: Settings, feeds: dict[str, Feed]) -> set[str]:
    """Give every stated or named net a source; return the deck sources that are overruled."""
    overruled = set()
    levels = {net: level.volts for net, level in settings.nets.items()}
    for feed in feeds.values():
        if feed.level is not None and feed.at not in levels:
            levels[feed.at] = feed.level
    for net, volts in levels.items():
        if net not in build.nets:
            build.missing.append(f"net {net}")
            continue
        held = build.holder(net)
        if held is None:
            held = build.add("V", f"rail {net}", (net, GROUND), None), 1.0
        overruled.add(held[0])
        build.levels[held[0]] = Drive(held[0], held[1] * volts)
    return overruled


def band(start: float, stop: float | None) -> tuple[float, ...]:
    """Return the frequencies a stated band is looked at, hertz."""
    if stop is None or stop <= 0:
        return (0.0,)
    if start >= stop:
        return (stop,)
    low = start if start > 0 else stop * LOWEST_SHARE
    swept = np.geomspace(low, stop, BAND_POINTS)
    first = () if start > 0 else (0.0,)
    return (*first, *(float(f) for f in swept))


def _add_signals(build: _Builder, settings: Settings) -> set[str]:
    taken: set[str] = set()
    groups: dict[str, list[Tone]] = defaultdict(list)
    for number, signal in enumerate(settings.signals):
        nets = signal.between or (signal.name,)
        if any(net not in build.nets for net in nets):
            build.missing.append(f"signal {signal.name}")
            continue
        half, mid = (signal.high - signal.low) / 2, (signal.high + signal.low) / 2
        drives, levels = _inject(build, signal, mid)
        taken.update(name for name, _ in drives)
        for name, level in levels:
            before = build.levels.get(name)
            total = level + (before.value if before else 0.0)
            build.levels[name] = Drive(name, total)
        tone = Tone(
            name=f"signal {signal.name}",
            drives=tuple((name, factor * half) for name, factor in drives),
            frequencies=band(signal.start, signal.stop),
            basis="user",
        )
        groups[signal.group or f"#{number}"].append(tone)
        unit = "A" if signal.current else "V"
        build.entries.append(Entry(0, signal.name, tuple(drives), mid, unit))
    for tones in groups.values():
        build.tones.append(_together(tones))
    return taken


def _inject(
    build: _Builder, signal: Signal, mid: float
) -> tuple[list[tuple[str, float]], list[tuple[str, float]]]:
    """Return what each injection does per unit of a signal, and the level each one holds."""
    label = f"signal {signal.name}"
    if signal.current:
        net, back = signal.between or (signal.name, GROUND)
        build.add("I", label, (back, net), None)
        return [(label, 1.0)], [(label, mid)]
    if not signal.between:
        name, sign = build.source_for(signal.name, signal.ohms, label)
        return [(name, sign)], [(name, sign * mid)]
    plus, minus = signal.between
    between = build.holder(plus, minus)
    if between is not None:
        name, sign = between
        return [(name, sign)], [(name, sign * mid)]
    if signal.common is None:
        # Nothing says where both nets sit, so only their difference is driven.
        inner = f"{label} behind its resistance"
        build.add("R", f"{label} resistance", (inner, plus), max(signal.ohms, 1e-3))
        build.add("V", label, (inner, minus), None)
        return [(label, 1.0)], [(label, mid)]
    ends = []
    for net, sign in ((plus, 0.5), (minus, -0.5)):
        name, way = build.source_for(net, signal.ohms / 2, f"{label} at {net}")
        ends.append((name, way, sign))
    return (
        [(name, way * sign) for name, way, sign in ends],
        [(name, way * (signal.common + sign * mid)) for name, way, sign in ends],
    )


def _together(tones: list[Tone]) -> Tone:
    if len(tones) == 1:
        return tones[0]
    frequencies = sorted({f for tone in tones for f in tone.frequencies})
    return Tone(
        name=" and ".join(tone.name for tone in tones),
        drives=tuple(drive for tone in tones for drive in tone.drives),
        frequencies=tuple(frequencies),
        basis="user",
    )


def _deck_source(build: _Builder, element: Element, source: Source) -> None:
    name, net = element.designator, element.nets[0]
    if element.kind == "I" and net == GROUND:
        net = element.nets[1]
    if not source.stated:
        build.unstated.append(
            Unstated(net, f"{name} states no value", f'[nets] or [signals] "{net}"', name)
        )
        return
    level, tones = levels_and_tones(source)
    build.levels.setdefault(name, Drive(name, level))
    if source.wave is not None or level:
        rank = 1 if source.wave is not None else _SIGNAL_RANKS
        build.entries.append(Entry(rank, net, ((name, 1.0),), level, _UNITS[element.kind]))
    timed = source.wave is not None and not isinstance(source.wave, Sine)
    for frequency, amplitude in tones:
        if timed:
            build.tones.append(
                Tone(
                    name=name,
                    drives=((name, amplitude),),
                    frequencies=(frequency,),
                    wave=source.wave,
                    mean=level,
                )
            )
        else:
            build.coherent[frequency].append((name, amplitude))
    probes = source.ac is not None and source.ac[0] != 0
    if probes and not tones and not level:
        build.entries.append(Entry(2, net, ((name, 1.0),), level, _UNITS[element.kind]))
        build.unstated.append(
            Unstated(
                net,
                f"{name} is a small-signal probe and states no amplitude",
                f'[signals] "{net}" = {{ low = ..., high = ..., to = ... }}',
                name,
            )
        )


def levels_and_tones(source: Source) -> tuple[float, list[tuple[float, complex]]]:
    """Return the mean level of a source and its tones (hertz, complex amplitude).

    A sine is itself. A carrier modulated in frequency is taken at its highest instantaneous
    frequency; one modulated in amplitude at its largest envelope. Steps and slopes are a slow
    change between their extremes here; `analysis.transient` follows what their edges do.
    """
    wave = source.wave
    match wave:
        case Sine():
            phase = math.radians(wave.phase) - math.pi / 2
            frequency = wave.frequency or 0.0
            return wave.offset, [(frequency, wave.amplitude * np.exp(1j * phase))]
        case FrequencyModulated():
            top = (wave.carrier or 0.0) + wave.index * (wave.signal or 0.0)
            return wave.offset, [(top, complex(wave.amplitude))]
        case AmplitudeModulated():
            peak = abs(wave.amplitude) * (abs(wave.offset) + 1.0)
            return 0.0, [(wave.carrier + wave.modulation, complex(peak))]
        case Pulse() | Exponential():
            low, high = sorted((wave.first, wave.second))
        case Piecewise() if wave.points:
            values = [v for _, v in wave.points]
            low, high = min(values), max(values)
        case _:
            return source.level, []
    if low == high:
        return low, []
    return (low + high) / 2, [(0.0, complex((high - low) / 2))]
