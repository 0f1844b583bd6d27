"""SPICE numbers: a decimal, an exponent, a scale suffix, and letters that mean nothing.

Where SPICE reads a number otherwise than its author most likely meant, both readings are kept.

Source  Berkeley SPICE3 user's manual, circuit description; IEC 60062:2016 for values such as 4k7
"""

import math
import re
from functools import lru_cache

import msgspec

POWERS: dict[str, int] = {
    "t": 12, "g": 9, "meg": 6, "k": 3, "m": -3, "u": -6, "µ": -6, "n": -9, "p": -12, "f": -15,
}  # fmt: skip
"""Powers of ten of the scale suffixes every SPICE knows; the longest that fits is taken."""
MIL = 25.4e-6
"""The suffix MIL: a thousandth of an inch, in metres."""

GREEK_MU = "μ"
_NUMBER = re.compile(
    r"^(?P<sign>[+-]?)(?P<digits>\d+(?:\.\d*)?|\.\d+)(?:[eE](?P<exponent>[+-]?\d{1,4}))?(?P<tail>[^\d\s].*)?$"
)
_LEADING = re.compile(
    r"^(?P<digits>[+-]?(?:\d+(?:\.\d*)?|\.\d+))(?:[eE](?P<exponent>[+-]?\d{1,4}))?(?P<tail>[A-Za-zµ]*)"
)
_CODED = re.compile(
    r"^(?P<whole>\d*)(?P<mark>[RrKkMmGgLTtpPnNuUµμfF])(?P<part>\d{1,3})(?P<unit>[A-Za-zΩΩ]*)$"
)
_D_EXPONENT = re.compile(r"^([+-]?\d+(?:\.\d*)?|\.\d+)[dD]([+-]?\d{1,4})(.*)$")
_TAIL = re.compile(r"^[A-Za-zµμΩΩ°]*$")
_CODES = {
    "R": 0, "r": 0, "K": 3, "k": 3, "G": 9, "g": 9, "T": 12, "t": 12, "p": -12, "P": -12, "n": -9,
    "N": -9, "u": -6, "U": -6, "µ": -6, "μ": -6, "L": -3, "m": -3, "M": 6, "f": -15, "F": 0,
}  # fmt: skip
"""Powers of ten of the letters that stand for a decimal point, IEC 60062."""


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
    digits, exponent = f"{found['sign']}{found['digits']}", int(found["exponent"] or 0)
    if tail in ("e", "E"):
        value = float(digits)
        return Number(value, value, "its exponent has no digits")
    if tail and tail[0] in "dD":
        old = _D_EXPONENT.match(text)
        if old is not None and _TAIL.match(old[3]):
            value = _scaled(old[1], int(old[2]), old[3])
            # ngspice ends the number before a sign, and takes what follows for the value.
            spice = float(old[2]) if old[2][0] in "+-" else value
            return Number(value, spice, "a D exponent, which not every program knows")
    if tail and not _TAIL.match(tail):
        return _coded(text, letter)
    return _trapped(digits, exponent, tail, letter)


@lru_cache(maxsize=16384)
def plain_number(text: str, letter: str) -> float | None:
    """Return the value of a number that has one reading; None of any other."""
    number = read_number(text, letter)
    return number.value if number is not None and not number.trap else None


def _scaled(digits: str, exponent: int, tail: str) -> float:
    """Return a number with its scale suffix; the letters behind it mean nothing.

    The suffix is taken into the exponent, so that 10u is the float nearest to 0.00001.
    """
    low = tail.lower()
    if low.startswith("mil"):
        return float(f"{digits}e{exponent}") * MIL
    for length in (3, 1):
        power = POWERS.get(low[:length])
        if power is not None and len(low) >= length:
            return float(f"{digits}e{exponent + power}")
    return float(f"{digits}e{exponent}")


def _trapped(digits: str, exponent: int, tail: str, letter: str) -> Number:
    spice = _scaled(digits, exponent, tail)
    base = float(f"{digits}e{exponent}")
    low = tail.lower()
    if tail[:1] == GREEK_MU:
        return Number(float(f"{digits}e{exponent - 6}"), base, "a Greek mu")
    if letter == "R" and tail[:1] == "M" and not low.startswith(("meg", "mil")):
        return Number(float(f"{digits}e{exponent + 6}"), spice, "M is milli to SPICE")
    # A small f alone was written by somebody who knows: the capacitances of a layout end in it.
    if letter == "C" and (tail == "F" or low.startswith("farad")):
        return Number(base, spice, "F is femto to SPICE")
    if low == "x":
        mega = float(f"{digits}e{exponent + 6}")
        return Number(mega, base, "X is mega to some SPICE programs only")
    return Number(spice, spice)


def _coded(text: str, letter: str) -> Number | None:
    """Read an IEC 60062 value such as 4k7, R47 or 4n7."""
    found = _CODED.match(text)
    if found is None or (not found["whole"] and found["mark"] not in "Rr"):
        return None
    mark = found["mark"]
    if letter not in ("C", "L") and mark in "pPnNuUµμ":
        return None  # 1N914 is a diode
    power = -3 if letter == "C" and mark in "mM" else _CODES[mark]
    value = float(f"{found['whole'] or 0}.{found['part']}e{power}")
    whole = found["whole"] or "0"
    spice = float(whole) if mark in "Rr" else _scaled(whole, 0, mark)
    return Number(value, spice, "the digits behind the letter are dropped by some SPICE programs")


def leading_number(text: str) -> float | None:
    """Return what a SPICE that stops at the first character it does not know makes of a text."""
    found = _LEADING.match(text)
    if found is None:
        return None
    return _scaled(found["digits"], int(found["exponent"] or 0), found["tail"])
