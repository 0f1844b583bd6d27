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
    "U": "ic", "IC": "ic", "OP": "ic", "AR": "ic", "DA": "ic", "DD": "ic", "N": "ic", "REG": "ic",
    "OK": "ic", "OC": "ic", "ISO": "ic",
    "FB": "link", "F": "link", "FU": "link", "FS": "link", "PTC": "link", "JP": "link",
    "JMP": "link", "NT": "link", "SJ": "link", "SB": "link", "SH": "link", "W": "link",
    "L": "link",
    "J": "open", "CN": "open", "P": "open", "CON": "open", "CONN": "open", "TP": "open",
    "PAD": "open", "H": "open", "MH": "open", "MP": "open", "FID": "open", "X": "open",
    "TB": "open", "MK": "open", "ANT": "open", "AE": "open",
    "BT": "battery", "BAT": "battery", "B": "battery", "GB": "battery",
    "RV": "pot", "POT": "pot", "VR": "pot", "TRIM": "pot", "TM": "pot",
    "LED": "diode", "D": "diode", "CR": "diode", "VD": "diode", "ZD": "diode", "DZ": "diode",
    "HL": "diode", "TVS": "diode",
    "SW": "opaque", "S": "opaque", "SA": "opaque", "RN": "opaque", "RP": "opaque", "K": "opaque",
    "RL": "opaque", "RLY": "opaque", "RY": "opaque", "T": "opaque", "TR": "opaque", "Y": "opaque",
    "XTAL": "opaque", "ZQ": "opaque", "M": "opaque", "LS": "opaque", "BZ": "opaque", "Q": "opaque",
    "VT": "opaque", "A": "opaque", "R": "opaque", "C": "opaque", "RT": "opaque", "TH": "opaque",
    "DS": "opaque", "DISP": "opaque", "LCD": "opaque", "PS": "opaque", "CMC": "opaque",
}  # fmt: skip
"""By the letters before the number. Source: IEEE 315, IEC 81346-2 and GOST 2.710, all from memory;
what they do not name is common practice of schematic editors."""


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
    return PREFIXES.get(prefix_of(designator))


def prefix_of(designator: str) -> str:
    """Return the row of the table a designator belongs to, or ""."""
    leaf = designator.rsplit(".", 1)[-1]
    letters = leaf.rstrip("0123456789ABCDEFabcdef_.-/") if leaf[-1:].isdigit() else leaf
    head = ""
    for character in leaf:
        if not character.isalpha():
            break
        head += character
    for length in range(len(head), 0, -1):
        known = head[:length].upper() in PREFIXES
        if known and (length == len(head) or len(letters) <= length):
            return head[:length].upper()
    return ""
