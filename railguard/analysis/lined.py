"""A part of a circuit solved with transistors as lines, and whether they really work so.

Each limit of each line is held against the whole range of every signal. What an output gives a
transistor is read from the same solution: the load's current over the gain, C dv/dt of a gate, the
volts in between.
"""

from collections.abc import Iterable, Mapping, Sequence

import msgspec
import numpy as np

from railguard.analysis.equations import Complex, Real
from railguard.analysis.lamps import MOST_VOLTS, drop_of, lamps_at
from railguard.analysis.lamps import elements_of as elements_of_lamp
from railguard.analysis.lamps import injection_of as volts_of_lamp
from railguard.analysis.lines import (
    Carried,
    Entries,
    Limit,
    Line,
    Pair,
    control,
    current,
    elements_of,
    feeding,
    injection_of,
    limits,
    names_of,
    share_off,
    steering,
    taken,
)
from railguard.analysis.network import Network
from railguard.analysis.ranges import Answers, Clamp, answer
from railguard.analysis.recognise import Amplifier
from railguard.analysis.signals import Drive, Prepared
from railguard.analysis.stage import Carrier
from railguard.analysis.stamping import Parasitics
from railguard.analysis.transistors import (
    BASE_EMITTER_SPREAD,
    Bipolar,
    FieldEffect,
)
from railguard.circuit.model import Element, Model

RESTING_SHARE = 1e-3
"""A current that ends this share of its peak below zero is one that just reaches zero."""
GAIN_ERROR = 0.1
HELD_VOLTS = 0.01
"""A loop holds a transistor's current where 10 % more of it moves nothing else by 10 mV."""
LARGEST_GATE_FARADS = 10e-9
NEGLIGIBLE_AMPS = 10e-6
"""What a gate of unlisted capacitance may have at most, and the current that then counts for
nothing: common practice, no source."""
DRIVEN = 0.5
"""An output drives a base where it makes up for a current or a voltage there to within this share
of it: no more, as an amplified one would be, and no less."""
MOVED = 0.02
"""A number rests on a gain where all of the transistor's current is more than this share of it."""


class Working(msgspec.Struct, frozen=True):
    """A transistor that works as a line.

    carries, takes  peaks of its current and of its base current, A
    volts           most from base to emitter, or gate to source
    line            what it was taken for
    limits          what holds as long as it works so
    """

    carried: Carried
    carries: float
    takes: float
    volts: float
    line: Line
    limits: tuple[Limit, ...]


class Boost(msgspec.Struct, frozen=True):
    """The transistors of a solved part.

    left     by designator: what a transistor does that cannot be followed, as `which ...`
    assumed  indexes of the quantities that rest on a gain nobody states
    spread   by injection: its volts, and the share they may be off
    unsure   what each quantity moves where the junctions no model states are off by as much as
             they may be, shape (quantities,)
    drives   by amplifier: the transistors its output drives
    idle     transistors that never conduct
    pairs    injections that stand for a pair's voltage, either way
    """

    working: tuple[Working, ...] = ()
    left: Mapping[str, str] = {}
    assumed: frozenset[int] = frozenset()
    spread: Mapping[str, tuple[float, float]] = {}
    unsure: tuple[float, ...] = ()
    drives: Mapping[str, tuple[Carrier, ...]] = {}
    idle: frozenset[str] = frozenset()
    pairs: frozenset[str] = frozenset()

    @property
    def lines(self) -> tuple[Element, ...]:
        """What stands for the transistors in the equations."""
        return tuple(e for one in self.working for e in elements_of(one.carried, one.line))

    @property
    def names(self) -> frozenset[str]:
        """Designators of the transistors that were followed."""
        return self.idle.union(name for one in self.working for name in names_of(one.carried))


class Part(msgspec.Struct, frozen=True):
    """One part of a circuit, ready to be solved; the fields are the arguments of `answer`.

    network  without its transistors
    models   of the deck, by lower-cased name
    """

    network: Network
    amplifiers: tuple[Amplifier, ...]
    prepared: Prepared
    draws: Mapping[str, float]
    held: Mapping[str, Clamp]
    extra: Mapping[str, Parasitics]
    models: Mapping[str, Model]


class Solvable(msgspec.Struct, frozen=True):
    """A part with lines in it, ready to be solved.

    lamps  the injections of the diodes that feed each transistor
    """

    prepared: Prepared
    network: Network
    held: Mapping[str, Clamp]
    lamps: Mapping[Carried, tuple[str, ...]]


def with_lines(part: Part, lines: Mapping[Carried, Line]) -> Solvable:
    """Put lines into a part: a pair's voltage goes either way, as a held output does."""
    elements, levels, held = [*part.prepared.elements], [*part.prepared.levels], dict(part.held)
    lamps: dict[Carried, tuple[str, ...]] = {}
    lit: dict[str, Element] = {}
    for one, line in lines.items():
        elements += elements_of(one, line)
        if isinstance(one, Pair):
            held[injection_of(one)] = Clamp(0.0, line.volts)
            continue
        levels.append(Drive(injection_of(one), one.sign * line.volts))
        (net,) = feeding(one)
        fed = lamps_at(net, one.sign, part.network, part.prepared.elements)
        lamps[one] = tuple(volts_of_lamp(diode) for diode in fed)
        lit |= {diode.designator: diode for diode in fed}
    for diode in lit.values():
        elements += elements_of_lamp(diode)
        levels.append(Drive(volts_of_lamp(diode), drop_of(diode, part.models)))
    prepared = msgspec.structs.replace(
        part.prepared, elements=tuple(elements), levels=tuple(levels)
    )
    network = Network(elements, part.amplifiers, part.network.forced, part.extra)
    return Solvable(prepared, network, held, lamps)


def total(entries: Entries, x: Real | Complex) -> complex:
    """Return the sum of some entries of a solution, each times its unit."""
    return sum((unit * complex(x[row]) for row, unit in entries), 0j)


def _span(answers: Answers, entries: Entries) -> tuple[float, float]:
    """Return the lowest and highest value of a sum over levels and tones."""
    level = total(entries, answers.x).real
    peak = sum(
        max((abs(total(entries, w.x)) for w in tone.worst), default=0.0) for tone in answers.tones
    )
    return level - peak, level + peak


class Lined:
    """A part solved with some transistors as lines, and what is to be said of them."""

    def __init__(self, part: Part, lines: Mapping[Carried, Line]) -> None:
        """Solve. Raises SolveError."""
        self._lines = lines
        solvable = with_lines(part, lines)
        self.network, self._lamps = solvable.network, solvable.lamps
        self.answers = answer(
            self.network, part.amplifiers, solvable.prepared, part.draws, solvable.held
        )
        self._adjoint = self.answers.dc.adjoint([int(r) for r in self.answers.rows]).real

    def one_sided(self) -> dict[Carried, tuple[Bipolar, Bipolar]]:
        """Return the pairs of which only one conducts: that one, and the idle one."""
        found: dict[Carried, tuple[Bipolar, Bipolar]] = {}
        for one in self._lines:
            if not isinstance(one, Pair):
                continue
            low, high = _span(self.answers, taken(one, self.network))
            rest = RESTING_SHARE * max(abs(low), abs(high))
            if low >= -rest:
                found[one] = one.npn, one.pnp
            elif high <= rest:
                found[one] = one.pnp, one.npn
        return found

    def failing(self) -> dict[Carried, str]:
        """Return the transistors that do not work as they were taken, and why."""
        found = {}
        for one, line in self._lines.items():
            why = self._why_not(one, line)
            if why:
                found[one] = f"which {why}"
        return found

    def _why_not(self, one: Carried, line: Line) -> str:
        if any(net in self.network.floating for net in feeding(one)):
            return "is fed by nothing that is followed"
        low, high = _span(self.answers, current(one, line, self.network))
        peak = max(abs(low), abs(high))
        broken = [
            limit
            for limit in limits(one, line, self.network, peak)
            if _span(self.answers, limit.entries)[0]
            < limit.least - RESTING_SHARE * (limit.least or peak)
        ]
        if broken and not self._is_beyond(one, broken):
            return broken[0].why
        if GAIN_ERROR * peak * self._elsewhere(one, self._of_its_current(one)) > HELD_VOLTS:
            return "carries a current that its own gain sets, not a loop"
        for name in self._lamps.get(one, ()):
            row = self.network.injections[name].row
            if MOST_VOLTS * self._elsewhere(None, np.abs(self._adjoint[:, row])) > HELD_VOLTS:
                return "shares its diodes with what is to be worked out"
        if isinstance(one, Pair):
            row = self.network.injections[injection_of(one)].row
            if one.volts * self._elsewhere(one, np.abs(self._adjoint[:, row])) > HELD_VOLTS:
                return "change over where no loop takes it out"
        if isinstance(one, FieldEffect) and one.to_source is None and self._is_quick(one):
            return "has a gate whose capacitance its model does not give"
        return ""

    def _is_beyond(self, one: Carried, broken: Sequence[Limit]) -> bool:
        """Tell whether a transistor saturates only because its output is asked beyond its rails.

        Then it is the output that gives out first, and its demand is told.
        """
        if any(limit.why == "stops conducting" for limit in broken):
            return False
        answers, row = self.answers, self.network.injections[injection_of(one)].row
        for k in range(len(answers.amplifiers)):
            output = answers.at(k, "output")
            if abs(abs(self._adjoint[output, row]) - 1.0) > DRIVEN:
                continue
            top, bottom = answers.at(k, "positive"), answers.at(k, "negative")
            if answers.high[output] > answers.level[top]:
                return True
            if answers.low[output] < answers.level[bottom]:
                return True
        return False

    def _of_its_current(self, one: Carried) -> Real:
        """Return what an ampere more through a transistor makes of every quantity."""
        effect = np.zeros(len(self._adjoint))
        parts = (one.npn, one.pnp) if isinstance(one, Pair) else (one,)
        for part in parts:
            ends = (
                (part.drain, part.source)
                if isinstance(part, FieldEffect)
                else (part.collector, part.emitter)
            )
            moved = np.zeros(len(self._adjoint))
            for net, sign in zip(ends, (-1.0, 1.0), strict=True):
                row = self.network.row(net)
                if row >= 0:
                    moved += sign * self._adjoint[:, row]
            effect = np.maximum(effect, np.abs(moved))
        return effect

    def _elsewhere(self, one: Carried | None, effect: Real) -> float:
        """Return the most of an effect on every quantity that is not what a loop makes up for, V.

        The output that drives a transistor makes up for what it does; all others, and all inputs,
        are to stand still.
        """
        most = 0.0
        for k in range(len(self.answers.amplifiers)):
            drives = one is not None and self._drives(k, one)
            seen = ("plus", "minus") if drives else ("plus", "minus", "output")
            most = max(most, *(float(effect[self.answers.at(k, quantity)]) for quantity in seen))
        return most

    def _is_quick(self, one: FieldEffect) -> bool:
        """Tell whether the largest gate would take current that counts from an output."""
        slews = [
            float(self.answers.slew[self.answers.at(k, "output")])
            for k in range(len(self.answers.amplifiers))
            if self._drives(k, one)
        ]
        return max(slews, default=0.0) * LARGEST_GATE_FARADS > NEGLIGIBLE_AMPS

    def boost(self, left: Mapping[str, str], idle: frozenset[str]) -> Boost:
        """Return what the transistors are to the stages."""
        working = []
        for one, line in self._lines.items():
            carries, takes, volts = (
                max(abs(end) for end in _span(self.answers, entries))
                for entries in (
                    current(one, line, self.network),
                    taken(one, self.network),
                    control(one, self.network),
                )
            )
            kept = tuple(limits(one, line, self.network, carries))
            working.append(Working(one, carries, takes, volts, line, kept))
        assumed: set[int] = set()
        size = np.maximum(np.abs(self.answers.high), np.abs(self.answers.low))
        for done in working:
            if isinstance(done.carried, FieldEffect) or done.carried.gain_stated:
                continue
            rests = self._of_its_current(done.carried) * done.carries > MOVED * size
            assumed.update(int(q) for q in np.flatnonzero(rests & (size > 0)))
        return Boost(
            working=tuple(working),
            left=left,
            idle=idle,
            pairs=frozenset(injection_of(one) for one in self._lines if isinstance(one, Pair)),
            assumed=frozenset(assumed),
            spread={
                injection_of(one): (one.sign * line.volts, share)
                for one, line in self._lines.items()
                if not isinstance(one, Pair) and (share := share_off(one, line)) > 0
            },
            unsure=self._unsure(),
            drives={
                amplifier.designator: tuple(
                    _carriers(done for done in working if self._drives(k, done.carried))
                )
                for k, amplifier in enumerate(self.answers.amplifiers)
            },
        )

    def _unsure(self) -> tuple[float, ...]:
        moved = np.zeros(len(self._adjoint))
        for one in self._lines:
            if isinstance(one, Pair) or (isinstance(one, Bipolar) and one.saturation is None):
                row = self.network.injections[injection_of(one)].row
                moved += np.abs(self._adjoint[:, row]) * BASE_EMITTER_SPREAD
        return tuple(moved.tolist())

    def _drives(self, k: int, one: Carried) -> bool:
        """Tell whether an output drives a transistor straight or through resistors."""
        row = self.network.row(steering(one))
        if row < 0:
            return False
        answers, volts = self.answers, self.network.injections[injection_of(one)].row
        amps = float(self._adjoint[answers.at(k, "current"), row])
        moved = float(self._adjoint[answers.at(k, "output"), volts])
        return abs(amps + 1.0) < DRIVEN and abs(moved) < 1.0 + DRIVEN


def _carriers(driven: Iterable[Working]) -> Iterable[Carrier]:
    for done in driven:
        one = done.carried
        if isinstance(one, FieldEffect):
            yield Carrier(designators=names_of(one), carries=done.carries, volts=done.volts)
        else:
            yield Carrier(
                designators=names_of(one),
                carries=done.carries,
                takes=done.takes,
                gain=one.gain,
                gain_stated=one.gain_stated,
                volts=done.volts,
                volts_stated=isinstance(one, Bipolar) and one.saturation is not None,
            )
