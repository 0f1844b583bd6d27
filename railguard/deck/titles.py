"""What a file's first line is: a title, a card that stands in its place, or a library's own."""

import re

from railguard.deck.includes import holds_models
from railguard.deck.numbers import read_number

_DESIGNATOR = re.compile(r"(?i)^[RCLVIEGFHDQJMX]\S*$")


def is_card(title: str) -> bool:
    """Tell whether a title line looks like a card that was meant to be one."""
    words = title.split()
    if not 4 <= len(words) <= 6 or not _DESIGNATOR.match(words[0]):
        return False
    grounded = any(word.lower() in ("0", "gnd") for word in words[1:3])
    numbered = any(character.isdigit() for character in words[0])
    return read_number(words[3]) is not None and (grounded or numbered)


def is_library(name: str, text: str) -> bool:
    """Tell by its name or its first line whether a file holds definitions and has no title."""
    if holds_models(name) or name.lower().endswith(".inc"):
        return True
    first = text.lstrip("\ufeff").split("\n", 1)[0].strip().lower()
    return first.startswith((".subckt", ".model", ".param", ".lib"))
