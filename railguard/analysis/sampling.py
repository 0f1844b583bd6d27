"""The circuit solved anew at chosen values: Monte Carlo, and the corners exactly.

Samples are solved in stacks. Each sample moves every parameter of the spread by a share of its
tolerance; the ranges are then taken as for the nominal circuit, every tone at the frequency where
it is worst nominally.
"""

import msgspec
import numpy as np

from railguard.analysis.corners import Spread
from railguard.analysis.equations import Complex, Real
from railguard.analysis.ranges import Answers

STACK = 128
"""Samples solved at once."""
STACK_ENTRIES = 8_000_000
"""Entries of all their matrices: 128 MB."""


class Sampled(msgspec.Struct, frozen=True):
    """Ranges of every quantity in every sample, shape (samples, quantities)."""

    high: Real
    low: Real


def monte_carlo(answers: Answers, spread: Spread, count: int, seed: int) -> Sampled:
    """Draw every parameter uniformly inside its tolerance, each for itself.

    seed  same seed, same samples
    """
    generator = np.random.default_rng(seed)
    shares = generator.uniform(-1.0, 1.0, (count, len(spread.delta)))
    return evaluate(answers, spread, shares)


def exact_corners(answers: Answers, spread: Spread, quantities: list[int]) -> Sampled:
    """Solve at the corner that the sensitivities point to, for each quantity's two ends.

    returns  shape (1, len(quantities)): exact where the quantity moves one way over the whole
             tolerance of each parameter, as resistances and rails do
    """
    signs = np.sign(np.concatenate([spread.high[quantities], -spread.low[quantities]]))
    solved = evaluate(answers, spread, signs)
    half = len(quantities)
    picks = np.arange(half)
    return Sampled(
        high=solved.high[picks, quantities][None, :],
        low=solved.low[picks + half, quantities][None, :],
    )


def evaluate(answers: Answers, spread: Spread, shares: Real) -> Sampled:
    """Solve at given shares of each tolerance, shape (samples, parameters), -1 to 1."""
    highs, lows = [], []
    stack = max(1, min(STACK, STACK_ENTRIES // max(answers.network.size, 1) ** 2))
    for start in range(0, len(shares), stack):
        moved = shares[start : start + stack] * spread.delta
        level = _solved(answers, spread, moved, 0.0, _levels(answers, spread, moved))
        peaks = np.zeros_like(level.real)
        for tone in answers.tones:
            b = answers.network.right_hand_side(tone.tone.drives)
            stacked = np.broadcast_to(b, (len(moved), len(b)))
            for worst in tone.worst:
                at = _solved(answers, spread, moved, worst.hertz, stacked)
                peaks[:, worst.picks] += np.abs(at[:, worst.picks])
        highs.append(level.real + peaks)
        lows.append(level.real - peaks)
    return Sampled(np.concatenate(highs), np.concatenate(lows))


def _levels(answers: Answers, spread: Spread, moved: Real) -> Complex:
    """Return the DC right-hand side of each sample: the nominal one and what moves it."""
    nominal = answers.network.g @ answers.x
    b = np.tile(nominal.astype(np.complex128), (len(moved), 1))
    for column, parameter in enumerate(spread.parameters):
        if parameter.stamp is None:
            for row, value in parameter.entries:
                b[:, row] += moved[:, column] * value
    return b


def _solved(answers: Answers, spread: Spread, moved: Real, hertz: float, b: Complex) -> Complex:
    """Return every quantity of every sample at one frequency, shape (samples, quantities)."""
    network = answers.network
    s = 2j * np.pi * hertz
    matrix = np.tile((network.g + s * network.c).astype(np.complex128), (len(moved), 1, 1))
    for column, parameter in enumerate(spread.parameters):
        stamp = parameter.stamp
        if stamp is None:
            continue
        share = moved[:, column]
        if stamp.kind == "R":
            change = np.asarray(stamp.value * (1.0 / (1.0 + share) - 1.0), dtype=np.complex128)
        else:
            unit = s if stamp.kind == "C" else -s
            change = np.asarray(unit * stamp.value * share, dtype=np.complex128)
        if stamp.kind == "L":
            matrix[:, stamp.a, stamp.a] += change
            continue
        for i, j, sign in ((stamp.a, stamp.a, 1), (stamp.b, stamp.b, 1),
                           (stamp.a, stamp.b, -1), (stamp.b, stamp.a, -1)):  # fmt: skip
            if i >= 0 and j >= 0:
                matrix[:, i, j] += sign * change
    solved = np.linalg.solve(matrix, b[:, :, None])[:, :, 0]
    values = np.array(solved[:, answers.rows])
    values[:, answers.rows < 0] = 0.0
    return values
