"""What may be off in a network: elements by their tolerances, amplifiers by their data sheets."""

from collections.abc import Mapping

import msgspec
import numpy as np
import numpy.typing as npt

from railguard.analysis.equations import Real
from railguard.analysis.network import Network
from railguard.analysis.recognise import Amplifier
from railguard.analysis.stamping import gain_bandwidth

STEADY = 0.02
"""Share, in the mean of what moves a quantity, up to which its logarithm is followed on those of
the parameters: sums of powers then bend by less than half a percent of the range."""

Flags = npt.NDArray[np.bool_]
Index = npt.NDArray[np.int64]


class Off(msgspec.Struct, frozen=True):
    """What may be off in a network: each adds `coefficient * u w^T` to its matrix.

    left, right  rows of u and w, shape (parameters, 2): one at the first; -1: none
    second       what stands at the second row of w: minus one, as always in u, or the ohms of an
                 amplifier's output, whose integration counts before them
    value        siemens, farad, minus henry, or the seconds of an amplifier that integrates
    storing      True where the coefficient goes with s
    inverse      True where it goes with one over the parameter: ohms, gain-bandwidth products
    least, most  the share it may be off
    own          index of the amplifier whose gain-bandwidth product it is, else -1
    """

    left: Index
    right: Index
    second: Real
    value: Real
    storing: Flags
    inverse: Flags
    least: Real
    most: Real
    own: Index

    def change(self, shares: Real) -> Real:
        """Return what shares, shape (..., parameters), add to the coefficients, but for s."""
        return np.asarray(self.value * np.where(self.inverse, -shares / (1.0 + shares), shares))

    def slope(self, shares: Real) -> Real:
        """Return the derivative of that to each share."""
        return np.asarray(self.value * np.where(self.inverse, -1.0 / (1.0 + shares) ** 2, 1.0))

    def corner(self, pull: Real) -> Real:
        """Return the shares that raise a quantity most, by its derivatives."""
        return np.where(pull > 0, self.most, np.where(pull < 0, self.least, 0.0))

    def steady(self, pulls: Real) -> Real | None:
        """Return how far quantities rise, followed on the logarithm of each share.

        pulls    derivatives of their logarithms, shape (quantities, parameters)
        returns  None where what moves them most is off by too much for that
        """
        up, down = np.log1p(self.most), np.log1p(self.least)
        parts = np.maximum(pulls * up, pulls * down)
        sums = parts.sum(axis=1)
        weighed = (parts * np.maximum(up, -down)).sum(axis=1)
        return np.asarray(sums) if (weighed <= STEADY * sums).all() else None


def off_of(network: Network, tolerances: Mapping[str, float]) -> Off:
    """Collect what moves a network's loops.

    A gain-bandwidth product lies between the least and the typical one listed; output resistance
    and input capacitance are taken as listed.

    tolerances  share each element may be off, by designator
    """
    rows: list[tuple[float, ...]] = []
    for stamp in network.stamps:
        share = tolerances.get(stamp.designator, 0.0)
        if share <= 0:
            continue
        a, b = stamp.a, -1 if stamp.kind == "L" else stamp.b
        value = -stamp.value if stamp.kind == "L" else stamp.value
        resistor = stamp.kind == "R"
        rows.append((a, b, a, b, -1.0, value, not resistor, resistor, -share, share, -1))
    for k, amplifier in enumerate(network.amplifiers):
        row, speed = network.outputs.get(amplifier.designator, -1), gain_bandwidth(amplifier)
        least = _least_speed(amplifier)
        if row < 0 or least >= 1 or not speed or amplifier.designator in network.forced:
            continue
        seconds, out = 1.0 / (2 * np.pi * speed), network.row(amplifier.output)
        ohms = sum(v for i, j, v in network.entries()[1] if i == j == row) / seconds
        rows.append((row, -1, out, row, ohms, seconds, 1, 1, least - 1, 0.0, k))
    table = np.array(rows, dtype=np.float64).reshape(len(rows), 11)
    return Off(
        left=table[:, :2].astype(np.int64),
        right=table[:, 2:4].astype(np.int64),
        second=table[:, 4],
        value=table[:, 5],
        storing=table[:, 6] > 0,
        inverse=table[:, 7] > 0,
        least=table[:, 8],
        most=table[:, 9],
        own=table[:, 10].astype(np.int64),
    )


def _least_speed(amplifier: Amplifier) -> float:
    """Return the share of the typical gain-bandwidth product that is guaranteed."""
    device = amplifier.match.device
    listed = device.gain_bandwidth if device is not None else None
    if listed is None or not listed.typical or listed.guaranteed is None:
        return 1.0
    return min(listed.guaranteed / listed.typical, 1.0)
