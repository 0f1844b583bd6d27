"""The value of a card: what it says, what SPICE takes it for, what its author meant."""

import re

import msgspec

from railguard.deck.numbers import leading_number, read_number

_TOLERANCE = re.compile(r"^[±+-]*\d+(\.\d+)?%$")
_PACKAGE = re.compile(
    r"(?i)^(0201|0402|0603|0805|1206|1210|1812|2010|2512|smd|tht|x[57]r|np0|c0g)$"
)
_RATING = re.compile(r"(?i)^\d+(\.\d+)?v(dc)?$")
_UNIT = re.compile(r"(?i)^(ohms?|Ω|Ω|[kmunpµμ]?(f|h|v|a|ohms?|Ω|Ω)|k|meg|kΩ|kohm)$")
_NOT_FITTED = re.compile(r"(?i)^(dnp|dnf|nc|n/?a|nf|do[_-]?not[_-]?(fit|place|populate))$")

WORDS = {"R": ("resistor", "Ω"), "C": ("capacitor", "F"), "L": ("inductor", "H")}


class Reading(msgspec.Struct, frozen=True):
    """A value read from the words behind a card's nodes.

    value    what the author meant, SI; None where it cannot be told
    spice    what SPICE takes it for
    rule     the netlist rule a difference belongs to, or ""
    why      the difference, in words
    text     words behind the value: package, rating, tolerance
    fitted   False for DNP
    written  the value as written, where it is more than the first word
    """

    value: float | None = None
    spice: float | None = None
    rule: str = ""
    why: str = ""
    text: str = ""
    fitted: bool = True
    written: str = ""


def is_rating(word: str) -> bool:
    """Tell whether a word behind a value says how it is made: a tolerance, package, voltage."""
    return any(p.match(word) for p in (_TOLERANCE, _PACKAGE, _RATING))


def not_fitted(word: str) -> bool:
    """Tell whether a value says that the component is left out."""
    return bool(_NOT_FITTED.match(word))


def _decimal_comma(words: list[str], letter: str, card: str) -> Reading | None:
    """Read a value whose decimal comma split it into two words."""
    if len(words) < 2 or not words[0].lstrip("+-").isdigit() or not words[1][:1].isdigit():
        return None
    if f"{words[0]},{words[1]}" not in card:
        return None
    meant, taken = read_number(f"{words[0]}.{words[1]}", letter), read_number(words[1], letter)
    return Reading(
        meant.value if meant else None,
        taken.spice if taken else None,
        "netlist-value-form",
        "to SPICE a comma separates two words",
        " ".join(words[2:]),
        written=f"{words[0]},{words[1]}",
    )


def read_value(words: list[str], letter: str, card: str = "") -> Reading:
    """Read the value of a passive from the words behind its nodes.

    card  the whole card as written: a decimal comma shows there only
    """
    comma = _decimal_comma(words, letter, card)
    if comma is not None:
        return comma
    first = words[0]
    if not_fitted(first):
        return Reading(text=" ".join(words[1:]), fitted=False)
    number = read_number(first, letter)
    rest = words[1:]
    if number is None:
        slash = re.split(r"[/|]", first, maxsplit=1)
        if len(slash) == 2 and read_number(slash[0], letter) is not None:
            return read_value([slash[0], slash[1], *rest], letter)
        stops = leading_number(first)
        why = f'"{first}" is no number'
        if stops is not None:
            why += f", and SPICE stops reading at {stops:g}"
        return Reading(None, stops, "netlist-value-form", why, " ".join(rest))
    if rest and _UNIT.match(rest[0]):
        joined = read_number(first + rest[0], letter)
        if joined is not None:
            return Reading(
                joined.value, number.spice, "netlist-value-form",
                "a blank stands before its unit", " ".join(rest[1:]),
                written=f"{first} {rest[0]}",
            )  # fmt: skip
    if number.trap:
        rule = "netlist-value-suffix"
        if number.value == number.spice:
            form = number.trap.startswith("its exponent")
            rule = "netlist-value-form" if form else "netlist-other-dialect"
        return Reading(number.value, number.spice, rule, number.trap, " ".join(rest))
    second = next((w for w in rest if read_number(w.rstrip("%")) is not None), None)
    if second is not None:
        what = "a second number"
        if _TOLERANCE.match(second):
            what = "a tolerance"
        elif _PACKAGE.match(second):
            what = "a package code"
        elif _RATING.match(second):
            what = "a voltage rating"
        replaced = read_number(second.rstrip("%"))
        return Reading(
            number.value,
            replaced.spice if replaced else None,
            "netlist-value-second-number",
            f"{what} ({second}) behind the value replaces it"
            + (", and * begins no comment there; ; does" if "*" in rest else ""),
            " ".join(rest),
        )
    return Reading(number.value, number.spice, text=" ".join(rest))
