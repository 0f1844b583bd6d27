"""The words of a V or I card to a Source."""

import itertools
from collections.abc import Callable

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
_IGNORED = frozenset({"rser", "cpar", "portnum", "z0", "tripdv", "tripdt", "m", "temp", "value"})


class SourceError(Exception):
    """A source card with words that make no source."""


def read_source(items: Items, number: Callable[[str], float | None]) -> tuple[Source, str]:
    """Read a source from the items behind its nodes.

    number   gives a word's value, or None
    returns  the source, and a remark on what was passed over, or ""

    Raises  SourceError
    """
    dc: float | None = None
    ac: tuple[float, float] | None = None
    wave: Wave | None = None
    stated, remark = True, ""
    queue = list(items)
    while queue:
        item = queue.pop(0)
        if isinstance(item, str):
            word = item.lower()
            if word == "dc":
                if queue and isinstance(queue[0], str):
                    text = str(queue.pop(0))
                    dc = _need(number(text), text)
            elif word == "ac":
                ac = (_next(queue, number, 1.0), _next(queue, number, 0.0))
            elif word in FUNCTIONS:
                arguments = []
                while queue and (isinstance(queue[0], Group) or _is_number(queue[0], number)):
                    arguments.append(queue.pop(0))
                wave, note = _function(word, _numbers(tuple(arguments), number, word), None)
                remark = note or remark
            elif word in ("distof1", "distof2"):
                _next(queue, number, 0.0)
                _next(queue, number, 0.0)
            else:
                value = number(item)
                if value is None:
                    raise SourceError(f'"{item}" is no value of a source')
                dc = value if dc is None else dc
        elif isinstance(item, Assignment):
            if item.key == "dc" and isinstance(item.value, str):
                dc = _need(number(item.value), item.value)
            elif item.key == "ac" and isinstance(item.value, str):
                ac = (_need(number(item.value), item.value), 0.0)
            elif item.key == "value" and isinstance(item.value, str):
                dc = number(item.value)
                stated = dc is not None
            elif item.key not in _IGNORED:
                remark = f"{item.key}= is passed over"
        elif isinstance(item, Call):
            wave, note = _function(item.name, _numbers(item.items, number, item.name), item)
            remark = note or remark
        else:
            queue[:0] = list(item.items)
    return Source(dc, ac, wave, stated), remark


def _need(value: float | None, text: str) -> float:
    if value is None:
        raise SourceError(f'"{text}" is no number')
    return value


def _is_number(item: object, number: Callable[[str], float | None]) -> bool:
    return isinstance(item, str) and number(item) is not None


def _next(
    queue: "list[str | Assignment | Call | Group]",
    number: Callable[[str], float | None],
    default: float,
) -> float:
    item = queue[0] if queue else None
    value = number(item) if isinstance(item, str) else None
    if value is None:
        return default
    del queue[0]
    return value


def _numbers(items: Items, number: Callable[[str], float | None], name: str) -> list[float]:
    found: list[float] = []
    for item in items:
        if isinstance(item, Group):
            found += _numbers(item.items, number, name)
        elif isinstance(item, str):
            value = number(item.lstrip("+") if name == "pwl" else item)
            if value is None:
                raise SourceError(f'"{item}" is no number in {name.upper()}')
            found.append(value)
    return found


def _function(name: str, v: list[float], call: Call | None) -> tuple[Wave | None, str]:
    tail = {i.key: i.value for i in call.items if isinstance(i, Assignment)} if call else {}
    if name == "pwl" and "file" in tail:
        raise SourceError("its points stand in a file, which is not read")
    try:
        match name:
            case "sin" | "sine":
                return Sine(v[0], v[1], *v[2:6]), ""
            case "pulse":
                return Pulse(v[0], v[1], *v[2:7]), ""
            case "exp":
                return Exponential(v[0], v[1], *v[2:6]), ""
            case "sffm":
                return FrequencyModulated(v[0], v[1], *v[2:5]), ""
            case "am":
                return AmplitudeModulated(v[0], v[1], v[2], v[3], *v[4:5]), ""
            case "pwl":
                return _piecewise(v, "r" in tail), ""
            case _:
                return None, f"{name.upper()} is noise or data and is passed over"
    except (IndexError, TypeError):
        raise SourceError(f"{name.upper()} has too few values") from None


def _piecewise(v: list[float], repeats: bool) -> Piecewise:
    if len(v) % 2:
        raise SourceError("PWL has a time without a value")
    points = tuple(zip(v[::2], v[1::2], strict=True))
    if not points or any(b[0] < a[0] for a, b in itertools.pairwise(points)):
        raise SourceError("the times of PWL do not rise")
    return Piecewise(points, 0.0 if repeats else None)
