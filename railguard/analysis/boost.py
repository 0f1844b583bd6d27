"""Transistors that loops drive: boosted outputs, current sinks and sources.

Each is taken for a straight line (`analysis.lines`); the solved circuit then shows what the load
asks of the output in front of it: its current over the gain, C dv/dt of a gate, and the volts in
between. Whether it really works so is looked at afterwards, over the whole range of every signal.
One that stops conducting, saturates, or whose current nothing but its own gain sets is left out
again, and what rests on it has no number.
"""

from collections.abc import Iterable, Mapping, Sequence

import msgspec
import numpy as np

from railguard.analysis.lines import (
    Carried,
    Entries,
    Limit,
    Line,
    Pair,
    control,
    current,
    elements_of,
    first_line,
    injection_of,
    limits,
    names_of,
    paired,
    share_off,
    steering,
    taken,
    touching,
)
from railguard.analysis.network import Complex, Network, Parasitics, Real
from railguard.analysis.ranges import Answers, Clamp, answer, standing
from railguard.analysis.recognise import Amplifier
from railguard.analysis.signals import Drive, Prepared
from railguard.analysis.stage import Carrier
from railguard.analysis.transistors import (
    BASE_EMITTER_SPREAD,
    Bipolar,
    FieldEffect,
    transistors_of,
)
from railguard.circuit.model import Element, Model

MOST = 32
"""Transistors in one part up to which they are looked at: beyond, it is no op-amp stage."""
ROUNDS = 6
"""How often transistors are left out and the rest solved again."""
STEPS = 20
"""Steps in which a curve and its current find each other."""
SETTLED_VOLTS = 1e-4
RESTING_SHARE = 1e-3
"""A current that ends this share of its peak below zero is one that just reaches zero."""
GAIN_ERROR = 0.1
HELD_VOLTS = 0.01
"""A loop holds a transistor's current where 10 % more of it moves no amplifier's input by 10 mV."""
LARGEST_GATE_FARADS = 10e-9
NEGLIGIBLE_AMPS = 10e-6
"""What a gate of unlisted capacitance may have at most, and the current that then counts for
nothing: common practice, no source."""
DRIVEN = 0.5
"""An output drives a base where more than this share of the base's current comes from there."""
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
    """

    working: tuple[Working, ...] = ()
    left: Mapping[str, str] = {}
    assumed: frozenset[int] = frozenset()
    spread: Mapping[str, tuple[float, float]] = {}
    unsure: tuple[float, ...] = ()
    drives: Mapping[str, tuple[Carrier, ...]] = {}
    idle: frozenset[str] = frozenset()

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
    """

    network: Network
    amplifiers: tuple[Amplifier, ...]
    prepared: Prepared
    draws: Mapping[str, float]
    held: Mapping[str, Clamp]
    extra: Mapping[str, Parasitics]


def boosted(part: Part, models: Mapping[str, Model] | None) -> tuple[Network, Answers, Boost]:
    """Solve a part with those of its transistors that work as straight lines.

    models  of the deck, by lower-cased name; None: the part has no transistor

    Raises  SolveError
    """
    found, left = transistors_of(part.prepared.elements, models) if models is not None else ((), {})
    if len(found) > MOST:
        left |= {one.designator: "which is one of very many" for one in found}
        found = ()
    chosen = paired(found)
    idle: frozenset[str] = frozenset()
    for _ in range(ROUNDS):
        if not chosen:
            break
        solver = _Solver(part, _settled(part, chosen))
        halves = solver.one_sided()
        if halves:
            idle = idle.union(other.designator for _, other in halves.values())
            chosen = [halves[one][0] if one in halves else one for one in chosen]
            continue
        failing = solver.failing()
        if not failing:
            return solver.network, solver.answers, solver.boost(left, idle)
        left |= {name: why for one, why in failing.items() for name in names_of(one)}
        chosen = [one for one in chosen if one not in failing]
    answers = answer(part.network, part.amplifiers, part.prepared, part.draws, part.held)
    return part.network, answers, Boost(left=left)


def _settled(part: Part, chosen: Sequence[Carried]) -> dict[Carried, Line]:
    """Return the lines that touch the transistors' curves where they stand at DC."""
    lines = {one: first_line(one) for one in chosen}
    for _ in range(STEPS):
        prepared, network, held = _with_lines(part, lines)
        x = standing(network, prepared, part.draws, held)[1]
        moved = {}
        for one, line in lines.items():
            amps = _sum(current(one, line, network), x).real
            sign = 0 if isinstance(one, Pair) else one.sign
            moved[one] = touching(one, line, sign * amps)
        step = max(abs(moved[one].volts - lines[one].volts) for one in chosen)
        lines = moved
        if step < SETTLED_VOLTS:
            break
    return lines


def _with_lines(
    part: Part, lines: Mapping[Carried, Line]
) -> tuple[Prepared, Network, dict[str, Clamp]]:
    """Return a part with lines in it: a pair's voltage goes either way, as a held output does."""
    elements, levels, held = [*part.prepared.elements], [*part.prepared.levels], dict(part.held)
    for one, line in lines.items():
        elements += elements_of(one, line)
        if isinstance(one, Pair):
            held[injection_of(one)] = Clamp(0.0, line.volts)
        else:
            levels.append(Drive(injection_of(one), one.sign * line.volts))
    prepared = msgspec.structs.replace(
        part.prepared, elements=tuple(elements), levels=tuple(levels)
    )
    network = Network(elements, part.amplifiers, part.network.forced, part.extra)
    return prepared, network, held


def _sum(entries: Entries, x: Real | Complex) -> complex:
    return sum((unit * complex(x[row]) for row, unit in entries), 0j)


def _span(answers: Answers, entries: Entries) -> tuple[float, float]:
    """Return the lowest and highest value of a sum over levels and tones."""
    level = _sum(entries, answers.x).real
    peak = sum(
        max((abs(_sum(entries, w.x)) for w in tone.worst), default=0.0) for tone in answers.tones
    )
    return level - peak, level + peak


class _Solver:
    """A part solved with some transistors as lines, and what is to be said of them."""

    def __init__(self, part: Part, lines: Mapping[Carried, Line]) -> None:
        """Solve. Raises SolveError."""
        self._part = part
        self._lines = lines
        prepared, self.network, held = _with_lines(part, lines)
        self.answers = answer(self.network, part.amplifiers, prepared, part.draws, held)
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
        if GAIN_ERROR * peak * self._at_inputs(one) > HELD_VOLTS:
            return "carries a current that its own gain sets, not a loop"
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
            if abs(self._adjoint[output, row]) < DRIVEN:
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

    def _at_inputs(self, one: Carried) -> float:
        """Return the most that an ampere more through it moves any amplifier's input by, V."""
        effect = self._of_its_current(one)
        picks = [
            self.answers.at(k, pin)
            for k in range(len(self.answers.amplifiers))
            for pin in ("plus", "minus")
        ]
        return float(effect[picks].max())

    def _is_quick(self, one: FieldEffect) -> bool:
        """Tell whether the largest gate would take current that counts from an output."""
        row = self.network.row(one.gate)
        if row < 0:
            return False
        slews = [
            float(self.answers.slew[self.answers.at(k, "output")])
            for k in range(len(self.answers.amplifiers))
            if abs(self._adjoint[self.answers.at(k, "current"), row]) > DRIVEN
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
            assumed=frozenset(assumed),
            spread={
                injection_of(one): (one.sign * line.volts, share)
                for one, line in self._lines.items()
                if not isinstance(one, Pair) and (share := share_off(one, line)) > 0
            },
            unsure=self._unsure(),
            drives={
                amplifier.designator: tuple(_carriers(self._driven(k, working)))
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

    def _driven(self, k: int, working: Iterable[Working]) -> list[Working]:
        effect = self._adjoint[self.answers.at(k, "current")]
        return [
            done
            for done in working
            if (row := self.network.row(steering(done.carried))) >= 0 and abs(effect[row]) > DRIVEN
        ]


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
