"""Text from a netlist made safe to show: nothing in it steers a terminal or hides itself.

Control, format, bidirectional and private characters become `<U+202E>`; what an encoding cannot
hold becomes its usual spelling in ASCII (`Ω` is `Ohm`) or the same mark.
"""

import re
import unicodedata

_HIDDEN = frozenset({"Cc", "Cf", "Cs", "Co", "Cn", "Zl", "Zp", "Zs"})
"""Unicode categories that have no glyph of their own, or move what stands around them."""

_SPELLED = {
    "Ω": "Ohm",
    "µ": "u",
    "μ": "u",
    "±": "+/-",
    "°": "deg",
    "·": "-",
    "…": "...",
    "–": "-",
    "’": "'",
}
"""Trade signs in ASCII, for terminals that have no others."""

_LONGEST_WORD = 96
_KEPT = 40
_LONG_WORD = re.compile(rf"\S{{{_LONGEST_WORD + 1},}}")


def visible(text: str) -> str:
    """Return the text with every hidden or steering character written out."""
    if text.isascii() and text.isprintable():
        return text
    return "".join(map(_shown, text))


def is_hidden(character: str) -> bool:
    """Tell whether a character has no glyph of its own, or moves what stands around it."""
    return character != " " and unicodedata.category(character) in _HIDDEN


def _shown(character: str) -> str:
    return _mark(character) if is_hidden(character) else character


def _mark(character: str) -> str:
    return f"<U+{ord(character):04X}>"


def encodable(text: str, encoding: str) -> str:
    """Return the text in characters that an encoding has.

    encoding  as Python names it; an unknown one counts as ASCII
    """
    try:
        text.encode(encoding)
    except UnicodeEncodeError:
        return "".join(_encoded(character, encoding) for character in text)
    except LookupError:
        return encodable(text, "ascii")
    return text


def _encoded(character: str, encoding: str) -> str:
    try:
        character.encode(encoding)
    except UnicodeEncodeError:
        return _SPELLED.get(character) or _mark(character)
    return character


def shortened(text: str) -> str:
    """Cut words that no line can hold, and say how long they were."""
    return _LONG_WORD.sub(_cut, text)


def _cut(match: re.Match[str]) -> str:
    word = match[0]
    return f"{word[:_KEPT]}...({len(word)} characters)...{word[-_KEPT // 2 :]}"
