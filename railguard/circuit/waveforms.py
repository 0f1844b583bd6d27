"""The words of a V or I card to a Source."""

import itertools
from collections import deque
from collections.abc import Callable, Mapping

import msgspec

from railguard.circuit.sources import (
    AmplitudeModulated,
    Exponential,
    FrequencyModulated,
    Piecewise,
    Pulse,
    Sine,
    Source,
    Wave,
)
from railguard.deck.cards import Assignment, Call, Group, Items

FUNCTIONS = frozenset(
    {"sin", "sine", "pulse", "exp", "pwl", "sffm", "am", "trnoise", "trrandom", "pat"}
)
_PORT = frozenset({"portnum", "z0", "pwr", "freq", "phase"})
_IGNORED = frozenset({"rser", "cpar", "portnum", "z0", "tripdv", "tripdt", "m", "temp", "value"})


Item = str | Assignment | Call | Group
Number = Callable[[str], float | None]


class SourceError(Exception):
    """A source card with words that make no source."""


class Found(msgspec.Struct):
    """A source as far as it has been read.

    passed_over  what was left out, in words, or ""
    doubled      the two DC values of a card that states both, as written, or ""
    """

    dc: float | None = None
    ac: tuple[float, float] | None = None
    wave: Wave | None = None
    stated: bool = True
    passed_over: str = ""
    doubled: str = ""
    bare: str = ""
    keyed: str = ""

    def source(self) -> Source:
        """Return the source."""
        return Source(self.dc, self.ac, self.wave, self.stated)


def read_source(items: Items, number: Number) -> Found:
    """Read a source from the items behind its nodes.

    number   gives a word's value, or None

    Raises  SourceError
    """
    found = Found()
    queue = deque(items)
    while queue:
        item = queue.popleft()
        if isinstance(item, str):
            _word(found, item, queue, number)
        elif isinstance(item, Assignment):
            _assignment(found, item, number)
        elif isinstance(item, Call):
            _function(found, item.name, item.items, number)
        else:
            queue.extendleft(reversed(item.items))
    if found.bare and found.keyed and found.bare.lower() != found.keyed.lower():
        found.doubled = f"{found.bare} and DC {found.keyed}"
    return found


def _word(found: Found, item: str, queue: deque[Item], number: Number) -> None:
    word = item.lower()
    if word == "dc":
        if queue and isinstance(queue[0], str) and number(queue[0]) is None:
            if queue[0].lower() in FUNCTIONS or queue[0].lower() == "ac":
                return  # DC with its value left out
            raise SourceError(f'"{queue[0]}" is no number')
        if queue and isinstance(queue[0], str):
            _dc(found, str(queue.popleft()), number)
    elif word == "ac":
        found.ac = (_next(queue, number, 1.0), _next(queue, number, 0.0))
    elif word in FUNCTIONS:
        arguments: list[Item] = []
        while queue and (
            isinstance(queue[0], Group | Call)
            or _is_number(queue[0], number)
            or (word == "pwl" and _is_of_pwl(queue[0]))
        ):
            arguments.append(queue.popleft())
        _function(found, word, tuple(arguments), number)
    elif word in _PORT:
        _next(queue, number, 0.0)  # what a network analysis wants of a source
    elif word in ("distof1", "distof2"):
        _next(queue, number, 0.0)
        _next(queue, number, 0.0)
    else:
        value = number(item)
        if value is None:
            raise SourceError(f'"{item}" is no value of a source')
        if not found.bare:
            found.bare, found.dc = item, value  # it stands over DC=, as in ngspice


def _assignment(found: Found, item: Assignment, number: Number) -> None:
    text = item.value if isinstance(item.value, str) else ""
    if item.key == "dc" and text:
        _dc(found, text, number)
    elif item.key == "ac" and text:
        found.ac = (_need(number(text), text), 0.0)
    elif item.key == "value" and text:
        found.dc = number(text)
        found.stated = found.dc is not None
    elif item.key in _FILES:
        raise SourceError(_IN_A_FILE)
    elif item.key in ("r", "td") and isinstance(found.wave, Piecewise):
        found.wave = _timed(found.wave, {item.key: text}, number)
    elif item.key not in _IGNORED:
        found.passed_over = f"{item.key}= is passed over"


def _dc(found: Found, text: str, number: Number) -> None:
    value = _need(number(text), text)
    found.keyed = text
    found.dc = found.dc if found.bare else value


def _need(value: float | None, text: str) -> float:
    if value is None:
        raise SourceError(f'"{text}" is no number')
    return value


def _is_number(item: Item, number: Number) -> bool:
    return isinstance(item, str) and number(item) is not None


def _next(
    queue: deque[Item],
    number: Number,
    default: float,
) -> float:
    item = queue[0] if queue else None
    value = number(item) if isinstance(item, str) else None
    if value is None:
        return default
    queue.popleft()
    return value


def _numbers(items: Items, number: Number, name: str) -> list[float]:
    found: list[float] = []
    for item in items:
        if isinstance(item, Group):
            found += _numbers(item.items, number, name)
        elif isinstance(item, str):
            value = number(item)
            if value is None:
                raise SourceError(f'"{item}" is no number in {name.upper()}')
            found.append(value)
    return found


def _function(found: Found, name: str, items: Items, number: Number) -> None:
    try:
        if name == "pwl":
            found.wave = _piecewise(items, number)
            return
        if name not in FUNCTIONS:
            raise SourceError(f"{name.upper()} is no time function")
        v = _numbers(items, number, name)
        match name:
            case "sin" | "sine":
                found.wave = Sine(v[0], v[1], *v[2:6])
            case "pulse":
                found.wave = Pulse(v[0], v[1], *v[2:7])
            case "exp":
                found.wave = Exponential(v[0], v[1], *v[2:6])
            case "sffm":
                found.wave = FrequencyModulated(v[0], v[1], *v[2:5])
            case "am":
                found.wave = AmplitudeModulated(v[0], v[1], v[2], v[3], *v[4:5])
            case _:
                found.passed_over = f"{name.upper()} is noise or data and is passed over"
    except (IndexError, TypeError):
        raise SourceError(f"{name.upper()} has too few values") from None


_FILES = frozenset({"file", "wavefile"})
_IN_A_FILE = "its points stand in a file, which is not read"
_SCALES = ("time_scale_factor", "value_scale_factor")
_OF_PWL = frozenset({"repeat", "for", "forever", "endrepeat", *_FILES})
MOST_POINTS = 100_000
"""Points of one PWL, repetitions written out."""


def _is_of_pwl(item: Item) -> bool:
    return (isinstance(item, Assignment) and item.key in (*_SCALES, "r", "td", *_FILES)) or (
        isinstance(item, str) and (item.lower() in _OF_PWL or item[0] in "+\"'")
    )


def _opened(items: Items) -> list[str]:
    """Return the words of a PWL in order, parentheses left out."""
    words: list[str] = []
    for item in items:
        if isinstance(item, str):
            words.append(item)
        elif isinstance(item, Call):
            words += [item.name, *_opened(item.items)]
        elif isinstance(item, Group):
            words += _opened(item.items)
    return words


def _piecewise(items: Items, number: Number) -> Piecewise:
    """Read PWL: points, relative times (+1u), REPEAT FOR n or FOREVER, R=, TD=, scale factors."""
    tail = {i.key: text for i in items if isinstance(i, Assignment) and (text := _text(i))}
    words = _opened(items)
    if tail.keys() & _FILES or any(word.lower() in _FILES for word in words):
        raise SourceError(_IN_A_FILE)
    points: list[tuple[float, float]] = []
    block: list[tuple[float, float]] | None = None
    repeat: float | None = None
    times, start = 1, 0.0
    queue = deque(words)
    while queue:
        word = queue.popleft().lower()
        if word == "repeat":
            block, start, times = [], points[-1][0] if points else 0.0, 1
            head = queue.popleft().lower() if queue else ""
            if head == "for" and queue:
                count = _need(number(queue.popleft()), "FOR")
                times = max(int(count), 1)
            elif head != "forever":
                raise SourceError("REPEAT is followed by FOR and a number, or by FOREVER")
            else:
                repeat = start
        elif word == "endrepeat":
            if block is None:
                raise SourceError("ENDREPEAT closes no REPEAT")
            points += _written_out(block, start, times)
            block = None
        else:
            into = points if block is None else block
            if not queue:
                raise SourceError("PWL has a time without a value")
            moment, value = _need(number(word.lstrip("+")), word), queue.popleft()
            if word.startswith("+") and into:
                moment += into[-1][0]
            into.append((moment, _need(number(value), value)))
    if block is not None:
        raise SourceError("a REPEAT of PWL is not closed by ENDREPEAT")
    if not points or any(b[0] < a[0] for a, b in itertools.pairwise(points)):
        raise SourceError("the times of PWL do not rise")
    stretch, gain = (_need(number(tail.get(key, "1")), key) for key in _SCALES)
    scaled = tuple((moment * stretch, value * gain) for moment, value in points)
    wave = Piecewise(scaled, None if repeat is None else repeat * stretch)
    return _timed(wave, tail, number)


def _text(item: Assignment) -> str:
    return item.value if isinstance(item.value, str) else ""


def _written_out(
    block: list[tuple[float, float]], start: float, times: int
) -> list[tuple[float, float]]:
    if not block or times * len(block) > MOST_POINTS:
        raise SourceError(f"a REPEAT of PWL holds no point or more than {MOST_POINTS:,}")
    length = block[-1][0]
    return [
        (start + turn * length + moment, value)
        for turn in range(times)
        for moment, value in block
        if turn == 0 or moment > 0.0
    ]


def _timed(wave: Piecewise, tail: Mapping[str, str], number: Number) -> Piecewise:
    """Take in `r=` (the time it starts over from; -1 for never) and `td=`."""
    again = number(tail["r"]) if "r" in tail else None
    later = number(tail["td"]) if "td" in tail else None
    repeat = wave.repeat if again is None else (again if again >= 0.0 else None)
    return Piecewise(wave.points, repeat, wave.delay if later is None else later)
