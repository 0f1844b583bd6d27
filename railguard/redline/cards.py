"""Words of a card in its file, and values written as the card writes them."""

import math
import re

import msgspec

from railguard.deck.lines import Line
from railguard.deck.numbers import read_number
from railguard.redline.model import Edit

_WORD = re.compile(r"[^\s(),={}'\"]+")
_NUMBER = re.compile(r"^([+-]?(?:\d+(?:\.\d*)?|\.\d+)(?:[eE][+-]?\d+)?)([A-Za-zµμΩΩ]*)$")
_CODED = re.compile(r"^\d*[RrKkMmLpPnNuUµμ]\d+[A-Za-zΩΩ]*$")
_SCALES = (
    (1e12, "T"), (1e9, "G"), (1e6, "meg"), (1e3, "k"), (1.0, ""), (1e-3, "m"), (1e-6, "u"),
    (1e-9, "n"), (1e-12, "p"), (1e-15, "f"),
)  # fmt: skip
_KEPT_UNITS = ("ohm", "ohms", "f", "farad", "h", "ω", "v", "hz")


class Word(msgspec.Struct, frozen=True):
    """A word of a logical line: its text and where it begins in the joined line."""

    text: str
    at: int


def words_of(line: Line) -> tuple[Word, ...]:
    """Return a card's words; brackets, commas, quotes and equal signs part them."""
    return tuple(Word(m[0], m.start()) for m in _WORD.finditer(line.text))


def lines_of(line: Line) -> tuple[int, ...]:
    """Return the physical lines a card stands on."""
    return (line.number, *(number for _, number, _ in line.pieces))


def replaced(line: Line, word: Word, text: str) -> Edit:
    """Replace one word of a card; columns behind it stay where blanks allow."""
    place = line.at(word.at, len(word.text))
    length, new = len(word.text), text
    end = next((at - 1 for at, _, _ in line.pieces if at > word.at), len(line.text))
    behind = line.text[word.at + length : end]
    blanks = len(behind) - len(behind.lstrip(" "))
    if blanks >= 2 and behind.strip():
        longer = len(new) - length
        if longer < 0:
            new += " " * -longer
        else:
            length += min(longer, blanks - 1)
    return Edit(place.file, place.line, place.column, length, new)


def spelled(value: float, like: str = "", letter: str = "") -> str:
    """Write a value as SPICE reads it, in the manner of the word it replaces.

    like    the word replaced: its case, its unit and the RKM form (4k7) are kept where they are
            read the same by every program
    letter  R, C or L: what the value is of
    """
    exponent = math.floor(math.log10(abs(value)) + 1e-12) if value else 0
    scales = _SCALES[:-1] if letter == "C" else _SCALES  # 100f is a hundred farads to its author
    scale, suffix = next((x for x in scales if abs(value) >= x[0] * (1 - 1e-9)), scales[-1])
    digits = 4 if abs(exponent) <= 15 else 3
    mantissa = f"{value / scale:.{digits}g}"
    if "e" in mantissa:
        mantissa = f"{value / scale:.0f}"
    found = _NUMBER.match(like)
    tail = found[2] if found else ""
    if tail.isupper() or (tail[:1].isupper() and suffix not in ("meg", "m")):
        suffix = suffix.upper() if suffix != "m" else suffix
    if _CODED.match(like) and suffix in ("", "k", "K", "u", "n", "p") and "." in mantissa:
        whole, part = mantissa.split(".")
        coded = f"{whole}{suffix or 'R'}{part}"
        found_coded = read_number(coded, letter)
        if found_coded is not None and math.isclose(found_coded.value, value, rel_tol=1e-6):
            return coded
    written = f"{mantissa}{suffix}{_unit_of(tail)}"
    number = read_number(written, letter)
    if number is not None and not number.trap and math.isclose(number.spice, value, rel_tol=1e-3):
        return written
    return f"{mantissa}{suffix}"  # 1F is a femtofarad to SPICE


def _unit_of(tail: str) -> str:
    """Return the unit written behind a scale suffix: `F` of `nF`, `ohm` of `kohm`."""
    low = tail.casefold()
    for prefix in ("meg", "t", "g", "k", "m", "u", "µ", "μ", "n", "p", "f", ""):
        if low.startswith(prefix) and low[len(prefix) :] in _KEPT_UNITS:
            return tail[len(prefix) :]
    return ""


def aligned(words: list[str], like: Line | None) -> str:
    """Write a new card in the columns of a neighbour; single blanks where that has none."""
    if like is None or like.pieces:
        return " ".join(words)
    columns = [m.start() for m in re.finditer(r"\S+", like.text)]
    if all(b == 1 for b in _gaps(like.text)):
        return " ".join(words)
    text = " " * (like.column - 1)
    start = len(text)
    for index, word in enumerate(words):
        if index:
            text += " "
        if index < len(columns):
            text = text.ljust(start + columns[index])
        text += word
    return text


def _gaps(text: str) -> list[int]:
    return [len(m[0]) for m in re.finditer(r"(?<=\S) +(?=\S)", text)] or [1]
