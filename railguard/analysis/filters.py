"""Active filters of second order: natural frequency and quality factor.

The stage is taken with an ideal amplifier and everything around it held, so its characteristic
polynomial is of second order; three values of the determinant give it. That covers Sallen-Key and
multiple-feedback stages of every kind without a formula for each.

Source  TI SLOA049, Active low-pass filter design (the topologies); S. Franco, Design with
        Operational Amplifiers, ch. 3 (worked values in tests/outside)
"""

from collections import defaultdict
from collections.abc import Mapping

import msgspec
import numpy as np

from railguard.analysis.bound import Range
from railguard.analysis.equations import Complex, Real
from railguard.analysis.loop import Filter
from railguard.analysis.recognise import Amplifier
from railguard.analysis.surroundings import Ways
from railguard.circuit.model import GROUND, Element

_KINDS = {
    "Sallen-Key low-pass": "low-pass",
    "Sallen-Key high-pass": "high-pass",
    "Sallen-Key band-pass": "band-pass",
}


def filter_of(
    amplifier: Amplifier,
    ways: Ways,
    topology: str,
    beta_minus: float | None,
    gain: tuple[float, Range],
    tolerances: Mapping[str, float],
    noise_gain: Range,
) -> Filter | None:
    """Return the filter a stage is, or None.

    beta_minus  share of the output at the inverting input, V/V (1 for a follower)
    gain        magnitude from a signal, and its range: taken where the filter's own network does
                not tell its pass band's
    tolerances  share each element may be off, by designator
    noise_gain  its range over the tolerances of the network that sets `beta_minus`
    """
    if topology.startswith("Sallen-Key") and beta_minus:
        pin, positive = amplifier.plus, True
    elif topology == "multiple-feedback filter":
        pin, positive = amplifier.minus, False
    else:
        return None
    inner = _inner(pin, amplifier, ways)
    if inner is None:
        return None
    if any(e.kind == "L" for net in (pin, inner) for e in ways.around.get(net, ())):
        return None  # of third order
    around = {id(e): e for net in (pin, inner) for e in _passive(net, ways)}
    stage = _Stage(pin, inner, amplifier, tuple(around.values()))
    beta = beta_minus if positive else None
    found = stage.natural({}, beta)
    if found is None:
        return None
    frequency, quality = found
    kind = _KINDS.get(topology) or _multiple_feedback(amplifier, inner, ways)
    own = (1.0 / beta_minus, noise_gain) if positive and beta_minus else gain
    if not positive:
        own = stage.passed_span(kind, frequency, tolerances) or gain
    spans = _spans(stage, found, beta, tolerances, noise_gain)
    return Filter(kind, frequency, quality, own[0], *spans, own[1])


BUMP = 1e-4
"""Share by which a part is moved to see what it does."""


def _spans(
    stage: "_Stage",
    nominal: tuple[float, float],
    beta: float | None,
    tolerances: Mapping[str, float],
    noise_gain: Range,
) -> tuple[Range, Range]:
    """Return the ranges of frequency and Q: the extreme-value sum over every part.

    On logarithms, on which the square root of a product is a plane: its ends are exact.
    """
    up, down = np.zeros(2), np.zeros(2)

    def add(bumped: tuple[float, float] | None, share: float) -> None:
        """Take in what one part does, moved by `BUMP`."""
        if bumped is None:
            return
        pull = np.log(np.divide(bumped, nominal)) / np.log1p(BUMP)
        ends = pull * np.log1p(share), pull * np.log1p(-share)
        up[:] += np.maximum(*ends)
        down[:] += np.minimum(*ends)

    for element in stage.elements:
        share = tolerances.get(element.designator)
        if share:
            add(stage.natural({element.designator: 1.0 + BUMP}, beta), share)
    if beta is not None and noise_gain.low is not None and noise_gain.high is not None:
        # What sets the gain moves the Q as well, and stands outside these elements.
        share = (noise_gain.high - noise_gain.low) / (noise_gain.high + noise_gain.low)
        add(stage.natural({}, beta * (1.0 + BUMP)), share)
    low, high = nominal * np.exp(down), nominal * np.exp(up)
    return Range(float(low[0]), float(high[0])), Range(float(low[1]), float(high[1]))


def _other(element: Element, net: str) -> str:
    return element.nets[1] if element.nets[0] == net else element.nets[0]


def _passive(net: str, ways: Ways) -> list[Element]:
    return [
        e for e in ways.around.get(net, ()) if e.kind in ("R", "C") and e.value and len(e.nets) >= 2
    ]


def _inner(pin: str, amplifier: Amplifier, ways: Ways) -> str | None:
    """Return the net between the pin and the signal that the output also reaches."""
    for element in _passive(pin, ways):
        net = _other(element, pin)
        if net in ways.held or net in ways.outputs:
            continue
        if any(_other(e, net) == amplifier.output for e in _passive(net, ways)):
            return net
    return None


def _multiple_feedback(amplifier: Amplifier, inner: str, ways: Ways) -> str:
    """A resistor from the inner net to the pin passes DC; else a capacitor in front cuts the band.

    Both others lead back to the output and to the pin through capacitors.
    """
    around = [(_other(e, inner), e.kind) for e in _passive(inner, ways)]
    if (amplifier.minus, "R") in around:
        return "low-pass"
    own = (amplifier.minus, amplifier.output, GROUND)
    return "high-pass" if any(k == "C" and n not in own for n, k in around) else "band-pass"


class _Stage(msgspec.Struct, frozen=True):
    """A filter's two nets, its amplifier and the resistors and capacitors on those nets."""

    pin: str
    inner: str
    amplifier: Amplifier
    elements: tuple[Element, ...]

    def natural(
        self, scales: Mapping[str, float], beta: float | None
    ) -> tuple[float, float] | None:
        """Return (hertz, Q) of the pair of poles, or None where there is no such pair.

        scales  factors on elements' values, by designator
        beta    share of the output at the inverting input; None where that is the filter's own pin
        """
        g, c = self._matrices(scales, beta)
        if not c.any():
            return None
        scale = float(np.abs(g[:2]).max() / np.abs(c).max())
        d0 = float(np.linalg.det(g))
        plus, minus = (float(np.linalg.det(g + s * scale * c)) for s in (1.0, -1.0))
        d1, d2 = (plus - minus) / 2, (plus + minus) / 2 - d0
        if d0 * d2 <= 0 or d0 * d1 <= 0:
            return None
        return scale * float(np.sqrt(d0 / d2)) / (2 * np.pi), float(np.sqrt(d0 * d2)) / abs(d1)

    def _matrices(self, scales: Mapping[str, float], beta: float | None) -> tuple[Real, Real]:
        """Return conductances and capacitances over pin, inner net and output.

        The last row is the amplifier's: both inputs at one voltage.
        """
        index = self._index()
        g, c = np.zeros((3, 3)), np.zeros((3, 3))
        for element in self.elements:
            value = (element.value or 0.0) * scales.get(element.designator, 1.0)
            matrix, size = (g, 1.0 / value) if element.kind == "R" else (c, value)
            a, b = (index.get(n, -1) for n in element.nets[:2])
            for i, j, sign in ((a, a, 1.0), (b, b, 1.0), (a, b, -1.0), (b, a, -1.0)):
                if i >= 0 and j >= 0:
                    matrix[i, j] += sign * size
        g[2, :], c[2, :] = 0.0, 0.0
        g[2, 0] = 1.0
        if beta is not None:
            g[2, 2] = -beta
        return g, c

    def _index(self) -> dict[str, int]:
        return {self.pin: 0, self.inner: 1, self.amplifier.output: 2}

    def passed(self, kind: str, hertz: float, scales: Mapping[str, float]) -> float | None:
        """Return the gain in the pass band of a multiple-feedback stage, V/V, from its signal.

        At DC, far above, or at the natural frequency. Several nets may feed it, a reference under a
        small resistor among them, which makes a large gain: the smallest counts. What passes a
        high-pass comes through a capacitor.
        """
        s = 2j * np.pi * {"low-pass": 0.0, "high-pass": FAR_ABOVE * hertz}.get(kind, hertz)
        g, c = self._matrices(scales, None)
        index = self._index()
        fed: defaultdict[str, Complex] = defaultdict(lambda: np.zeros(3, dtype=np.complex128))
        for element in self.elements:
            value = (element.value or 0.0) * scales.get(element.designator, 1.0)
            inside = [index[n] for n in element.nets[:2] if n in index]
            outside = [n for n in element.nets[:2] if n not in index and n != GROUND]
            if inside and outside and (element.kind == "C" or kind != "high-pass"):
                fed[outside[0]][inside[0]] += 1.0 / value if element.kind == "R" else s * value
        if not fed:
            return None
        found = np.linalg.solve(g + s * c, np.array(list(fed.values())).T)
        return float(np.abs(found[2]).min()) or None

    def passed_span(
        self, kind: str, hertz: float, tolerances: Mapping[str, float]
    ) -> tuple[float, Range] | None:
        """Return that gain, and its range: the extreme-value sum over every part."""
        nominal = self.passed(kind, hertz, {})
        if nominal is None:
            return None
        moved = 0.0
        for element in self.elements:
            share = tolerances.get(element.designator)
            if not share:
                continue
            bumped = self.passed(kind, hertz, {element.designator: 1.0 + BUMP})
            if bumped is not None:
                moved += abs(bumped - nominal) / BUMP * share
        return nominal, Range(nominal - moved, nominal + moved)


FAR_ABOVE = 1e3
"""Multiple of its frequency at which a high-pass passes all it passes."""
