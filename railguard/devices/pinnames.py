"""What a pin's name says of its role: `in+`, `VCC`, `non-inverting input`, `1OUT`, `99`."""

import re
from collections import Counter
from collections.abc import Sequence

from railguard.devices.model import Channel, Role

_NAMES: tuple[tuple[Role, str], ...] = (
    (
        "in+",
        "+ IN+ +IN INP IP INPP VIN+ VINP VIP INPUT+ NONINV NINV NON NI INPLUS PLUS INPOS +INPUT",
    ),
    ("in-", "- IN- -IN INN INM IM VIN- VINN VINM VIM INPUT- INV INMINUS MINUS INNEG -INPUT"),
    (
        "v+",
        "VCC VDD VS+ +VS V+ +V VSP VPOS VPP VCC+ +VCC VDD+ +VDD VPLUS VSUP VSUP+ SUP+ PWR+ PWR "
        "AVDD AVCC VCCP VS VSUPPLY+ +VSUPPLY",
    ),
    (
        "v-",
        "VEE VSS VS- -VS V- -V VSN VNEG VNN VCC- -VCC GND VDD- -VDD -VEE VMINUS VSUP- SUP- PWR- "
        "AVSS AGND VCCN GROUND VSUPPLY- -VSUPPLY",
    ),
    ("out", "OUT VOUT VO O OUTPUT Y"),
    (
        "other",
        "NC N/C NULL BAL BALANCE COMP SHDN SD EN ENABLE DIS DISABLE TRIM BIAS OFFSET PD FLAG "
        "SHUTDOWN STROBE PAD EP TAB ILIM",
    ),
)
_ROLE_OF: dict[str, Role] = {name: role for role, names in _NAMES for name in names.split()}

_EITHER: dict[str, tuple[Role, Role]] = {
    **dict.fromkeys(("POS", "P", "VP", "POSITIVE"), ("in+", "v+")),
    **dict.fromkeys(("NEG", "N", "VN", "VM", "M", "NEGATIVE"), ("in-", "v-")),
}
"""Names that some libraries give an input and others a supply pin."""

_PHRASES: tuple[tuple[str, Role], ...] = (
    (r"NON.?INV", "in+"),
    (r"INV", "in-"),
    (r"POS.*(?:SUP|POWER|VOLT)|(?:SUP|POWER).*(?:POS|\+)|\+.*SUPPLY", "v+"),
    (r"NEG.*(?:SUP|POWER|VOLT)|(?:SUP|POWER).*(?:NEG|-)|-.*SUPPLY|GROUND", "v-"),
    (r"OUTPUT", "out"),
    (r"NULL|COMPENSAT|SHUTDOWN|DISABLE|ENABLE|BALANCE|OFFSET|TRIM", "other"),
)
"""The words of connection comments, first match first."""

_USUAL: tuple[Role, ...] = ("in+", "in-", "v+", "v-", "out")

_PIN_NUMBERS: dict[frozenset[str], dict[str, Role]] = {
    frozenset(numbers.split()): dict(zip(numbers.split(), _USUAL, strict=True))
    for numbers in ("3 2 7 4 6", "3 2 8 4 1", "5 6 8 4 7", "3 2 4 11 1")
}
"""Header written with the pin numbers of a single, dual or quad package."""


def channels_from(names: Sequence[str]) -> tuple[Channel, ...]:
    """Return the amplifiers a card's pin names describe, or () where they do not say it all.

    Every amplifier needs both inputs and its output; with five pins or more both supply pins too.
    """
    parsed = _parsed(names)
    roles = [role for role, _key in parsed]
    supplies = {
        side: [at for at, role in enumerate(roles) if role == side] for side in ("v+", "v-")
    }
    if any(len(found) > 1 for found in supplies.values()):
        return ()
    if len(names) >= 5 and not (supplies["v+"] and supplies["v-"]):
        return ()
    keys = sorted({key for role, key in parsed if role in ("in+", "in-", "out")})
    found = []
    for place, key in enumerate(keys):
        pins: dict[Role, int] = {}
        for at, (role, of) in enumerate(parsed):
            if of == key and role in ("in+", "in-", "out"):
                if role in pins:
                    return ()
                pins[role] = at
        if len(pins) != 3:
            return ()
        found.append(
            Channel(
                plus=pins["in+"],
                minus=pins["in-"],
                positive=supplies["v+"][0] if supplies["v+"] else None,
                negative=supplies["v-"][0] if supplies["v-"] else None,
                output=pins["out"],
                suffix="ABCDEFGH"[place] if len(keys) > 1 else "",
            )
        )
    return tuple(found) if len(keys) <= 8 else ()


def roles_of(names: Sequence[str]) -> tuple[Role | None, ...]:
    """Return each name's role; None where it says nothing."""
    return tuple(role for role, _key in _parsed(names))


def _parsed(names: Sequence[str]) -> list[tuple[Role | None, str]]:
    cleaned = [re.sub(r"[\s_.()\[\]]+", "", name.upper().strip("\"'`|<>")) for name in names]
    numbered = _by_numbers(cleaned)
    if numbered:
        return [(role, "") for role in numbered]
    parsed = [_role(name, whole) for name, whole in zip(cleaned, names, strict=True)]
    known = Counter(role for role, _key in parsed)
    for at, name in enumerate(cleaned):
        if name in _EITHER:
            as_input, as_supply = _EITHER[name]
            if known[as_input] or (not known[as_supply] and len(names) > 3 and name[0] == "V"):
                parsed[at] = (as_supply, "")
            else:
                parsed[at] = (as_input, "")
            known[parsed[at][0]] += 1
    return parsed


def _by_numbers(names: list[str]) -> list[Role | None]:
    """Read a header of package pin numbers, or one of the 1 2 99 50 kind."""
    table = _PIN_NUMBERS.get(frozenset(names)) if len(names) == 5 else None
    if table:
        return [table[name] for name in names]
    if len(names) == 5 and names[2:4] == ["99", "50"] and all(name.isdigit() for name in names):
        return list(_USUAL)
    return []


def _role(name: str, whole: str) -> tuple[Role | None, str]:
    """Return the role of one name and the channel it belongs to ("" : the only one)."""
    if name in _EITHER:
        return None, ""
    if name in _ROLE_OF:
        return _ROLE_OF[name], ""
    for pattern in (
        r"(?P<a>.*)(?P<key>[1-4A-D])(?P<b>[+-]?)",
        r"(?P<key>[1-4A-D])(?P<a>.*)(?P<b>)",
    ):
        found = re.fullmatch(pattern, name)
        core = found["a"] + found["b"] if found else ""
        if found and core in _ROLE_OF:
            key = found["key"]
            return _ROLE_OF[core], "1234"["ABCD".index(key)] if key.isalpha() else key
    for phrase, role in _PHRASES:
        if re.search(phrase, whole.upper()):
            return role, ""
    return None, ""
