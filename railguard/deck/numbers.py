"""SPICE numbers: a decimal, an exponent, a scale suffix, and letters that mean nothing.

Where SPICE reads a number otherwise than its author most likely meant, both readings are kept.

Source  Berkeley SPICE3 user's manual, circuit description; IEC 60062:2016 for values such as 4k7
"""

import math
import re
from functools import lru_cache

import msgspec

SCALES: dict[str, float] = {
    "t": 1e12,
    "g": 1e9,
    "meg": 1e6,
    "k": 1e3,
    "mil": 25.4e-6,
    "m": 1e-3,
    "u": 1e-6,
    "µ": 1e-6,
    "n": 1e-9,
    "p": 1e-12,
    "f": 1e-15,
}
"""Scale suffixes every SPICE knows; the longest that fits is taken."""

GREEK_MU = "μ"
_NUMBER = re.compile(
    r"^(?P<sign>[+-]?)(?P<digits>\d+\.?\d*|\.\d+)(?:[eE](?P<exponent>[+-]?\d+))?(?P<tail>[^\d\s].*)?$"
)
_CODED = re.compile(
    r"^(?P<whole>\d*)(?P<mark>[RrKkMmGgLTtpPnNuUµμfF])(?P<part>\d{1,3})(?P<unit>[A-Za-zΩΩ]*)$"
)
_D_EXPONENT = re.compile(r"^([+-]?\d+\.?\d*|\.\d+)[dD]([+-]?\d+)(.*)$")
_TAIL = re.compile(r"^[A-Za-zµμΩΩ°]*$")
_CODES = {
    "R": 1.0, "r": 1.0, "K": 1e3, "k": 1e3, "G": 1e9, "g": 1e9, "T": 1e12, "t": 1e12,
    "p": 1e-12, "P": 1e-12, "n": 1e-9, "N": 1e-9, "u": 1e-6, "U": 1e-6, "µ": 1e-6, "μ": 1e-6,
    "L": 1e-3, "m": 1e-3, "M": 1e6, "f": 1e-15, "F": 1.0,
}  # fmt: skip


class Number(msgspec.Struct, frozen=True, gc=False):
    """A number as read.

    value   what its author most likely meant, SI
    spice   what SPICE takes it for
    trap    what the difference comes from, or ""
    """

    value: float
    spice: float
    trap: str = ""


@lru_cache(maxsize=16384)
def read_number(text: str, letter: str = "") -> Number | None:
    """Read one number; None where the text is none, or is beyond what a computer holds.

    letter  the element it is the value of: R, C, L, V or I; decides what `1M` or `1F` means
    """
    number = _read(text, letter)
    return number if number is not None and math.isfinite(number.value) else None


def _read(text: str, letter: str) -> Number | None:
    found = _NUMBER.match(text)
    if found is None:
        return _coded(text, letter)
    tail = found["tail"] or ""
    if tail and tail[0] in "dD":
        old = _D_EXPONENT.match(text)
        if old is not None and _TAIL.match(old[3]):
            value = float(f"{old[1]}e{old[2]}") * _scale(old[3])[0]
            return Number(value, value, "a D exponent")
    if tail and not _TAIL.match(tail):
        return _coded(text, letter)
    base = float(f"{found['sign']}{found['digits']}e{found['exponent'] or 0}")
    factor, rest = _scale(tail)
    return _trapped(base, factor, tail, rest, letter)


@lru_cache(maxsize=16384)
def plain_number(text: str, letter: str) -> float | None:
    """Return the value of a number that has one reading; None of any other."""
    number = read_number(text, letter)
    return number.value if number is not None and not number.trap else None


def _scale(tail: str) -> tuple[float, str]:
    """Return the factor of a tail, and what is left of it."""
    low = tail.lower()
    for length in (3, 1):
        factor = SCALES.get(low[:length])
        if factor is not None and len(low) >= length:
            return factor, tail[length:]
    return 1.0, tail


def _trapped(base: float, factor: float, tail: str, rest: str, letter: str) -> Number:
    spice = base * factor
    if tail[:1] == GREEK_MU:
        return Number(base * 1e-6, base, "a Greek mu")
    if letter == "R" and tail[:1] == "M" and tail[:3].lower() not in ("meg", "mil"):
        return Number(base * 1e6, spice, "M is milli to SPICE")
    if (
        letter == "C"
        and tail[:1] in "fF"
        and (not rest or rest.lower().startswith("arad"))
        and tail
    ):
        return Number(base, spice, "F is femto to SPICE")
    if tail.lower() == "x":
        return Number(base * 1e6, base, "X is mega to some SPICE programs only")
    return Number(spice, spice)


def _coded(text: str, letter: str) -> Number | None:
    """Read an IEC 60062 value such as 4k7, R47 or 4n7."""
    found = _CODED.match(text)
    if found is None or (not found["whole"] and found["mark"] not in "Rr"):
        return None
    mark = found["mark"]
    if letter not in ("C", "L") and mark in "pPnNuUµμ":
        return None  # 1N914 is a diode
    factor = _CODES[mark]
    if letter == "C" and mark in "mM":
        factor = 1e-3
    value = float(f"{found['whole'] or 0}.{found['part']}") * factor
    whole = float(found["whole"] or 0)
    spice = whole * (1.0 if mark in "Rr" else _scale(mark)[0])
    return Number(value, spice, "the digits behind the letter are dropped by some SPICE programs")
