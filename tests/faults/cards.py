"""Netlists as dictionaries of cards, and the ways they are written down."""

import re
from collections.abc import Callable, Mapping
from typing import NamedTuple

from tests.faults.amplifiers import Amplifier

Cards = Mapping[str, str]
"""Designator to card. A key that begins with `*` or `.` is a comment or dot card."""


class Base(NamedTuple):
    """A sound circuit on one amplifier.

    roles  what a card or a net is there for, by the words of `circuits.py`
    """

    name: str
    amplifier: Amplifier
    cards: Cards
    roles: Mapping[str, str]

    @property
    def main(self) -> str:
        """The designator of the stage that faults are put into."""
        return self.roles["main"]

    def nets(self, designator: str) -> list[str]:
        """Return the nets of a card: all words between its designator and its last."""
        return self.cards[designator].split()[1:-1]

    def value(self, designator: str) -> float:
        """Return the value of a resistor or capacitor."""
        return number(self.cards[designator].split()[-1])

    def without(self, *designators: str) -> dict[str, str]:
        """Return the cards but for some."""
        return {k: v for k, v in self.cards.items() if k not in designators}

    def with_cards(self, **cards: str) -> dict[str, str]:
        """Return the cards with some replaced or added."""
        return {**self.cards, **cards}

    def revalued(self, **values: float) -> dict[str, str]:
        """Return the cards with other values for some two-ended elements."""
        changed = {
            name: " ".join([*self.cards[name].split()[:3], f"{value:.4g}"])
            for name, value in values.items()
        }
        return {**self.cards, **changed}

    def rewired(self, designator: str, net: str, to: str, which: int | None = None) -> dict:
        """Return the cards with one net of a card led elsewhere; `which`: that pin only."""
        first, *nets, last = self.cards[designator].split()
        new = [
            to if old == net and which in (None, place) else old for place, old in enumerate(nets)
        ]
        return {**self.cards, designator: " ".join([first, *new, last])}


def number(text: str) -> float:
    """Read a value as these decks write it."""
    scale = {"p": 1e-12, "n": 1e-9, "u": 1e-6, "m": 1e-3, "k": 1e3, "meg": 1e6}
    match = re.fullmatch(r"([-+0-9.e]+?)(meg|[pnumk])?", text)
    if match is None:
        raise ValueError(text)
    return float(match[1]) * scale.get(match[2], 1.0)


def as_channel(designator: str) -> str:
    """Return XU1 or XU1A as a schematic names the channel of a dual: U1A."""
    if not designator.startswith("XU"):
        return designator
    name = designator.removeprefix("X")
    return name if name[-1].isalpha() else f"{name}A"


def plain(cards: Cards) -> str:
    """Write a deck down as it is."""
    return "\n".join(["river gauge, one stage", *cards.values(), ".end", ""])


def capitals(cards: Cards) -> str:
    """Write a deck in capitals, as old editors do."""
    return plain({k: v if v.startswith("*") else v.upper() for k, v in cards.items()})


def continued(cards: Cards) -> str:
    """Break long cards, indent by tabs, and put comments between."""
    lines = ["river gauge, one stage"]
    for card in cards.values():
        words = card.split()
        if len(words) > 5 and not card.startswith(("*", ".")) and "(" not in card:
            lines += ["\t".join(words[:3]), "* pins go on below", "+\t" + "  ".join(words[3:])]
        else:
            lines.append(card)
    return "\n".join([*lines, ".end", ""])


def exported(cards: Cards) -> str:
    """Write it as a schematic editor does: U1A for XU1, a title card, footprints behind values."""
    lines = ["* exported netlist", ".title river gauge"]
    for name, card in cards.items():
        if name.startswith("XU"):
            lines.append(" ".join([as_channel(name), *card.split()[1:]]))
        elif name.startswith("R") and len(card.split()) == 4:
            lines.append(f"{card} ; 0603")
        else:
            lines.append(card)
    return "\n".join([*lines, ".end", ""])


def parametrised(cards: Cards) -> str:
    """Put every resistor's value into a parameter."""
    params, lines = [], []
    for name, card in cards.items():
        words = card.split()
        if name.startswith("R") and len(words) == 4 and re.fullmatch(r"[0-9.]+(k|meg)?", words[3]):
            params.append(f".param {name.lower()}={words[3]}")
            lines.append(" ".join([*words[:3], f"{{{name.lower()}}}"]))
        else:
            lines.append(card)
    return "\n".join(["river gauge, one stage", *params, *lines, ".end", ""])


class _Block(NamedTuple):
    """A deck parted into a block and what stays outside it."""

    dots: Cards
    inside: Cards
    outside: Cards

    @property
    def ports(self) -> tuple[str, ...]:
        """Return the nets both sides have, ground left out."""
        there = _nets(self.outside)
        return tuple(net for net in _nets(self.inside) if net in there and net != "0")


def _nets(cards: Cards) -> dict[str, None]:
    found: dict[str, None] = {}
    for name, card in cards.items():
        words = card.split()
        found |= dict.fromkeys(words[1:-1] if name[0] in "XJQ" else words[1:3])
    return found


def _block(cards: Cards) -> _Block:
    rails = {w for c in cards.values() if c.startswith("CB") or c[:2] in ("CP", "CN")
             for w in c.split()[1:3]} - {"0"}  # fmt: skip
    dots, inside, outside = {}, {}, {}
    for name, card in cards.items():
        if name.startswith((".", "*")):
            dots[name] = card
        elif name[0] in "VIJ" or (name[0] in "RCL" and rails & set(card.split()[1:3])):
            outside[name] = card
        else:
            inside[name] = card
    return _Block(dots, inside, outside)


def blocked(cards: Cards) -> str:
    """Put the stages into a subcircuit, and leave supplies, sources and rail capacitors outside."""
    block = _block(cards)
    ports = " ".join(block.ports)
    return "\n".join(
        ["river gauge, one block", *block.dots.values(), f".subckt STAGE {ports}",
         *block.inside.values(), ".ends", *block.outside.values(), f"XCH1 {ports} STAGE", ".end",
         ""]
    )  # fmt: skip


def in_block(name: str, cards: Cards) -> str:
    """Return how a designator or net is called where the stages are in a block."""
    block = _block(cards)
    inner = name in block.inside or (name in _nets(block.inside) and name not in block.ports)
    return f"XCH1.{name}" if inner else name


def as_written(name: str, cards: Cards) -> str:
    """Return a name as it is."""
    return name


def as_exported(name: str, cards: Cards) -> str:
    """Return how a schematic calls what a deck calls XU1."""
    return as_channel(name)


class Spelling(NamedTuple):
    """A way to write a deck down, and what it makes of the names."""

    name: str
    text: Callable[[Cards], str]
    called: Callable[[str, Cards], str] = as_written


SPELLINGS = (
    Spelling("plain", plain),
    Spelling("capitals", capitals),
    Spelling("continued", continued),
    Spelling("exported", exported, as_exported),
    Spelling("parametrised", parametrised),
    Spelling("blocked", blocked, in_block),
)
