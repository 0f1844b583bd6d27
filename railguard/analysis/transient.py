"""What steps, slopes and modulated carriers do: a linear transient of the same matrices.

One factorisation of G + C/h, many steps (backward Euler, which damps the fast poles of the
amplifiers instead of ringing on them). Only the deviation from the mean level is followed; it is
superposed on the DC solution like any other tone.
"""

import itertools

import msgspec
import numpy as np

from railguard.analysis.equations import Real
from railguard.analysis.network import Network
from railguard.analysis.solve import Stepper
from railguard.circuit.sources import (
    AmplitudeModulated,
    Exponential,
    FrequencyModulated,
    Piecewise,
    Pulse,
    Sine,
    Wave,
)

STEPS = 2000
MOST_STEPS = 20_000
MOST_WORK = 2_000_000
"""Steps times unknowns: a large circuit is followed in coarser steps."""
EDGE_STEPS = 4
"""Steps an edge is resolved with, as far as MOST_STEPS allows."""
PERIODS = 2
SETTLING = 5.0
"""Time constants of an exponential that are followed."""


class Excursion(msgspec.Struct, frozen=True):
    """How far each row goes above and below its level, and its steepest slope per second."""

    up: Real
    down: Real
    slew: Real


def value_at(wave: Wave, t: Real) -> Real:
    """Return a wave's value at some times, seconds; shape as `t`.

    Source  SPICE3 user's manual, independent sources
    """
    match wave:
        case Sine():
            since = np.maximum(t - wave.delay, 0.0)
            angle = 2 * np.pi * (wave.frequency or 0.0) * since + np.radians(wave.phase)
            decay = np.exp(-wave.damping * since)
            return np.asarray(wave.offset + wave.amplitude * decay * np.sin(angle))
        case Pulse():
            return _pulse(wave, t)
        case Exponential():
            return _exponential(wave, t)
        case Piecewise():
            times = np.array([p[0] for p in wave.points])
            values = np.array([p[1] for p in wave.points])
            since = t - wave.delay
            if wave.repeat is not None and times[-1] > wave.repeat:
                length = times[-1] - wave.repeat
                over = since > times[-1]
                since = np.where(over, wave.repeat + (since - wave.repeat) % length, since)
            return np.asarray(np.interp(since, times, values))
        case FrequencyModulated():
            carrier = 2 * np.pi * (wave.carrier or 0.0) * t
            sway = wave.index * np.sin(2 * np.pi * (wave.signal or 0.0) * t)
            return np.asarray(wave.offset + wave.amplitude * np.sin(carrier + sway))
        case AmplitudeModulated():
            since = np.maximum(t - wave.delay, 0.0)
            envelope = wave.offset + np.sin(2 * np.pi * wave.modulation * since)
            tone = np.sin(2 * np.pi * wave.carrier * since)
            return np.asarray(wave.amplitude * envelope * tone)


def _pulse(wave: Pulse, t: Real) -> Real:
    rise, fall = wave.rise or 1e-15, wave.fall or 1e-15
    width = wave.width if wave.width is not None else np.inf
    since = t - wave.delay
    if wave.period:
        since = np.where(since > 0, since % wave.period, since)
    up = np.clip(since / rise, 0.0, 1.0)
    down = np.clip((since - rise - width) / fall, 0.0, 1.0) if np.isfinite(width) else 0.0
    return np.asarray(wave.first + (wave.second - wave.first) * (up - down))


def _exponential(wave: Exponential, t: Real) -> Real:
    step = wave.second - wave.first
    rise_tau = wave.rise_tau or 1e-15
    up = -np.expm1(-np.maximum(t - wave.rise_delay, 0.0) / rise_tau)
    value = wave.first + step * up
    if wave.fall_delay is not None:
        fall_tau = wave.fall_tau or rise_tau
        value = value + step * np.expm1(-np.maximum(t - wave.fall_delay, 0.0) / fall_tau)
    return np.asarray(value)


def window(wave: Wave) -> tuple[float, float]:
    """Return how long a wave is followed and the finest thing in it, seconds."""
    match wave:
        case Pulse():
            edges = [e for e in (wave.rise, wave.fall) if e]
            once = sum(v or 0.0 for v in (wave.rise, wave.width, wave.fall)) or 1e-3
            length = wave.delay + (PERIODS * wave.period if wave.period else 2 * once)
            return length, min([*edges, length / 100])
        case Exponential():
            taus = [v for v in (wave.rise_tau, wave.fall_tau) if v] or [1e-3]
            last = max(wave.rise_delay, wave.fall_delay or 0.0)
            return last + SETTLING * max(taus), min(taus)
        case Piecewise():
            times = sorted(p[0] for p in wave.points)
            gaps = [b - a for a, b in itertools.pairwise(times) if b > a]
            length = (times[-1] - times[0]) * (1 if wave.repeat is None else PERIODS)
            return wave.delay + 1.2 * (length or 1e-3), min(gaps, default=1e-3)
        case FrequencyModulated():
            slow = min(f for f in (wave.carrier, wave.signal, 1e12) if f)
            fast = (wave.carrier or slow) + abs(wave.index) * (wave.signal or 0.0)
            return PERIODS / slow, 1 / (8 * fast)
        case AmplitudeModulated():
            slow = min(f for f in (wave.carrier, wave.modulation, 1e12) if f)
            return wave.delay + PERIODS / slow, 1 / (8 * (wave.carrier + wave.modulation))
        case Sine():
            return PERIODS / (wave.frequency or 1.0), 1 / (32 * (wave.frequency or 1.0))


def excursion(network: Network, injection: str, wave: Wave, mean: float) -> Excursion | None:
    """Follow one source's wave through the network.

    mean  the level the wave is superposed on, V or A

    Returns None where the answer grows without end: a circuit held by positive feedback has no
    linear response in time.

    Raises  SolveError
    """
    length, finest = window(wave)
    most = max(STEPS, min(MOST_STEPS, MOST_WORK // max(network.size, 1)))
    count = int(min(max(STEPS, EDGE_STEPS * length / finest), most))
    step = length / count
    if finest > step:
        # Whole steps between the corners of a wave: no peak falls between two of them.
        step = finest / float(np.ceil(finest / step))
        count = int(np.ceil(length / step))
    times = step * np.arange(count + 1, dtype=np.float64)
    drive = value_at(wave, times) - mean
    b = network.right_hand_side([(injection, 1.0)]).real
    march = Stepper(network, step)
    x = march.steady(b * drive[0])
    highest, lowest, steepest = x.copy(), x.copy(), np.zeros(network.size)
    with np.errstate(over="ignore", invalid="ignore"):
        for states in march.along(x, b, drive[1:]):
            slopes = np.abs(np.diff(states, axis=0, prepend=x[None, :]))
            np.maximum(steepest, slopes.max(axis=0), out=steepest)
            np.maximum(highest, states.max(axis=0), out=highest)
            np.minimum(lowest, states.min(axis=0), out=lowest)
            x = states[-1]
        slew = steepest / step
    if not np.all(np.isfinite(slew)) or not np.all(np.isfinite(highest - lowest)):
        return None
    return Excursion(np.maximum(highest, 0.0), np.maximum(-lowest, 0.0), slew)
