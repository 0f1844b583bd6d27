"""JSON as text that is safe to print: what steers a terminal stands as an escape.

Readers get every name exactly as it is in the netlist; a screen that shows the file is not
steered by it.
"""

import re
from typing import Literal

import msgspec

from railguard.report.visible import is_hidden

_PLAIN = re.compile(r"[\x00-\x7e]*")


def encoded(value: object, *, order: Literal["sorted"] | None = None) -> bytes:
    """Return a value as indented JSON that ends in a newline.

    order  as `msgspec.json.encode` takes it
    """
    return _escaped(msgspec.json.format(_json(value, order), indent=1)) + b"\n"


def one_line(value: object) -> bytes:
    """Return a value as JSON without any blank or newline."""
    return _escaped(_json(value))


def _json(value: object, order: Literal["sorted"] | None = None) -> bytes:
    try:
        return msgspec.json.encode(value, order=order)
    except UnicodeEncodeError:
        # A file name that is no UTF-8 reaches Python as lone surrogates, which JSON cannot hold.
        return msgspec.json.encode(_mended(msgspec.to_builtins(value)), order=order)


def _escaped(data: bytes) -> bytes:
    text = data.decode()
    if _PLAIN.fullmatch(text) is not None:
        return data
    return "".join(_escape(c) if c > "~" and is_hidden(c) else c for c in text).encode()


def _escape(character: str) -> str:
    """Return a character as JSON escapes, in UTF-16 as JSON has it."""
    units = character.encode("utf-16-be")
    return "".join(f"\\u{units[i]:02x}{units[i + 1]:02x}" for i in range(0, len(units), 2))


def _mended(value: object) -> object:
    """Return the value with U+FFFD for what is no character, in every text it holds."""
    if isinstance(value, str):
        return value.encode("utf-8", "replace").decode("utf-8")
    if isinstance(value, list | tuple):
        return [_mended(inner) for inner in value]
    if isinstance(value, dict):
        return {_mended(key): _mended(inner) for key, inner in value.items()}
    return value
