"""Board or bench: what a deck was made for, and the evidence."""

import re

from railguard.analysis.supplies import Feed
from railguard.circuit.model import GROUND, Circuit
from railguard.settings.model import Settings
from railguard.words import Kind

_SIMULATES = frozenset({"tran", "ac", "dc", "op", "tf", "noise", "four", "disto", "pz", "sens"})
_BOARD_KINDS = frozenset({"open", "ic", "link", "battery"})
_FIELDS = re.compile(r"(?i)(footprint|_smd|0402|0603|0805|1206|sot-?23|soic|dip-?8|tssop)")


def kind_of(circuit: Circuit, settings: Settings, feeds: dict[str, Feed]) -> tuple[Kind, str]:
    """Return what the deck is and why, in words.

    A bench needs all of: an analysis card, every rail held directly by an ideal source, and no
    mark of a board. A missing capacitor is evidence of nothing: it may be the very fault.
    """
    if settings.kind == "board":
        return "board", "as stated"
    if settings.kind == "bench":
        return "bench", "as stated"
    marks = _board_marks(circuit, feeds)
    if marks:
        return "board", marks
    simulates = next((a.word for a in circuit.analyses if a.word in _SIMULATES), "")
    ideal = bool(feeds) and all(f.source and not f.series for f in feeds.values())
    if simulates and ideal:
        return "bench", f"a .{simulates} card, ideal sources on every rail, no capacitor on any"
    return "unstated", "no evidence; judged as a board"


def _board_marks(circuit: Circuit, feeds: dict[str, Feed]) -> str:
    rails = set(feeds)
    for element in circuit.elements:
        if element.kind in _BOARD_KINDS and not element.designator.upper().startswith("TP"):
            return f"{element.designator} is a board component"
        if _FIELDS.search(element.text):
            return f"{element.designator} carries a package or footprint"
        if element.kind == "C" and rails.intersection(element.nets):
            other = [n for n in element.nets if n not in rails]
            if not other or other[0] == GROUND or len(other) < len(element.nets):
                return f"{element.designator} stands on a rail"
    return ""
