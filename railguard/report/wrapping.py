"""Text broken into lines, by the columns it takes; a number and its unit stay together."""

import re

from rich.cells import cell_len

_UNIT = re.compile(
    r"(?<=\d) (?=(?:[fpnuµmkMGT]?(?:V/µs|Hz|V|A|Ω|Ohm|F|H|W|s)|%|°C?|deg|dB)(?![^\W_]))"
)
_WORD = re.compile(r"[^ ]+")
_GLUE = "\ue000"
"""Stands for the blank before a unit; a private character, which `visible` never leaves."""


def with_unit(text: str) -> str:
    """Return the text with the blank between a number and its unit made unbreakable."""
    return _UNIT.sub("\u00a0", text)


def wrapped(text: str, width: int) -> list[str]:
    """Break a text at its blanks into lines of so many columns; longer words are cut."""
    lines: list[str] = []
    line, used = "", 0
    for word in _WORD.findall(_UNIT.sub(_GLUE, text)):
        for piece in _pieces(word, width):
            wide = cell_len(piece)
            if line and used + 1 + wide > width:
                lines.append(line)
                line, used = "", 0
            line, used = (f"{line} {piece}", used + 1 + wide) if line else (piece, wide)
    if line:
        lines.append(line)
    return [line.replace(_GLUE, " ") for line in lines]


def _pieces(word: str, width: int) -> list[str]:
    """Cut a word that no line holds; wide characters take two columns."""
    if cell_len(word) <= width:
        return [word]
    pieces, piece = [], ""
    for character in word:
        if piece and cell_len(piece + character) > width:
            pieces.append(piece)
            piece = ""
        piece += character
    return [*pieces, piece]
