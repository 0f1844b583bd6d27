"""Designators: the package a unit belongs to, and the spelling of the schematic."""

import re

_SPICE_LETTER = re.compile(r"^X(?:[§_]|(?=[A-Z]{1,3}\d))", re.IGNORECASE)
"""`XU1`, `X_U1`, `X§U1`: the letter SPICE needs before the schematic's own designator."""

_UNIT_MARKED = re.compile(r"^([A-Z]{1,4}\d+)(?:[._\-:/])(?:UNIT)?([A-H]|\d{1,2})$", re.IGNORECASE)
_UNIT_LETTER = re.compile(r"^([A-Z]{1,4}\d+)([A-H])$", re.IGNORECASE)
_PACKAGE_LETTERS = ("U", "IC", "N", "OP", "AR", "A")
"""Designator letters of integrated circuits (IEC 81346 A/N/U, IEEE 315 AR and U)."""


def schematic_name(designator: str) -> str:
    """Return the spelling of the schematic: `XCH1.XU2` gives `CH1.U2`, `X1` stays `X1`."""
    return ".".join(_strip(level) for level in designator.split("."))


def _strip(level: str) -> str:
    stripped = _SPICE_LETTER.sub("", level)
    return stripped or level


def package_of(designator: str) -> tuple[str, str]:
    """Return the package a designator belongs to and which unit of it: `XU3A` gives `U3`, `A`.

    Units are spelt `U3A`, `U3.B`, `U3_2`, `U3-1` or `U3/A`. A trailing letter is a unit only from A
    to H, after a digit, and on the designator letters integrated circuits carry; a number after a
    dot is one only where the part before it is such a designator. The unit is "" where there is
    none. The caller joins units only where their device and supply nets agree, so a lone `U3A` that
    is a whole package does no harm.
    """
    levels = schematic_name(designator).split(".")
    if len(levels) > 1 and _is_package(levels[-2]) and re.fullmatch(r"[A-Ha-h]|\d", levels[-1]):
        return ".".join(levels[:-1]), levels[-1].upper()
    *above, last = levels
    found = _UNIT_MARKED.match(last) or _UNIT_LETTER.match(last)
    if found is None or not _is_package(found[1]):
        return ".".join(levels), ""
    return ".".join([*above, found[1]]), found[2].upper()


def _is_package(name: str) -> bool:
    letters = re.match(r"[A-Za-z]+", name)
    return letters is not None and letters[0].upper() in _PACKAGE_LETTERS and name[-1].isdigit()
