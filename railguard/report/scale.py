"""The rail scale: one line from the negative to the positive rail.

It shows the band the device reaches and the band the signal asks for. A heavy mark is asked for,
a light one is free; solid is guaranteed, broken is typical only, a cross is out of reach. What is
asked for beyond a rail stands outside the rail's mark. The marks differ without colour, and a
second set needs nothing but ASCII.
"""

from typing import Literal

import msgspec

from railguard.analysis.bound import Bound, Range
from railguard.analysis.stage import Stage
from railguard.units import si

Role = Literal[
    "text",
    "blank",
    "rail",
    "out",
    "typical",
    "sure",
    "asked-sure",
    "asked-typical",
    "asked-beyond",
    "asked-unknown",
]

Span = tuple[str, Role]
Line = tuple[Span, ...]


class Scale(msgspec.Struct, frozen=True, kw_only=True):
    """What one rail scale shows, volts.

    name       "output" or "inputs"
    typical    the band typically reached; an end that is not known is None
    sure       the band that is guaranteed
    asked      the band asked for; both ends None: nothing known
    worst      True where `asked` is the worst case of the tolerances
    practice   True where the reach is common practice, as nobody knows the device
    """

    name: str
    negative: float
    positive: float
    typical: Range = Range()
    sure: Range = Range()
    asked: Range = Range()
    worst: bool = False
    practice: bool = False


class Marks(msgspec.Struct, frozen=True):
    """One set of characters. `point` marks a single value, the arrows what runs off the line."""

    glyphs: dict[Role, str]
    point: str
    left: str
    right: str


UNICODE = Marks(
    glyphs={
        "blank": " ",
        "rail": "┃",
        "out": "·",
        "typical": "╌",
        "sure": "─",
        "asked-sure": "━",
        "asked-typical": "╍",
        "asked-beyond": "╳",
        "asked-unknown": "━",
    },
    point="◆",
    left="◀",
    right="▶",
)
ASCII = Marks(
    glyphs={
        "blank": " ",
        "rail": "|",
        "out": ".",
        "typical": "~",
        "sure": "-",
        "asked-sure": "=",
        "asked-typical": "+",
        "asked-beyond": "X",
        "asked-unknown": "=",
    },
    point="o",
    left="<",
    right=">",
)

MEANINGS: tuple[tuple[Role, str], ...] = (
    ("asked-sure", "asked for"),
    ("asked-typical", "asked for and reached only typically"),
    ("asked-beyond", "asked for but out of reach"),
    ("sure", "free"),
    ("typical", "free only typically"),
    ("out", "out of reach"),
    ("rail", "rail"),
)
"""The legend, in the order it is printed."""

ZONE = 8
"""Columns kept outside each rail's mark, for its value and for what is asked beyond it."""

NARROWEST = 32
"""Columns below which a scale shows nothing any more."""


def output_scale(stage: Stage, *, worst: bool) -> Scale | None:
    """Return the scale of a stage's output, or None where its rails are not both known."""
    output = stage.output
    return _scale(
        "output",
        stage,
        (output.demand, output.worst),
        output.available,
        output.guaranteed,
        (output.low, output.high),
        worst=worst,
    )


def input_scale(stage: Stage, *, worst: bool) -> Scale | None:
    """Return the scale of a stage's inputs, or None where its rails are not both known."""
    inputs = stage.inputs
    return _scale(
        "inputs",
        stage,
        (inputs.demand, inputs.worst),
        inputs.available,
        inputs.guaranteed,
        (inputs.low, inputs.high),
        worst=worst,
    )


def _scale(
    name: str,
    stage: Stage,
    asked: tuple[Range, Range],
    typical: Range,
    sure: Range,
    bounds: tuple[Bound, Bound],
    *,
    worst: bool,
) -> Scale | None:
    supply = stage.supply
    if "floating" in (stage.inputs.plus.state, stage.inputs.minus.state):
        return None  # no level anywhere in the stage is defined
    if supply.positive is None or supply.negative is None or supply.total is None:
        return None
    if supply.total <= 0:
        return None
    at_corner = worst and asked[1].span is not None
    if at_corner:
        sure = Range(_corner_limit(bounds[0], sure.low), _corner_limit(bounds[1], sure.high))
    return Scale(
        name=name,
        negative=supply.negative,
        positive=supply.positive,
        typical=_band(typical),
        sure=_band(sure),
        asked=asked[1] if at_corner else asked[0],
        worst=at_corner,
        practice=stage.family is None,
    )


def _band(reach: Range) -> Range:
    """Return a reach, or none where its ends leave nothing between them: no level is reached."""
    if reach.low is not None and reach.high is not None and reach.low > reach.high:
        return Range()
    return reach


def _corner_limit(bound: Bound, otherwise: float | None) -> float | None:
    """Return the limit that is guaranteed at the worst corner, where one was worked out."""
    pair = bound.stated or bound.default
    return pair.limit if pair is not None else otherwise


def draw(scale: Scale, width: int, *, ascii_only: bool = False) -> tuple[Line, Line, Line]:
    """Draw a scale in so many columns: the limits' values, the line, the demand's values."""
    ruler = _Ruler(scale, max(width, NARROWEST))
    marks = ASCII if ascii_only else UNICODE
    cells = [marks.glyphs[ruler.role(column)] for column in range(ruler.width)]
    roles = [ruler.role(column) for column in range(ruler.width)]
    point = ruler.point()
    if point is not None and roles[point] != "asked-beyond":
        cells[point] = marks.point
    if ruler.runs_off_left:
        cells[0] = marks.left
    if ruler.runs_off_right:
        cells[-1] = marks.right
    line = tuple((cell, role) for cell, role in zip(cells, roles, strict=True))
    return _limits_line(ruler), _joined(line), _asked_line(ruler)


def roles_of(line: Line) -> frozenset[Role]:
    """Return the roles a drawn line uses, for a legend of only those."""
    return frozenset(role for _, role in line)


def _joined(line: Line) -> Line:
    """Join neighbours of one role into one span, and leave blanks at the end away."""
    spans: list[Span] = []
    for text, role in line:
        if spans and spans[-1][1] == role:
            spans[-1] = (spans[-1][0] + text, role)
        else:
            spans.append((text, role))
    if spans and spans[-1][1] == "blank":
        spans.pop()
    return tuple(spans)


class _Ruler:
    """Where each voltage of a scale stands on a line, and what each column of it means."""

    def __init__(self, scale: Scale, width: int) -> None:
        self.scale = scale
        self.width = width
        self.left = ZONE
        self.right = width - 1 - ZONE
        low, high = scale.asked.low, scale.asked.high
        self.asked = None if low is None or high is None else (self.at(low), self.at(high))
        self.runs_off_left = self.asked is not None and self.asked[0] < 0
        self.runs_off_right = self.asked is not None and self.asked[1] >= width
        self.typical = (self._end(scale.typical.low), self._end(scale.typical.high))
        self.sure = (self._end(scale.sure.low), self._end(scale.sure.high))

    def at(self, volts: float) -> int:
        """Return the column of a voltage; beyond a rail it is never the rail's own column."""
        scale = self.scale
        share = (volts - scale.negative) / (scale.positive - scale.negative)
        # no column further out than this is ever drawn, and infinity has none
        share = min(max(share, -2.0), 3.0)
        column = self.left + round(share * (self.right - self.left))
        if _above(volts, scale.positive):
            return max(column, self.right + 1)
        if _above(scale.negative, volts):
            return min(column, self.left - 1)
        return min(max(column, self.left), self.right)

    def _end(self, volts: float | None) -> int | None:
        return None if volts is None else self.at(volts)

    def point(self) -> int | None:
        """Return the column of a demand that is a single value inside the line, else None."""
        if self.asked is None or self.asked[0] != self.asked[1]:
            return None
        return self.asked[0] if 0 <= self.asked[0] < self.width else None

    def role(self, column: int) -> Role:
        """Say what a column means."""
        asked = self._is_asked(column)
        if column in (self.left, self.right):
            return "rail" if self.point() != column else self._asked_role(column)
        if not self.left < column < self.right:
            return "asked-beyond" if asked else "blank"
        return self._asked_role(column) if asked else self._free_role(column)

    def _is_asked(self, column: int) -> bool:
        return self.asked is not None and self.asked[0] <= column <= self.asked[1]

    def _free_role(self, column: int) -> Role:
        if self._within(self.sure, column):
            return "sure"
        return "typical" if self._within(self.typical, column) else "out"

    def _asked_role(self, column: int) -> Role:
        scale = self.scale
        if scale.typical == Range() and scale.sure == Range():
            return "asked-unknown"
        if self._beyond(scale.typical, self.typical, column):
            return "asked-beyond"
        if self._within(self.sure, column) and not self._beyond(scale.sure, self.sure, column):
            return "asked-sure"
        return "asked-typical" if self._within(self.typical, column) else "asked-beyond"

    def _within(self, band: tuple[int | None, int | None], column: int) -> bool:
        low, high = band
        return low is not None and high is not None and low <= column <= high

    def _beyond(self, band: Range, columns: tuple[int | None, int | None], column: int) -> bool:
        """Tell whether a column is asked for past a limit that falls on the very same column."""
        low, high = self.scale.asked.low, self.scale.asked.high
        if self.asked is None or low is None or high is None:
            return False
        over = band.high is not None and column == columns[1] and _above(high, band.high)
        under = band.low is not None and column == columns[0] and _above(band.low, low)
        return (over and column == self.asked[1]) or (under and column == self.asked[0])


def _above(value: float, limit: float) -> bool:
    """Tell whether a value is above a limit by more than rounding."""
    return value > limit + 1e-9 * max(abs(value), abs(limit))


class _Labels:
    """Words placed on a line so that none covers another."""

    def __init__(self, width: int) -> None:
        self.width = width
        self.cells = [" "] * width

    def put(self, text: str, start: int) -> bool:
        """Place a text at a column, moved inside the line; False where it would touch another."""
        start = max(0, min(start, self.width - len(text)))
        around = self.cells[max(0, start - 1) : start + len(text) + 1]
        if len(text) > self.width or any(cell != " " for cell in around):
            return False
        self.cells[start : start + len(text)] = text
        return True

    def line(self) -> Line:
        return (("".join(self.cells).rstrip(), "text"),)


def _limits_line(ruler: _Ruler) -> Line:
    """Write the rails' values at the ends, and inside them the limits that matter."""
    scale = ruler.scale
    low, high = limit_words(scale, upper=False), limit_words(scale, upper=True)
    if not low and not high:
        words = "reach not known"
        labels = _rails(ruler)
        labels.put(words, (ruler.left + ruler.right - len(words)) // 2)
        return labels.line()
    for shorter in (0, -1):  # with their kinds, and where both do not fit so, without
        labels = _rails(ruler)
        placed = [
            not words or _put_limit(labels, ruler, words[shorter], upper=upper)
            for words, upper in ((low, False), (high, True))
        ]
        if all(placed):
            break
    return labels.line()


def _rails(ruler: _Ruler) -> _Labels:
    labels, scale = _Labels(ruler.width), ruler.scale
    negative, positive = si(scale.negative, "V"), si(scale.positive, "V")
    labels.put(negative, ruler.left - len(negative) + 1)
    labels.put(positive, ruler.right)
    return labels


def _put_limit(labels: _Labels, ruler: _Ruler, words: str, *, upper: bool) -> bool:
    """Write a limit inside the rails, at its column; False where it does not fit."""
    edge = shown_limit(ruler.scale, upper=upper)
    if edge is None:
        return False
    if upper:
        return labels.put(words, min(ruler.at(edge), ruler.right - 2) - len(words) + 1)
    return labels.put(words, max(ruler.at(edge), ruler.left + 2))


def shown_limit(scale: Scale, *, upper: bool) -> float | None:
    """Return the limit of one side that `limit_words` writes, volts."""
    words = limit_words(scale, upper=upper)
    band = scale.sure if words and "guaranteed" in words[0] else scale.typical
    return band.high if upper else band.low


def limit_words(scale: Scale, *, upper: bool) -> tuple[str, ...]:
    """Return the limit of one side that matters, with its kind and, for narrow lines, without."""
    typical = scale.typical.high if upper else scale.typical.low
    sure = scale.sure.high if upper else scale.sure.low
    asked = scale.asked.high if upper else scale.asked.low
    if sure is not None and (typical is None or _between(asked, sure, typical, upper=upper)):
        return (f"{si(sure, 'V')} guaranteed", si(sure, "V"))
    if typical is None:
        return ()
    kind = "by practice" if scale.practice else "typical"
    return (f"{si(typical, 'V')} {kind}", si(typical, "V"))


def _between(asked: float | None, sure: float, typical: float, *, upper: bool) -> bool:
    """Tell whether a demand is past the guaranteed limit and within the typical one."""
    if asked is None:
        return False
    if upper:
        return _above(asked, sure) and not _above(asked, typical)
    return _above(sure, asked) and not _above(typical, asked)


def asked_volts(value: float, scale: Scale) -> str:
    """Write a demand; what is nothing beside the supply is the solver's rounding, and is zero."""
    return si(0.0 if abs(value) < _NOTHING * (scale.positive - scale.negative) else value, "V")


_NOTHING = 1e-9


def _asked_line(ruler: _Ruler) -> Line:
    """Write the demand's values under its marks."""
    labels, asked = _Labels(ruler.width), ruler.scale.asked
    if ruler.asked is None or asked.low is None or asked.high is None:
        return ()
    first, last = ruler.asked
    low, high = asked_volts(asked.low, ruler.scale), asked_volts(asked.high, ruler.scale)
    kind = " at worst" if ruler.scale.worst else ""
    if low == high:
        labels.put(low + kind, first - len(low) // 2)
    elif last - first > len(low) + len(high) + len(kind) + 1:
        labels.put(low + kind, first)
        labels.put(high, last - len(high) + 1)
    else:
        both = f"{low} to {high}{kind}"
        labels.put(both, (first + last - len(both)) // 2)
    return labels.line()
