"""What a name in a netlist stands for.

A name is an order code with a maker's prefix and suffixes of grade, temperature, package and reel
behind the base a family lists: `TL072CP`, `MCP6002-I/SN`, `LMC6032/NS`. The longest base that
begins the name wins, and no digit may follow it (LM358 is not the LM3580).
"""

import difflib
import re
from collections.abc import Iterator
from itertools import product

import msgspec

from railguard.devices.model import Sort
from railguard.devices.others import sort_of


class Names(msgspec.Struct):
    """Every base name.

    bases  upper case -> (family, channels); the family is "" for an op-amp without figures
    also   base -> other families that list it too
    """

    bases: dict[str, tuple[str, int | None]] = {}
    also: dict[str, list[str]] = {}


class Found(msgspec.Struct, frozen=True):
    """The outcome for one name; the fields are those of `model.Match`."""

    sort: Sort
    family: str = ""
    channels: int | None = None
    also: tuple[str, ...] = ()
    nearest: str = ""


_GENERIC = re.compile(
    r"^(?:[A-Z0-9]+[_\-.])*[A-Z]{0,12}(?:OP[_\-.]?AMP|OPERATIONAL[_\-]?AMP|AMPOP)"
    r"|^(?:IDEAL[_\-]?(?:OA|OP|AMP)|OA|UNIVERSAL[_\-]?OP)(?:[_\-.]?\d*)$"
)
"""An amplifier without a type."""

_STAGE_WORDS = re.compile(
    r"STAGE|FILTER|PREAMP|PRE_AMP|BOARD|MODULE|CIRCUIT|CHANNEL|INTEGRATOR|BRIDGE|RECEIVER|SUMMER|"
    r"FOLLOWER|SHIFTER|LOWPASS|HIGHPASS|BANDPASS|FRONT_?END|SECTION|SUPPLY|OSCILLATOR"
)
"""Words that make a subcircuit a sheet of the schematic, whatever device it is named after."""

_SEPARATED = re.compile(r"^([A-Z]{1,4})[ _\-](?=\d)")
_TOKENS = re.compile(r"[/|,;:_()\[\]]+")


def identify(name: str, names: Names, *, suggest: bool = True) -> Found:
    """Say what a name stands for: an op-amp of the catalogue, another device, or nothing known.

    suggest  False leaves out the name that is one slip away: to find it all names are compared
    """
    code = normalised(name)
    if not code or (_STAGE_WORDS.search(code) and code not in names.bases):
        return Found(sort="unknown")
    tokens = [code, *(token for token in _TOKENS.split(code) if len(token) > 3)]
    for token in tokens:
        if found := _op_amp(token, names):
            return found
    if _GENERIC.match(code):
        return Found(sort="generic", channels=1)
    if code.isdigit() and (found := _bare_number(code, names)):
        return found
    for token in tokens:
        if other := sort_of(token):
            return Found(sort=other)
    if found := _by_series(code):
        return found
    return Found(sort="unknown", nearest=_nearest(code, names) if suggest else "")


def normalised(name: str) -> str:
    """Return the order code: upper case, without quotes and what follows the first blank.

    `OP-07` and `OP_07` become OP07; a Greek mu, as in µA741, is a U.
    """
    words = name.strip().strip("\"'`").split()
    if not words:
        return ""
    code = words[0].replace("µ", "u").replace("μ", "u").upper().strip("\"'`")
    return _SEPARATED.sub(r"\1", code)


def spell_out(base: str) -> Iterator[str]:
    """Yield every name a base with character sets stands for: `TL07[124]` gives three.

    Only sets are known, not ranges or other signs of regular expressions.
    """
    pieces = re.split(r"\[([^\[\]]+)\]", base.upper())
    for letters in product(*pieces[1::2]):
        spelled = pieces[0]
        for letter, rest in zip(letters, pieces[2::2], strict=True):
            spelled += letter + rest
        yield spelled


def _base_of(code: str, names: Names) -> str:
    """Return the longest base that begins the code and has no digit behind it, or ""."""
    for end in range(len(code), 2, -1):
        if code[:end] in names.bases and not code[end : end + 1].isdigit():
            return code[:end]
    return ""


def _op_amp(code: str, names: Names) -> Found | None:
    base = _base_of(code, names)
    if not base:
        return None
    family, channels = names.bases[base]
    also = list(names.also.get(base, ()))
    for token in _TOKENS.split(code)[1:]:
        if token[:1].isalpha() and (second := _base_of(token, names)):
            also.append(names.bases[second][0] or second)
    return Found(
        sort="op-amp",
        family=family,
        channels=channels,
        also=tuple(dict.fromkeys(entry for entry in also if entry != family)),
    )


def _bare_number(code: str, names: Names) -> Found | None:
    """Look for a code without its letters: `4558`, and `358`, which several families share."""
    hits: dict[str, int | None] = {}
    for base, (family, channels) in names.bases.items():
        letters = base.rstrip("0123456789")
        if family and base[len(letters) :] == code:
            hits.setdefault(family, channels)
    if len(code) < 3 or not hits:
        return None
    first = next(iter(hits))
    if len(hits) == 1:
        return Found(sort="op-amp", family=first, channels=hits[first])
    return Found(sort="op-amp", channels=hits[first], also=tuple(hits))


def _by_series(code: str) -> Found | None:
    """Know an op-amp without figures by its number series: OPA2xxx is a dual, OPA4xxx a quad."""
    opa = re.match(r"OPA([234])?(\d{3})(?!\d)", code)
    if opa:
        return Found(sort="op-amp", channels=int(opa[1] or 1))
    return None


def _nearest(code: str, names: Names) -> str:
    """Return the catalogue name one slip away, where the code looks like an order code."""
    if not re.match(r"[A-Z]{1,4}\d", code):
        return ""
    likely = [
        base
        for base, (family, channels) in names.bases.items()
        if family and channels and base[0] == code[0] and abs(len(base) - len(code)) <= 3
    ]
    close = difflib.get_close_matches(code, likely, n=1, cutoff=0.75)
    return close[0] if close else ""
