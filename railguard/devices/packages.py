"""Thermal resistance by package class, for families whose sheet lists none.

Common practice, not a maker's figure: the middle of what makers list for op-amps in still air on a
two-layer or JESD51-3 board. A figure of the device itself always goes before these.
"""

from collections.abc import Mapping

_SINGLE = {"SOT-23-5": 220.0, "SC70-5": 280.0, "SOIC-8": 140.0, "DIP-8": 100.0}
_DUAL = {"SOIC-8": 140.0, "DIP-8": 100.0, "MSOP-8": 190.0, "TSSOP-8": 180.0}
_QUAD = {"SOIC-14": 95.0, "DIP-14": 80.0, "TSSOP-14": 115.0}


def class_resistances(channels: tuple[int, ...]) -> Mapping[str, float]:
    """Return junction to ambient, K/W, of the packages usual for these numbers of amplifiers."""
    found: dict[str, float] = {}
    for count in channels:
        found.update({1: _SINGLE, 2: _DUAL, 4: _QUAD}.get(count, {}))
    return found
