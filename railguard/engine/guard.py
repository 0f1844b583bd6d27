"""The last look at a deck before ngspice gets it: only cards on the white list, only plain letters.

ngspice executes commands that stand in a deck (`.control` blocks, even `*#` comments) and opens
files that a deck names. Everything the engine writes is made from values, so nothing of the kind
can stand in it; this test makes that a property of the runner and not of its callers' care.
"""

import re

from railguard.errors import EngineError

TITLE = ".title railguard"

_CARD = re.compile(r"[RCLVIDQJMBEGFHXKSWT][A-Z0-9_]*\s", re.IGNORECASE)
_DOT_CARDS = frozenset({".subckt", ".ends", ".model", ".options", ".op", ".dc", ".ac", ".tran"})
_LETTERS = re.compile(r"[A-Za-z0-9_ .+\-*/=(),<>&|?:^!#]*")
# Words that make ngspice open a file from an otherwise harmless card.
_FORBIDDEN = re.compile(r"file|shell|wave", re.IGNORECASE)


def check_deck(deck: str) -> None:
    """Refuse a deck that holds anything but plain cards.

    Raises:
        EngineError: naming the line that is not allowed.
    """
    lines = deck.splitlines()
    if not lines or lines[0] != TITLE:
        raise EngineError("A deck for ngspice must begin with railguard's own title.")
    for number, line in enumerate(lines[1:], start=2):
        word = line.split(maxsplit=1)[0].lower() if line.strip() else ""
        known = word in _DOT_CARDS or _CARD.match(line) is not None
        if word and not (known and _LETTERS.fullmatch(line) and not _FORBIDDEN.search(line)):
            raise EngineError(f"Line {number} of the deck for ngspice is not allowed to run.")
