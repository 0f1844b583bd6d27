"""The netlists of a rule: passing, failing, at the border from both sides, without its data."""

from typing import NamedTuple

DUAL = """VP vp 0 12
VN vn 0 -12
CP vp 0 100n
CN vn 0 100n
"""
SINGLE = """VP vp 0 5
CP vp 0 100n
"""
LOAD = "RL out 0 10k\n"
FOLLOWER = "VIN in 0 SIN(0 2 100)\nXU1 in out vp vn out TL072\n" + LOAD
NOBODYS = "XQ9981"
"""A device no catalogue knows."""


class Four(NamedTuple):
    """The netlists of one rule; each is wrapped in a title and `.end`.

    passing   the rule is judged and says nothing
    failing   it speaks
    inside    it says nothing, within a few per cent of where it would
    outside   it speaks, within a few per cent of where it would not
    unknown   what it needs is not there: it is listed as not checked
    listed    rule under which the missing data is listed; "": the rule's own name; None: it is
              silent, as its `silent` says
    """

    passing: str
    failing: str
    inside: str
    outside: str
    unknown: str
    listed: str | None = ""


def deck(cards: str) -> str:
    """Return a netlist of some cards."""
    if cards.startswith(("!", "\x00")):
        return cards[1:]
    return f"river gauge\n{cards.rstrip()}\n.end\n"


def amplifier(before: str, device: str = "TL072", rails: str = DUAL, load: str = LOAD) -> str:
    """Return rails, cards, and an amplifier from `p`, `n` to `out`."""
    return f"{rails}{before}\nXU1 p n vp vn out {device}\n{load}"
