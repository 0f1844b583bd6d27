"""The loop of a stage over frequency: open-loop gain, noise gain, and the phase left.

Drawn from the points that the analysis swept; decibels and logarithms are the scales of the axes,
nothing else is worked out here.
"""

import math
from collections.abc import Iterator, Sequence
from xml.etree import ElementTree as ET

from railguard.analysis.loop import Loop
from railguard.report.html.svg import node, picture
from railguard.report.words import with_ends
from railguard.units import si

WIDTH = 540.0
LEFT, RIGHT = 46.0, 528.0
GAIN_TOP, GAIN_BOTTOM = 26.0, 206.0
PHASE_TOP, PHASE_BOTTOM = 240.0, 340.0
HEIGHT = 378.0

BELOW, ABOVE = 1e5, 30.0
"""How far a plot reaches below and above the crossover, as factors of its frequency."""

LOWEST_DB = -40.0
PHASES = (0.0, 45.0, 90.0, 135.0, 180.0)
"""Ticks of the phase left, degrees."""

_ROOM = 62.0
"""Least distance of two frequencies written on the axis."""


def bode(loop: Loop, about: str) -> ET.Element | None:
    """Draw a loop; None where its sweep holds nothing to draw."""
    if len(loop.points) < 2:
        return None
    return _Plot(loop).picture(about)


class _Plot:
    def __init__(self, loop: Loop) -> None:
        self.loop = loop
        swept = [point[0] for point in loop.points]
        low, high = min(swept), max(swept)
        if loop.crossover:
            low = max(low, min(loop.crossover / BELOW, (loop.band or math.inf) / 10))
            high = min(high, max(loop.crossover * ABOVE, (loop.band or 0.0) * 3))
        self.low, self.high = math.log10(low), math.log10(high)
        self.points = loop.points
        gains = [
            _decibel(max(noise, a)) for hertz, noise, a, _ in loop.points if low <= hertz <= high
        ]
        self.top = 20.0 * math.ceil(max((*gains, 20.0)) / 20.0)

    def x(self, hertz: float) -> float:
        share = (math.log10(hertz) - self.low) / (self.high - self.low)
        return LEFT + share * (RIGHT - LEFT)

    def gain(self, decibel: float) -> float:
        share = (self.top - decibel) / (self.top - LOWEST_DB)
        return GAIN_TOP + share * (GAIN_BOTTOM - GAIN_TOP)

    def phase(self, degrees: float) -> float:
        return PHASE_BOTTOM - (degrees / PHASES[-1]) * (PHASE_BOTTOM - PHASE_TOP)

    def picture(self, about: str) -> ET.Element:
        svg = picture(WIDTH, HEIGHT, f"{about}: {spoken(self.loop)}", "bode")
        svg.extend(self.axes())
        # An inner svg element cuts off what runs out of its frame.
        svg.append(
            _framed(
                GAIN_TOP,
                GAIN_BOTTOM,
                self.curve(
                    "open-loop", [(f, self.gain(_decibel(a))) for f, _, a, _ in self.points]
                ),
                self.curve(
                    "noise-gain", [(f, self.gain(_decibel(n))) for f, n, _, _ in self.points]
                ),
            )
        )
        svg.append(
            _framed(
                PHASE_TOP,
                PHASE_BOTTOM,
                self.curve("phase", [(f, self.phase(180.0 + p)) for f, _, _, p in self.points]),
            )
        )
        svg.extend(self.marks())
        return svg

    def curve(self, kind: str, points: Sequence[tuple[float, float]]) -> ET.Element:
        drawn = " ".join(f"{self.x(f):.1f},{y:.1f}" for f, y in points)
        return node("polyline", points=drawn, class_=f"curve {kind}")

    def axes(self) -> Iterator[ET.Element]:
        last = -math.inf
        for decade in range(math.ceil(self.low), math.floor(self.high) + 1):
            x = self.x(10.0**decade)
            for top, bottom in ((GAIN_TOP, GAIN_BOTTOM), (PHASE_TOP, PHASE_BOTTOM)):
                yield node("line", x1=x, x2=x, y1=top, y2=bottom, class_="grid")
            if x - last >= _ROOM:
                yield _text(si(10.0**decade, "Hz"), x, PHASE_BOTTOM + 18, "middle")
                last = x
        step = 20.0 if self.top - LOWEST_DB <= 120 else 40.0
        decibel = LOWEST_DB
        while decibel <= self.top:
            y = self.gain(decibel)
            kind = "grid unity" if decibel == 0 else "grid"
            yield node("line", x1=LEFT, x2=RIGHT, y1=y, y2=y, class_=kind)
            yield _text(f"{decibel:.0f}", LEFT - 8, y + 4, "end")
            decibel += step
        for degrees in PHASES:
            y = self.phase(degrees)
            yield node("line", x1=LEFT, x2=RIGHT, y1=y, y2=y, class_="grid")
            yield _text(f"{degrees:.0f}", LEFT - 8, y + 4, "end")
        yield _text("dB", LEFT - 8, GAIN_TOP - 10, "end")
        yield _text("°", LEFT - 8, PHASE_TOP - 10, "end")
        yield _text("Phase left before the loop turns positive", LEFT, PHASE_TOP - 10, "start")
        yield from self.key()

    def key(self) -> Iterator[ET.Element]:
        x = LEFT
        for kind, words in (("open-loop", "open-loop gain"), ("noise-gain", "noise gain 1/β")):
            yield node("line", x1=x, x2=x + 28, y1=12, y2=12, class_=f"curve {kind}")
            yield _text(words, x + 34, 16, "start")
            x += 160

    def marks(self) -> Iterator[ET.Element]:
        loop = self.loop
        if loop.band and self.low <= math.log10(loop.band) <= self.high:
            yield from self.upright(
                loop.band, "band", f"band to {si(loop.band, 'Hz')}", GAIN_BOTTOM - 6
            )
        if loop.crossover is None or not self.low <= math.log10(loop.crossover) <= self.high:
            return
        at = f"closes at {si(loop.crossover, 'Hz')}"
        yield from self.upright(loop.crossover, "crossover", at, GAIN_TOP + 14)
        if loop.noise_gain_crossover:
            y = self.gain(_decibel(loop.noise_gain_crossover))
            yield node("circle", cx=self.x(loop.crossover), cy=y, r=4.5, class_="mark")
        yield from self.margin(loop.crossover)

    def margin(self, hertz: float) -> Iterator[ET.Element]:
        """Mark the phase margin, or the bounds it lies in where not all of it is listed."""
        loop, x = self.loop, self.x(hertz)
        if loop.phase_margin is not None:
            yield node("circle", cx=x, cy=self.phase(loop.phase_margin), r=4.5, class_="mark")
        elif loop.margins.low is not None and loop.margins.high is not None:
            ends = (self.phase(loop.margins.low), self.phase(loop.margins.high))
            yield node("line", x1=x, x2=x, y1=ends[0], y2=ends[1], class_="mark bounds")

    def upright(self, hertz: float, kind: str, words: str, y: float) -> Iterator[ET.Element]:
        x = self.x(hertz)
        yield node("line", x1=x, x2=x, y1=GAIN_TOP, y2=PHASE_BOTTOM, class_=f"upright {kind}")
        left = x > (LEFT + RIGHT) / 2
        yield _text(words, x + (-6 if left else 6), y, "end" if left else "start", "note")


def spoken(loop: Loop) -> str:
    """Return a loop in words."""
    parts = [f"noise gain {loop.noise_gain_dc:.3g} at DC" if loop.noise_gain_dc else ""]
    if loop.crossover:
        ends = with_ends(loop.crossover, loop.crossover_worst, "Hz")
        parts.append(f"the loop closes at {ends}")
    if loop.noise_gain_crossover:
        parts.append(f"where the noise gain is {loop.noise_gain_crossover:.3g}")
    parts.append(margin_words(loop))
    return ", ".join(part for part in parts if part)


def margin_words(loop: Loop) -> str:
    """Return the phase margin in words, or its bounds, or "" where neither is known."""
    if loop.phase_margin is not None:
        return f"phase margin {with_ends(loop.phase_margin, loop.phase_margin_worst, '°')}"
    low, high = loop.margins.low, loop.margins.high
    if low is None or high is None:
        return ""
    return f"phase margin between {si(low, '°')} and {si(high, '°')}, as not all of it is listed"


def _framed(top: float, bottom: float, *curves: ET.Element) -> ET.Element:
    frame = node(
        "svg",
        x=LEFT,
        y=top,
        width=RIGHT - LEFT,
        height=bottom - top,
        viewBox=f"{LEFT} {top} {RIGHT - LEFT} {bottom - top}",
    )
    frame.extend(curves)
    return frame


def _decibel(value: float) -> float:
    return 20.0 * math.log10(max(value, 1e-12))


def _text(text: str, x: float, y: float, anchor: str, kind: str = "tick") -> ET.Element:
    return node("text", text, x=x, y=y, text_anchor=anchor, class_=kind)
