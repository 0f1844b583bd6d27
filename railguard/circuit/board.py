"""Designators of board exports that are no SPICE letters.

A schematic editor writes `U1`, `FB1`, `J1`, `BT1` for components that have no SPICE card of their
own. A card that does not fit its letter is tried by this table: the longest prefix that a digit
follows is taken. To add one, add a row.

kind  link     conducts at DC: ferrite, fuse, jumper, net tie
      open     open pins: connector, test point, mounting hole; may bring or take anything
      ic       an integrated circuit; its value says which
      battery  a source of unknown value unless its value says
      pot      a resistor with a tap: three nodes, taken at its middle
      diode    an LED
      opaque   what it does to its nets cannot be seen
"""

import re

PREFIXES: dict[str, str] = {
    "U": "ic", "IC": "ic", "OP": "ic", "AR": "ic",
    "FB": "link", "F": "link", "FU": "link", "JP": "link", "NT": "link", "SJ": "link",
    "J": "open", "CN": "open", "P": "open", "CON": "open", "CONN": "open", "TP": "open",
    "H": "open", "MH": "open", "FID": "open", "X": "open", "TB": "open", "MK": "open",
    "BT": "battery", "BAT": "battery", "B": "battery",
    "RV": "pot", "POT": "pot", "VR": "pot", "TRIM": "pot",
    "LED": "diode", "D": "diode",
    "SW": "opaque", "S": "opaque", "RN": "opaque", "K": "opaque", "RL": "opaque",
    "T": "opaque", "Y": "opaque", "XTAL": "opaque", "M": "opaque", "LS": "opaque", "Q": "opaque",
    "A": "opaque", "W": "link", "R": "opaque", "C": "opaque", "L": "link",
}  # fmt: skip


_CALLED = re.compile(r"(?i)^X(?:[§_]|(?=[A-Z]{1,4}\d))(?P<own>[A-Z].*)$")
_NOT_CALLED = frozenset({"link", "open", "battery", "pot", "diode"})


def behind_call(designator: str) -> str:
    """Return the schematic's designator of a board component exported as a call, or "".

    `X§J1` and `XFB2` are a connector and a ferrite where the deck has no such subcircuit; an `XU1`
    is whatever its name says and stays a call.
    """
    found = _CALLED.match(designator)
    if found is None or kind_of(found["own"]) not in _NOT_CALLED:
        return ""
    return found["own"]


def kind_of(designator: str) -> str | None:
    """Return what a board's designator stands for; None where the table has no row for it."""
    leaf = designator.rsplit(".", 1)[-1]
    letters = leaf.rstrip("0123456789ABCDEFabcdef_.-/") if leaf[-1:].isdigit() else leaf
    head = ""
    for character in leaf:
        if not character.isalpha():
            break
        head += character
    for length in range(len(head), 0, -1):
        kind = PREFIXES.get(head[:length].upper())
        if kind is not None and (length == len(head) or len(letters) <= length):
            return kind
    return None
