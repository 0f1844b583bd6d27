"""Quantities as people write and read them, and the values that can be bought.

`si` and `percent` print a number for a report, `parse_quantity` reads one from a person's text,
`preferred` finds the nearest value of an IEC 60063 series.

Both directions are our own: the library for engineering notation costs some 45 ms at import, as
much as all the rest of a short run, and its reader takes a bare M without asking what it means.
"""

import math
import re
from functools import lru_cache
from typing import Literal

NOT_KNOWN = "not known"

_PREFIXES = {-15: "f", -12: "p", -9: "n", -6: "µ", -3: "m", 0: "", 3: "k", 6: "M", 9: "G", 12: "T"}

_WITHOUT_PREFIX = ("", "%", "°", "°C", "dB")
"""Units that no one writes with a prefix."""

_SLOW_SLEW = 1e4
"""V/s; from here on a slew rate is written in V/µs, as data sheets do."""


def si(value: float | None, unit: str, digits: int = 3) -> str:
    """Write a number in engineering notation: `4.7 kΩ`, `-180 mV`, `0 V`, `not known`.

    digits  significant digits kept; trailing zeros are dropped
    """
    if value is None or math.isnan(value):
        return NOT_KNOWN
    if math.isinf(value):
        return "infinite" if value > 0 else "-infinite"
    if unit == "V/s" and abs(value) >= _SLOW_SLEW:
        return f"{_plain(value / 1e6, digits)} V/µs"
    if unit in _WITHOUT_PREFIX:
        gap = "" if unit in ("", "°") else " "
        return f"{_plain(value, digits)}{gap}{unit}"
    mantissa, exponent = _rounded(value, digits)
    step = 3 * (exponent // 3)
    if step not in _PREFIXES:
        return f"{value:.{digits - 1}e} {unit}"
    return f"{_plain(mantissa * 10 ** (exponent - step), digits)} {_PREFIXES[step]}{unit}"


def percent(share: float | None) -> str:
    """Write a share as a percentage: 0.05 is `5 %`, 0.0123 is `1.2 %`, 1.234 is `123 %`."""
    if share is None or math.isnan(share):
        return NOT_KNOWN
    if math.isinf(share):
        return "infinite" if share > 0 else "-infinite"
    hundredths = share * 100
    whole = abs(hundredths) >= 10
    return f"{round(hundredths) if whole else _plain(hundredths, 2)} %"


def _rounded(value: float, digits: int) -> tuple[float, int]:
    """Split into mantissa and power of ten after rounding, so that 999.96 is 1.00e3."""
    mantissa, exponent = f"{value:.{digits - 1}e}".split("e")
    return float(mantissa), int(exponent)


def _plain(value: float, digits: int) -> str:
    """Write with so many significant digits, never with an exponent, no trailing zeros."""
    _, exponent = _rounded(value, digits)
    text = f"{round(value, digits - 1 - exponent):.{max(digits - 1 - exponent, 0)}f}"
    if "." in text:
        text = text.rstrip("0").rstrip(".")
    return "0" if text == "-0" else text


class QuantityError(ValueError):
    """A text that is not the quantity asked for; its words are a sentence for the user."""


_POWERS = {
    "T": 12,
    "G": 9,
    "mega": 6,
    "meg": 6,
    "k": 3,
    "m": -3,
    "u": -6,
    "µ": -6,
    "μ": -6,
    "n": -9,
    "p": -12,
    "f": -15,
}
"""Power of ten by prefix, the longest first where one begins another."""

_EITHER_CASE = ("mega", "meg", "k", "u", "n", "p")
"""Prefixes a person may write large or small without meaning something else by it."""

_UNITS = {
    "V": ("v", "volt", "volts"),
    "A": ("a", "amp", "amps", "ampere", "amperes"),
    "Ω": ("ω", "ohm", "ohms", "r"),
    "F": ("f", "farad", "farads"),
    "H": ("h", "henry", "henries"),
    "Hz": ("hz", "hertz"),
    "W": ("w", "watt", "watts"),
    "s": ("s", "sec", "second", "seconds"),
    "°C": ("°c", "℃", "c", "degc"),
    "°": ("°", "deg", "degrees"),
    "%": ("%",),
    "dB": ("db",),
}
"""Spellings by unit, all in lower case (the ohm sign and the capital omega fold to one)."""

_EXAMPLES = {
    "V": "12, 12 V or 50 mV",
    "A": "0.02, 20 mA or 20m",
    "Ω": "4700, 4.7k or 4k7",
    "F": "1e-9, 1 nF or 1n",
    "H": "1e-3, 1 mH or 1m",
    "Hz": "200, 200 Hz or 1.5 kHz",
    "s": "0.01, 10 ms or 10m",
    "°C": "60 or 60 °C",
    "%": "5 % or 0.05",
}

_NUMBER = re.compile(
    r"([+-]?)([0-9]+(?:\.[0-9]*)?|\.[0-9]+)(?:[eE]([+-]?[0-9]{1,4}))?(.*)", re.DOTALL
)
_RKM_TAIL = re.compile(r"([A-Za-zµμΩ])([0-9]+)(\D*)")
_RKM_BELOW_ONE = re.compile(r"[Rr]([0-9]+)")
_DECIMAL_COMMA = re.compile(r"[0-9],[0-9]")
_LONGEST = 40
"""Characters; a longer text is no quantity, whatever it holds."""


def canonical_unit(unit: str) -> str:
    """Return the one spelling of a unit used here: `ohms` is `Ω`; an unknown one is returned."""
    folded = unit.casefold()
    return next((name for name, spellings in _UNITS.items() if folded in spellings), unit)


def parse_quantity(text: str, unit: str, *, spice: bool = False) -> float:
    """Read a quantity in SI: `4k7`, `4.7k`, `5 %`, `100nF`, `10 mA`, `1 MEG`, plain numbers.

    unit   the unit wanted (`V`, `Ω`, ...); "" a bare number; "%" a share: `5 %` is 0.05
    spice  read M as SPICE does (milli, whatever its case), and prefixes in either case

    Raises QuantityError: no number, another unit, or a letter with two meanings.
    """
    value, found = split_quantity(text, unit, spice=spice)
    wanted = canonical_unit(unit)
    share = wanted in ("", "%") and found == "%"
    if found and found != wanted and not share:
        noun = f"{wanted} is wanted" if wanted else "a number without a unit is wanted"
        raise QuantityError(f'"{text}" is in {found}, and {noun} here.')
    return value


def split_quantity(text: str, unit: str | None = None, *, spice: bool = False) -> tuple[float, str]:
    """Read a quantity and the unit written with it, "" where none is; `5 %` gives 0.05 and "%".

    unit  the unit expected, which settles letters that are both prefix and unit; None: any
    """
    wanted = None if unit is None else canonical_unit(unit)
    sign, whole, power, tail = _number_and_tail(text, wanted)
    readings = _readings(text, tail, wanted, spice)
    if not readings:
        raise _unreadable(text, wanted)
    if len({factor for factor, _ in readings}) > 1:
        raise QuantityError(
            f'"{text}" leaves open whether F is farad or femto: write a plain number.'
        )
    factor, found = next((r for r in readings if r[1] in ("", wanted)), readings[0])
    # one decimal text converted once is correctly rounded: 100 n is 1e-7, not a neighbour of it
    value = float(f"{sign}{whole}e{power + factor}")
    if math.isinf(value):
        raise _unreadable(text, wanted)
    return value, found


def _unreadable(text: str, wanted: str | None) -> QuantityError:
    shown = text if len(text) <= _LONGEST else text[:_LONGEST] + "..."
    example = _EXAMPLES.get(wanted or "", "0.5, 4.7k or 10m")
    return QuantityError(f'"{shown}" is no number that can be read here: write {example}.')


def _number_and_tail(text: str, wanted: str | None) -> tuple[str, str, int, str]:
    """Split into sign, digits, power of ten and the letters behind, RKM code resolved."""
    packed = "".join(text.split()).replace("\N{MINUS SIGN}", "-")
    if len(packed) > _LONGEST:
        raise _unreadable(text, wanted)
    if _DECIMAL_COMMA.search(packed):
        raise QuantityError(f'"{text}" has a comma: write the decimal point as a point.')
    if (below_one := _RKM_BELOW_ONE.fullmatch(packed)) and wanted in ("Ω", None):
        return "", f"0.{below_one[1]}", 0, "R"
    match = _NUMBER.fullmatch(packed)
    if match is None:
        raise _unreadable(text, wanted)
    sign, digits, power, tail = match.groups()
    code = _RKM_TAIL.fullmatch(tail)
    if code is not None and digits.isdigit() and power is None:
        return sign, f"{digits}.{code[2]}", 0, code[1] + code[3]
    return sign, digits, int(power or 0), tail


def _readings(text: str, tail: str, wanted: str | None, spice: bool) -> list[tuple[int, str]]:
    """List what the letters behind a number can mean: (power of ten, unit), unit "" where none."""
    found: list[tuple[int, str]] = []
    if not tail:
        return [(0, "")]
    if (unit := canonical_unit(tail)) in _UNITS:
        found.append((-2 if unit == "%" else 0, unit))
    for prefix, power in _POWERS.items():
        head, rest = tail[: len(prefix)], tail[len(prefix) :]
        either = spice or prefix in _EITHER_CASE
        if head != prefix and not (either and head.casefold() == prefix.casefold()):
            continue
        behind = canonical_unit(rest) if rest else ""
        if behind and (behind not in _UNITS or behind == "%"):
            continue
        if spice and head == "M":
            _refuse_spice_m(text, behind or wanted)
        found.append((power, behind))
        if power == 6:
            # "mega" is not "meg" and an ampere, nor "m" and something
            break
    if not spice and tail[0] == "M" and not found:
        found += _capital_m(text, tail[1:])
    return found


def _refuse_spice_m(text: str, unit: str | None) -> None:
    """Refuse a SPICE M where a thousandth is surely not meant."""
    if unit in ("Ω", "Hz"):
        raise QuantityError(
            f'"{text}" is a thousandth in SPICE notation, where M is milli: '
            "write MEG for mega, or a small m."
        )


def _capital_m(text: str, rest: str) -> list[tuple[int, str]]:
    """Read a capital M outside SPICE notation: mega before ohm and hertz, refused elsewhere."""
    unit = canonical_unit(rest) if rest else ""
    if unit in ("Ω", "Hz"):
        return [(6, unit)]
    if rest and unit not in _UNITS:
        return []
    raise QuantityError(
        f'"{text}" leaves open whether M is mega or milli (SPICE takes it as milli): '
        "write MEG or m."
    )


Direction = Literal["nearest", "up", "down"]


def preferred(value: float, series: str = "E24", direction: Direction = "nearest") -> float:
    """Return the value of an IEC 60063 series nearest to one that was worked out.

    value      positive, in any unit
    direction  "up": the smallest not below; "down": the largest not above

    Raises ValueError: not a positive finite number, or no such series.
    Source  IEC 60063, through the `eseries` package.
    """
    # some 45 ms at import, and only a remedy needs it
    from eseries import eseries

    if not (math.isfinite(value) and value > 0):
        raise ValueError(f"There is no preferred value for {value}.")
    key = eseries.series_key_from_name(series)
    # a value that is itself in the series must come back as itself, whatever its last bit
    clean = float(f"{value:.9g}")
    find = {
        "nearest": eseries.find_nearest,
        "up": eseries.find_greater_than_or_equal,
        "down": eseries.find_less_than_or_equal,
    }[direction]
    return float(f"{find(key, clean):.3g}")


_SERIES_BY_TOLERANCE = (
    (0.20, "E6"),
    (0.10, "E12"),
    (0.05, "E24"),
    (0.02, "E48"),
    (0.01, "E96"),
    (0.0, "E192"),
)
"""IEC 60063: the tolerance each series was laid out for."""


def series_for(tolerance: float) -> str:
    """Return the IEC 60063 series for components of a tolerance (a share): 0.01 gives `E96`."""
    return next(name for least, name in _SERIES_BY_TOLERANCE if abs(tolerance) >= least)


@lru_cache(maxsize=4096)
def series_of(value: float) -> str | None:
    """Return the coarsest IEC 60063 series a value belongs to, or None where none has it."""
    # some 45 ms at import, and only a board's values are looked at
    from eseries import eseries

    if not (math.isfinite(value) and value > 0):
        return None
    digits = f"{value:.5e}".split("e")[0]
    for key in eseries.series_keys():
        if any(float(digits) == base / 10 ** (len(str(base)) - 1) for base in eseries.series(key)):
            return str(key.name)
    return None
