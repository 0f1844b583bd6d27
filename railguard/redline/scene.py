"""The scene of a cure: a reviewed design beside its cards, and the edits that can be made there.

A cure speaks of elements and nets; the scene finds their words on the cards. What cannot be found
gives None, and the cure falls away: nothing is ever guessed into a netlist.
"""

import re
from collections.abc import Iterable, Iterator
from functools import cached_property
from itertools import pairwise
from typing import Literal

import msgspec

from railguard.analysis.corners import tolerance_of
from railguard.analysis.stage import Design, Stage
from railguard.analysis.wiring import joined_nets, order_by_wiring, stiff_nets
from railguard.circuit.ground import GROUNDS
from railguard.circuit.model import GROUND, Element
from railguard.deck.lines import Line
from railguard.deck.numbers import read_number
from railguard.devices import catalogue
from railguard.devices.catalogue import Catalogue
from railguard.devices.model import Match, PinOrder
from railguard.devices.names import schematic_name
from railguard.devices.pinouts import pin_order
from railguard.location import Location
from railguard.redline.cards import Word, aligned, lines_of, replaced, spelled, words_of
from railguard.redline.model import Edit
from railguard.redline.source import Source, can_be_patched
from railguard.rules.compose import stage_named
from railguard.rules.finding import Finding
from railguard.rules.protocol import Limits
from railguard.rules.registry import limits_of, rule
from railguard.units import preferred, series_for, series_of, si

Role = Literal["plus", "minus", "positive", "negative", "output"]

UNITS = {"R": "Ω", "C": "F", "L": "H"}


class Candidate(msgspec.Struct, frozen=True, kw_only=True):
    """A change that may cure a finding; a review of the changed deck decides.

    what     the change in words, without a full stop
    choice   what speaks for this value where several would do
    regains  True where the change is one of gain, so that gains may differ afterwards
    wakes    True where a stage works for the first time and no value was chosen for it: what is to
             be said of it then was there and could not be seen
    """

    edits: tuple[Edit, ...]
    what: str
    choice: str = ""
    regains: bool = False
    wakes: bool = False


class Scene:
    """One reviewed design with its cards."""

    def __init__(self, design: Design, source: Source, taken: Iterable[str] = ()) -> None:
        """Take a design and its files; `taken` are designators given away already."""
        self.design = design
        self.source = source
        self._before = frozenset(name.casefold() for name in taken)
        self.given: list[str] = []

    def forget(self) -> None:
        """Take back the designators given to a candidate that was not taken."""
        self.given = []

    # --- looking

    @cached_property
    def lines(self) -> dict[tuple[str, int], Line]:
        """Every card by the place of its first character."""
        return {(x.file, x.number): x for x in self.source.deck().lines}

    @cached_property
    def elements(self) -> dict[str, Element]:
        """Every element of the flat circuit by designator."""
        return {e.designator: e for e in self.design.circuit.elements}

    def card(self, location: Location | None) -> Line | None:
        """Return the card at a place, where its file can be patched."""
        if location is None or not can_be_patched(self.source, location.file):
            return None
        return self.lines.get((location.file, location.line))

    def stage(self, finding: Finding) -> Stage | None:
        """Return the stage a finding is about."""
        return stage_named(finding.designators[0], self.design) if finding.designators else None

    def on(self, net: str, kinds: str = "RCL") -> Iterator[Element]:
        """Yield the fitted elements of some kinds at a net."""
        for element in self.design.circuit.elements:
            if element.kind in kinds and element.fitted and net in element.nets[:2]:
                yield element

    def stands(self, net: str) -> bool:
        """Tell whether a net is held at a level that no signal moves: ground, rails, references."""
        if net == GROUND or any(rail.net == net for rail in self.design.rails):
            return True
        return any(
            e.kind == "V" and net in e.nets[:2] and e.source is not None and e.source.wave is None
            and e.source.ac is None
            for e in self.design.circuit.elements
        )  # fmt: skip

    def limits(self, name: str) -> Limits:
        """Return a rule's limits as they were judged."""
        return limits_of(rule(name), self.design.settings)

    # --- values

    def tolerance(self, kind: str, element: Element | None = None) -> float:
        """Return the tolerance of an element, or of a new one of its kind."""
        like = element or Element(kind=kind, designator="", nets=())
        return tolerance_of(like, self.design.settings.tolerances)[0]

    def series(self, kind: str, element: Element | None = None) -> str:
        """Return the IEC 60063 series laid out for that tolerance."""
        return series_for(self.tolerance(kind, element))

    def fit(
        self, kind: str, value: float, direction: str = "nearest", at: Element | None = None
    ) -> float:
        """Return a value of the series: nearest, "up" or "down"."""
        name = self.series(kind, at)
        match direction:
            case "up":
                return preferred(value, name, "up")
            case "down":
                return preferred(value, name, "down")
            case _:
                return preferred(value, name)

    # --- editing

    def value(self, element: Element, new: float) -> Edit | None:
        """Give an element another value, on its card or on the `.param` it is taken from."""
        line = self.card(element.location)
        if line is None or element.value is None:
            return None
        word = self.value_word(line, element)
        if word is not None:
            return replaced(line, word, spelled(new, word.text, element.kind))
        return self._parameter(line, element, new)

    def value_word(self, line: Line, element: Element) -> Word | None:
        """Find the word of a card that gives an element its value."""
        for word in words_of(line)[3:]:
            number = read_number(word.text, element.kind)
            if number is not None and element.value is not None:
                close = abs(number.value - element.value) <= 1e-6 * abs(element.value)
                if close or number.spice == element.value:
                    return word
        return None

    def level(self, source: Element, volts: float) -> Edit | None:
        """Give a source of a standing level another one."""
        line = self.card(source.location)
        if line is None or source.source is None or source.source.wave is not None:
            return None
        for word in words_of(line)[3:]:
            number = read_number(word.text, source.kind)
            if number is not None and number.value == source.source.dc:
                return replaced(line, word, spelled(volts, word.text, source.kind))
        return None

    def _parameter(self, line: Line, element: Element, new: float) -> Edit | None:
        names = {w.text.casefold() for w in words_of(line)[3:]}
        for card in self.lines.values():
            if not card.text.casefold().startswith(".param") or card.file not in self.source.files:
                continue
            words = words_of(card)
            for name, value in pairwise(words):
                number = read_number(value.text, element.kind)
                if name.text.casefold() not in names or number is None:
                    continue
                if number.value == element.value and can_be_patched(self.source, card.file):
                    return replaced(card, value, spelled(new, value.text, element.kind))
        return None

    def node(self, element: Element | Stage, old: str, new: str, nth: int = 0) -> Edit | None:
        """Move a pin of a card from one net to another; `nth` where it stands there twice."""
        line = self.card(element.location)
        if line is None:
            return None
        names = GROUNDS if old == GROUND else frozenset({self.local(old, element).casefold()})
        hits = [w for w in self._node_words(line, element) if w.text.casefold() in names]
        return replaced(line, hits[nth], new) if len(hits) > nth else None

    def pin(self, stage: Stage, role: Role, net: str) -> Edit | None:
        """Put another net at a pin of an op-amp's card."""
        found = self.pin_word(stage, role)
        return replaced(*found, net) if found is not None else None

    def pin_word(self, stage: Stage, role: Role) -> tuple[Line, Word] | None:
        """Find the word of a pin on an op-amp's card."""
        line = self.card(stage.location)
        if line is None:
            return None
        words = words_of(line)[1:]
        for element in self.design.circuit.elements:
            if element.location != stage.location:
                continue
            if not stage.designator.startswith(element.designator):
                continue
            index = self._index(stage, element, role)
            if index is not None and index < len(words):
                return line, words[index]
        return None

    def _index(self, stage: Stage, element: Element, role: Role) -> int | None:
        if element.kind in "EG":
            nets = element.nets[:2] + (element.control.nets if element.control else ())
            start = 0 if role == "output" else 2
            wanted = {"plus": stage.inputs.plus.net, "minus": stage.inputs.minus.net}.get(
                role, stage.output.net
            )
            return next((i for i in range(start, len(nets)) if nets[i] == wanted), None)
        match = self.catalogue.match(element.model)
        order = self._order(element, match)
        for channel in order.channels if order is not None else ():
            suffix = channel.suffix if order is not None and len(order.channels) > 1 else ""
            if element.designator + suffix == stage.designator:
                index: int | None = getattr(channel, role)
                return index
        return None

    def _order(self, element: Element, match: Match) -> PinOrder | None:
        """Return where an amplifier's pins stand, as recognising it found them."""
        circuit, pins = self.design.circuit, self.design.settings.pins
        names = (element.designator, schematic_name(element.designator))
        stated = next((pins[name] for name in names if name in pins), ())
        count, board = len(element.nets), element.kind == "ic"
        order = pin_order(match, count, element.ports, element.pin_notes, stated, board)
        if order is None:
            return None
        return order_by_wiring(element, order, stiff_nets(circuit), joined_nets(circuit))

    @cached_property
    def catalogue(self) -> Catalogue:
        """The device catalogue with the user's tables."""
        return catalogue.load(self.design.settings.devices)

    def _node_words(self, line: Line, element: Element | Stage) -> tuple[Word, ...]:
        """Return the node words of a card: all but its name and what stands behind its nodes."""
        words = words_of(line)[1:]
        count = 2 if isinstance(element, Element) and element.kind in "RCLVID" else len(words)
        return words[:count]

    def local(self, net: str, near: Element | Stage) -> str:
        """Return a net's name as the cards beside one card write it."""
        prefix = near.designator.rpartition(".")[0]
        if not prefix or net == GROUND:
            return net
        for element in self.design.circuit.elements:
            if element.designator.rpartition(".")[0] != prefix or net not in element.nets:
                continue
            line = self.card(element.location)
            if line is None:
                continue
            words, index = words_of(line), element.nets.index(net)
            if index + 1 < len(words):
                return words[index + 1].text
        return net.removeprefix(f"{prefix}.")

    def added(
        self, letter: str, nets: tuple[str, str], value: float, after: Element | Stage
    ) -> tuple[Edit, str] | None:
        """Add a two-ended element behind a card; return the edit and its designator."""
        line = self.card(after.location)
        if line is None:
            return None
        name = self.new_name(letter)
        words = [name, *(self.local(n, after) for n in nets), spelled(value)]
        last = lines_of(line)[-1]
        return self.behind(line.file, last, aligned(words, self._model_card(line, letter))), name

    def _model_card(self, line: Line, letter: str) -> Line | None:
        """Return the nearest two-ended card of the same file, whose columns a new one takes."""
        near = [
            x for x in self.lines.values()
            if x.file == line.file and x.text[:1].upper() in "RC" and len(x.text.split()) == 4
        ]  # fmt: skip
        own = [x for x in near if x.text[:1].upper() == letter] or near
        return min(own, key=lambda x: abs(x.number - line.number), default=None)

    def behind(self, file: str, line: int, text: str) -> Edit:
        """Add a line behind another one."""
        length = len(self.physical(file)[line - 1])
        return Edit(file, line, length + 1, 0, f"\n{text}")

    def physical(self, file: str) -> list[str]:
        """Return a file's lines without their ends."""
        return re.split(r"\r\n|\n|\r", self.source.text(file))

    def without(self, element: Element) -> tuple[Edit, ...]:
        """Turn an element's card into a comment, every line of it."""
        line = self.card(element.location)
        if line is None:
            return ()
        return tuple(Edit(line.file, number, 1, 0, "* ") for number in lines_of(line))

    def new_name(self, letter: str) -> str:
        """Return the next free designator of a letter: behind the highest number there is."""
        names = {x.text.split(None, 1)[0].casefold() for x in self.lines.values()}
        names |= self._before | {name.casefold() for name in self.given}
        numbers = [int(m[1]) for n in names if (m := re.fullmatch(rf"{letter.lower()}(\d+)", n))]
        name = f"{letter}{max(numbers, default=0) + 1}"
        self.given.append(name)
        return name

    def new_net(self, like: str) -> str:
        """Return a free name for a net parted from another one."""
        words = {w.text.casefold() for x in self.lines.values() for w in words_of(x)}
        base = re.sub(r"\W", "", like.rpartition(".")[2]) or "n"
        number = 2
        while f"{base}_{number}".casefold() in words:
            number += 1
        return f"{base}_{number}"


def with_value(element: Element, new: float) -> str:
    """Say what an element becomes: `R2 = 13 kΩ instead of 51 kΩ`."""
    unit = UNITS[element.kind]
    return f"{element.designator} = {si(new, unit)} instead of {si(element.value, unit)}"


def all_of(*edits: Edit | None) -> tuple[Edit, ...] | None:
    """Return edits that belong together, or None where one of them cannot be made."""
    made = [e for e in edits if e is not None]
    return tuple(sorted(set(made))) if made and len(made) == len(edits) else None


def odd(value: float) -> bool:
    """Tell whether a value is of no preferred series."""
    return series_of(value) is None
