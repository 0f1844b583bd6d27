"""The rail scale as a picture: from the negative to the positive rail, what is asked and reached.

The same values and the same words as the terminal's scale. What is asked for is a heavy bar, what
is free a light one; reached only typically is ruled, out of reach is crossed, so that nothing
rests on colour.
"""

import itertools
from collections.abc import Iterator
from xml.etree import ElementTree as ET

from railguard.analysis.bound import Range
from railguard.report.html.svg import node, picture
from railguard.report.scale import Role, Scale, asked_volts, limit_words, shown_limit
from railguard.units import si

WIDTH, HEIGHT = 600.0, 84.0
LEFT, RIGHT = 92.0, 508.0
"""Where the rails stand; what is asked beyond one is drawn outside it."""

EDGE = 24.0
"""Room for the arrow of what runs off the picture."""

AXIS = 42.0
HEAVY, LIGHT = 9.0, 4.0
"""Half the height of the bars of what is asked for, and of what is free."""

_GAP = 8.0
"""Room between a limit and its label."""

Words = tuple[str, ...]
_LETTER = 6.8
"""Width of a letter of the labels, used to keep them apart."""


def ruler(scale: Scale, about: str) -> ET.Element:
    """Draw a scale; `about` is its name for those who do not see it."""
    drawn = _Ruler(scale)
    svg = picture(WIDTH, HEIGHT, f"{about}: {spoken(scale)}", "ruler")
    for role, start, end in drawn.stretches():
        half = HEAVY if role.startswith("asked") else LIGHT
        svg.append(
            node(
                "rect",
                x=start,
                y=AXIS - half,
                width=max(end - start, 1.5),
                height=2 * half,
                class_=role,
            )
        )
    for x in (LEFT, RIGHT):
        svg.append(node("line", x1=x, x2=x, y1=AXIS - 15, y2=AXIS + 15, class_="rail"))
    svg.extend(drawn.ends())
    svg.extend(drawn.labels())
    return svg


def spoken(scale: Scale) -> str:
    """Return a scale in words."""
    kind = "asked at worst" if scale.worst else "asked"
    parts = [
        f"rails {si(scale.negative, 'V')} and {si(scale.positive, 'V')}",
        _range(kind, scale.asked, scale),
        _range("typically reached", scale.typical, scale),
        _range("guaranteed", scale.sure, scale),
    ]
    return "; ".join(part for part in parts if part)


def _range(name: str, band: Range, scale: Scale) -> str:
    if band.low is None or band.high is None:
        return ""
    return f"{name} {asked_volts(band.low, scale)} to {asked_volts(band.high, scale)}"


class _Ruler:
    def __init__(self, scale: Scale) -> None:
        self.scale = scale

    def at(self, volts: float) -> float:
        """Return where a voltage stands; what is further out stands at the edge."""
        scale = self.scale
        share = (volts - scale.negative) / (scale.positive - scale.negative)
        return min(max(LEFT + share * (RIGHT - LEFT), EDGE), WIDTH - EDGE)

    def stretches(self) -> Iterator[tuple[Role, float, float]]:
        """Yield what each stretch between two neighbouring limits means, free ones first."""
        scale = self.scale
        marks = {scale.negative, scale.positive}
        for band in (scale.typical, scale.sure, scale.asked):
            marks.update(end for end in (band.low, band.high) if end is not None)
        ordered = sorted(marks)
        for start, end in itertools.pairwise(ordered):
            free = self.free((start + end) / 2)
            if free is not None:
                yield free, self.at(start), self.at(end)
        asked = scale.asked
        if asked.low is None or asked.high is None:
            return
        if asked.low == asked.high:
            yield self.asked(asked.low), self.at(asked.low) - 2, self.at(asked.low) + 2
        for start, end in itertools.pairwise(ordered):
            middle = (start + end) / 2
            if asked.low < middle < asked.high:
                yield self.asked(middle), self.at(start), self.at(end)

    def free(self, volts: float) -> Role | None:
        if not self.scale.negative < volts < self.scale.positive:
            return None
        if _within(self.scale.sure, volts):
            return "sure"
        return "typical" if _within(self.scale.typical, volts) else "out"

    def asked(self, volts: float) -> Role:
        scale = self.scale
        inside = scale.negative <= volts <= scale.positive
        if inside and scale.typical == Range() and scale.sure == Range():
            return "asked-unknown"
        if inside and _within(scale.sure, volts):
            return "asked-sure"
        return "asked-typical" if inside and _within(scale.typical, volts) else "asked-beyond"

    def ends(self) -> Iterator[ET.Element]:
        """Yield an arrow where what is asked for runs off the picture."""
        asked, y = self.scale.asked, AXIS
        if asked.low is not None and self.at(asked.low) <= EDGE:
            yield node(
                "path", d=f"M{EDGE - 3},{y - 9} L6,{y} L{EDGE - 3},{y + 9} Z", class_="arrow"
            )
        if asked.high is not None and self.at(asked.high) >= WIDTH - EDGE:
            x = WIDTH - EDGE + 3
            yield node("path", d=f"M{x},{y - 9} L{WIDTH - 6},{y} L{x},{y + 9} Z", class_="arrow")

    def labels(self) -> Iterator[ET.Element]:
        scale, above, below = self.scale, AXIS - 22, AXIS + 32
        yield _label(si(scale.negative, "V"), LEFT - 4, above, "end", "rail-value")
        yield _label(si(scale.positive, "V"), RIGHT + 4, above, "start", "rail-value")
        low, high = limit_words(scale, upper=False), limit_words(scale, upper=True)
        if not low and not high:
            yield _label("reach not known", (LEFT + RIGHT) / 2, above, "middle", "limit")
        at = [
            None if end is None else min(max(self.at(end), LEFT), RIGHT)
            for end in (shown_limit(scale, upper=False), shown_limit(scale, upper=True))
        ]
        yield from self.limit_labels(low, at[0], high, at[1], above)
        yield from self.asked_labels(below)

    def limit_labels(
        self, low: Words, start: float | None, high: Words, end: float | None, y: float
    ) -> Iterator[ET.Element]:
        """Write the limits inside the band they bound, or outside it where it is too narrow."""
        inside = 0.0 if start is None or end is None else end - start - 2 * _GAP
        narrow = bool(low and high) and inside < _LETTER * (len(low[0]) + len(high[0]) + 2)
        if start is not None:
            room = start - LEFT > _LETTER * len(low[0])
            shown = low[0] if room or not narrow else low[-1]
            yield _label(
                shown, start + (-4 if narrow else _GAP), y, "end" if narrow else "start", "limit"
            )
        if end is not None:
            room = RIGHT - end > _LETTER * len(high[0])
            shown = high[0] if room or not narrow else high[-1]
            yield _label(
                shown, end + (4 if narrow else -_GAP), y, "start" if narrow else "end", "limit"
            )

    def asked_labels(self, y: float) -> Iterator[ET.Element]:
        asked = self.scale.asked
        if asked.low is None or asked.high is None:
            return
        low, high = asked_volts(asked.low, self.scale), asked_volts(asked.high, self.scale)
        kind = " at worst" if self.scale.worst else ""
        start, end = self.at(asked.low), self.at(asked.high)
        room = end - start - _LETTER * (len(low) + len(kind) + len(high) + 2)
        if low != high and room > 0:
            yield _label(f"{low}{kind}", start, y, "start", "asked")
            yield _label(high, end, y, "end", "asked")
            return
        text = f"{low}{kind}" if low == high else f"{low} to {high}{kind}"
        half = _LETTER * len(text) / 2
        middle = min(max((start + end) / 2, half + 4), WIDTH - half - 4)
        yield _label(text, middle, y, "middle", "asked")


def _within(band: Range, volts: float) -> bool:
    return band.low is not None and band.high is not None and band.low <= volts <= band.high


def _label(text: str, x: float, y: float, anchor: str, kind: str) -> ET.Element:
    return node("text", text, x=x, y=y, text_anchor=anchor, class_=kind)
