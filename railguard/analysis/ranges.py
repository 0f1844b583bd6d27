"""The demand: the range every quantity of interest covers, unclipped, at values as drawn.

Superposition: the DC solution, plus for every tone the largest peak over its band. Tones of
different groups are taken to meet at their worst, so their peaks add.
"""

from collections.abc import Mapping, Sequence

import msgspec
import numpy as np
import numpy.typing as npt

from railguard.analysis.equations import Complex, Real
from railguard.analysis.network import Network
from railguard.analysis.recognise import Amplifier
from railguard.analysis.signals import Prepared, Tone
from railguard.analysis.solve import Factor, factor
from railguard.analysis.transient import excursion

QUANTITIES = ("output", "current", "plus", "minus", "positive", "negative")
_PLACE = {quantity: place for place, quantity in enumerate(QUANTITIES)}
"""Per amplifier: output volts, output amperes (out of the pin), both inputs, both supply pins."""

LONGEST_PERIOD = 16
"""Periods of the slowest sine within which the others must come round again."""
SAMPLES_A_TURN = 64

Index = npt.NDArray[np.int64]


class Clamp(msgspec.Struct, frozen=True):
    """An output that no loop holds: it moves by `half` round `middle` (V), at `hertz`."""

    middle: float
    half: float
    hertz: float = 0.0


class Worst(msgspec.Struct, frozen=True):
    """One tone where it is worst for some quantities: the factor and the solution there.

    picks  indexes of the quantities whose peak over the band is here
    """

    hertz: float
    factor: Factor
    x: Complex
    picks: Index


class ToneAnswer(msgspec.Struct, frozen=True):
    """One tone's excursions, shape (quantities,), and where each is reached.

    up, down  how far each quantity goes above and below its level; alike for a sine
    peaks     the larger of both
    steepest  as `worst`, by slope instead of size
    """

    tone: Tone
    up: Real
    down: Real
    peaks: Real
    hertz: Real
    slew: Real
    worst: tuple[Worst, ...]
    steepest: tuple[Worst, ...]


class Standing(msgspec.Struct, frozen=True):
    """An operating point: the factor at DC, the solution, and whose outputs load their rails."""

    factor: Factor
    x: Real
    drawn: frozenset[str] = frozenset()


class Answers(msgspec.Struct, frozen=True, kw_only=True):
    """The solved circuit.

    rows    row of each quantity in x; -1 where there is none. Shape (amplifiers * 6,)
    x       DC solution, shape (unknowns,)
    level   DC value of each quantity; high, low: its range; slew: its steepest slope per second
    drawn   amplifiers whose output's current at rest is taken from their rails in `x`
    """

    network: Network
    amplifiers: tuple[Amplifier, ...]
    rows: Index
    dc: Factor
    x: Real
    level: Real
    high: Real
    low: Real
    slew: Real
    tones: tuple[ToneAnswer, ...]
    drawn: frozenset[str] = frozenset()

    def at(self, amplifier: int, quantity: str) -> int:
        """Return the index of one amplifier's quantity."""
        return quantity_at(amplifier, quantity)


def quantity_at(amplifier: int, quantity: str) -> int:
    """Return the index of one amplifier's quantity."""
    return amplifier * len(_PLACE) + _PLACE[quantity]


def quantity_rows(network: Network, amplifiers: tuple[Amplifier, ...]) -> Index:
    """Return the row of x each quantity is, shape (amplifiers * 6,)."""
    rows = []
    for a in amplifiers:
        rows += [
            network.row(a.output),
            network.outputs.get(a.designator, -1),
            network.row(a.plus),
            network.row(a.minus),
            network.row(a.positive),
            network.row(a.negative),
        ]
    return np.array(rows, dtype=np.int64)


def answer(
    network: Network,
    amplifiers: tuple[Amplifier, ...],
    prepared: Prepared,
    draws: Mapping[str, float],
    held: Mapping[str, Clamp],
) -> Answers:
    """Solve the circuit for every level and tone.

    draws  amperes of quiescent current by supply net: positive is taken from the net
    held   what the output of each forced amplifier does

    Raises  SolveError
    """
    rows = quantity_rows(network, amplifiers)
    stands = standing(network, prepared, draws, held)
    dc, x = stands.factor, stands.x
    level = picked(x, rows)
    tones = [*prepared.tones]
    for name, clamp in held.items():
        tones.append(Tone(name=name, drives=((name, clamp.half),), frequencies=(clamp.hertz,)))
    factors: dict[float, Factor] = {0.0: dc}
    answers = tuple(_tone(network, tone, rows, factors) for tone in tones)
    up, down = _summed(answers, rows)
    slew = sum((a.slew for a in answers), np.zeros(len(rows)))
    return Answers(
        network=network,
        amplifiers=amplifiers,
        rows=rows,
        dc=dc,
        x=x,
        level=level,
        high=level + up,
        low=level - down,
        slew=slew,
        tones=answers,
        drawn=stands.drawn,
    )


def swings(answers: Answers, nets: Sequence[str]) -> dict[str, tuple[float, float]]:
    """Return the range, V, that some nets cover, by net: low and high."""
    rows = np.array([answers.network.row(net) for net in nets], dtype=np.int64)
    factors: dict[float, Factor] = {0.0: answers.dc}
    tones = tuple(_tone(answers.network, a.tone, rows, factors) for a in answers.tones)
    level, (up, down) = picked(answers.x, rows), _summed(tones, rows)
    ends = zip((level - down).tolist(), (level + up).tolist(), strict=True)
    return dict(zip(nets, ends, strict=True))


def _summed(answers: tuple[ToneAnswer, ...], rows: Index) -> tuple[Real, Real]:
    """Return how far quantities go up and down where all tones meet at their worst."""
    up = sum((a.up for a in answers), np.zeros(len(rows)))
    down = sum((a.down for a in answers), np.zeros(len(rows)))
    together = _common_period(answers, rows)
    if together is not None:
        up, down = np.minimum(up, together[0]), np.minimum(down, together[1])
    return up, down


def standing_levels(
    network: Network,
    amplifiers: tuple[Amplifier, ...],
    prepared: Prepared,
    draws: Mapping[str, float],
) -> Real:
    """Return the DC value of every quantity, shape (amplifiers * 6,); as `answer`, no tones."""
    stands = standing(network, prepared, draws, {})
    return picked(stands.x, quantity_rows(network, amplifiers))


def standing(
    network: Network,
    prepared: Prepared,
    draws: Mapping[str, float],
    held: Mapping[str, Clamp],
) -> Standing:
    """Return the operating point; the arguments are those of `answer`.

    What an output gives at DC comes from its rails: a resistor in a rail's way loses more by it.
    """
    levels = [(d.injection, complex(d.value)) for d in prepared.levels]
    levels += [(name, complex(clamp.middle)) for name, clamp in held.items()]
    b = network.right_hand_side(levels)
    for net, amps in draws.items():
        row = network.row(net)
        if row >= 0:
            b[row] -= amps
    dc = factor(network, 0.0)
    x = dc.forward(b).real
    if not draws:
        return Standing(dc, x)
    given = {}
    for amplifier in network.amplifiers:
        branch = network.outputs.get(amplifier.designator, -1)
        amps = float(x[branch]) if branch >= 0 else 0.0
        net = amplifier.positive if amps > 0 else amplifier.negative
        if net in draws and network.row(net) >= 0:
            given[amplifier.designator] = network.row(net), network.row(amplifier.output), amps
    loaded = dc.forward(_less(b, given)).real
    # No output gives what would take its pin past itself: it is at its limit, and no one's level.
    able = {name: one for name, one in given.items() if _passes(loaded, *one)}
    if len(able) < len(given):
        loaded = dc.forward(_less(b, able)).real
    return Standing(dc, loaded, frozenset(able))


def _less(b: Complex, given: Mapping[str, tuple[int, int, float]]) -> Complex:
    """Return a right-hand side with what outputs give taken from their pins."""
    less = b.copy()
    for pin, _, amps in given.values():
        less[pin] -= amps
    return less


def _passes(x: Real, pin: int, out: int, amps: float) -> bool:
    """Tell whether a supply pin still stands beyond the output it feeds."""
    level = float(x[out]) if out >= 0 else 0.0
    return bool(x[pin] >= level if amps > 0 else x[pin] <= level)


def picked(x: Real, rows: Index) -> Real:
    """Take some rows of a solution; ground is zero."""
    values = np.array(x[rows])
    values[rows < 0] = 0.0
    return values


def _common_period(answers: tuple[ToneAnswer, ...], rows: Index) -> tuple[Real, Real] | None:
    """Return how far the sines of the deck really go within their common period, or None.

    Only where every tone is one sine of one frequency and the period is short enough to follow:
    elsewhere their peaks may meet, and the sum of the peaks stands.
    """
    hertz = [a.tone.frequencies[0] for a in answers]
    lone = all(
        len(a.tone.frequencies) == 1 and a.tone.wave is None and a.tone.basis == "netlist"
        for a in answers
    )
    if len(answers) < 2 or not lone or min(hertz) <= 0:
        return None
    base = min(hertz)
    for divisor in range(1, LONGEST_PERIOD + 1):
        turns = [f * divisor / base for f in hertz]
        if all(abs(t - round(t)) < 1e-6 * t for t in turns):
            break
    else:
        return None
    if max(turns) > LONGEST_PERIOD**2:
        return None
    time = np.arange(0.0, 1.0, 1.0 / (SAMPLES_A_TURN * round(max(turns))))
    total = np.zeros((len(time), len(rows)))
    for turn, a in zip(turns, answers, strict=True):
        phasor = a.worst[0].x[rows]  # of ground too, whose sum of peaks is zero all the same
        total += np.real(np.exp(2j * np.pi * round(turn) * time)[:, None] * phasor[None, :])
    return np.maximum(total.max(axis=0), 0.0), np.maximum(-total.min(axis=0), 0.0)


def _tone(network: Network, tone: Tone, rows: Index, factors: dict[float, Factor]) -> ToneAnswer:
    b = network.right_hand_side(tone.drives)
    frequencies = np.array(tone.frequencies)
    solutions = []
    for hertz in tone.frequencies:
        if hertz not in factors:
            factors[hertz] = factor(network, hertz)
        solutions.append(factors[hertz].forward(b))
    x = np.stack(solutions)
    values = np.array(x[:, rows])
    values[:, rows < 0] = 0.0
    magnitude = np.abs(values)
    best = np.argmax(magnitude, axis=0)
    peaks = magnitude[best, np.arange(len(rows))]
    slopes = magnitude * (2 * np.pi * frequencies)[:, None]
    slew, fastest = np.max(slopes, axis=0), np.argmax(slopes, axis=0)

    def at(places: Index) -> tuple[Worst, ...]:
        return tuple(
            Worst(
                hertz=float(frequencies[f]),
                factor=factors[float(frequencies[f])],
                x=x[f],
                picks=np.flatnonzero(places == f),
            )
            for f in sorted(set(places.tolist()))
        )

    worst = at(best)
    up = down = peaks
    if tone.wave is not None:
        followed = excursion(network, tone.drives[0][0], tone.wave, tone.mean)
        if followed is not None:  # else its phasor stands, as for a sine in such a circuit
            up, down = picked(followed.up, rows), picked(followed.down, rows)
            peaks, slew = np.maximum(up, down), picked(followed.slew, rows)
    return ToneAnswer(
        tone=tone,
        up=up,
        down=down,
        peaks=peaks,
        hertz=frequencies[best],
        slew=slew,
        worst=worst,
        steepest=worst if len(frequencies) == 1 else at(fastest),
    )
