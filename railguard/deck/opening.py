"""An include card to the text it names, or to the sentence why that is not read."""

import hashlib
from pathlib import Path, PurePosixPath

import msgspec

from railguard.deck.bounds import Bounds
from railguard.deck.encoding import decode, no_netlist, no_netlist_text
from railguard.deck.includes import find, holds_models
from railguard.deck.source import Files
from railguard.location import Location
from railguard.notices import Problem

LONGEST_PATH = 4_096
"""Characters; what Linux and Windows take for a path at most."""

Chain = tuple[Path | None, ...]
"""The files that a line was reached through, the main file first; None: a text."""


class Opened(msgspec.Struct, frozen=True, gc=False):
    """A file whose text may be read on.

    read_as  the encoding, where it is none that is expected
    """

    path: Path
    text: str
    read_as: str
    sha256: bytes


def bounded(files: Files, path: Path, bounds: Bounds) -> bytes | None:
    """Return a file's bytes; None where they are more than a file may have.

    Raises OSError: it cannot be read.
    """
    data = files.read(path, bounds.file_bytes)
    return data if len(data) <= bounds.file_bytes else None


class Opening:
    """Opens what a deck includes, and keeps account of how much that is."""

    def __init__(self, bounds: Bounds, root: Path | None, files: Files) -> None:
        self._bounds = bounds
        self._root = root
        self._from = files
        self._reals: dict[Path, Path] = {}
        self._total = 0
        self._included = 0
        self._full = False

    def open(
        self, target: str, place: Location, chain: Chain, told: str, cards: int
    ) -> Opened | Problem | None:
        """Open the file an include card names; None where the deck has had all it may.

        told   the sentence through which files the card was reached
        cards  logical lines the deck holds by now
        """
        if not target:
            return _of(place, "An include names no file.")
        if self._full:
            return None
        full = self._too_much(place, cards)
        if full is not None:
            return full
        here = chain[-1]
        if self._root is None or here is None:
            return lost(
                place, f"{target} is not read: a text has no folder to look in.{told}", target
            )
        if len(chain) > self._bounds.include_depth:
            return Problem(
                rule="netlist-bound",
                message=f"At {target} includes go deeper than {self._bounds.include_depth}.{told}",
                remedy="Raise include-depth in [bounds] if this is meant.",
                location=place,
            )
        if len(target) > LONGEST_PATH:
            return _of(
                place,
                f"An include names a file of {len(target):,} characters; there is none such.",
            )
        try:
            found = find(self._from, here.parent, target, self._root)
        except (OSError, ValueError) as error:
            # A part of a name that is too long, a ring of links, a character no name may hold.
            found = f"cannot be looked for ({getattr(error, 'strerror', None) or error})"
        if isinstance(found, str):
            return lost(place, f"{target} {found}.{told}", target)
        if any(step is not None and self._real(step) == self._real(found) for step in chain):
            return lost(place, f"{target} includes itself.{told}", target)
        return self._read(found, place, target, told)

    def _real(self, path: Path) -> Path:
        known = self._reals.get(path)
        if known is None:
            known = self._reals[path] = self._from.real(path)
        return known

    def _too_much(self, place: Location, cards: int) -> Problem | None:
        """Say, once, that the deck has followed or read all it may.

        Files that include each other twice would be read two to the power of their depth.
        """
        self._included += 1
        bounds = self._bounds
        if self._included > bounds.includes:
            what = f"follows more than {bounds.includes:,} include cards"
        elif self._total > bounds.total_bytes:
            what = f"includes more than {bounds.total_bytes:,} bytes"
        elif cards > bounds.elements:
            what = f"holds more than {bounds.elements:,} cards"
        else:
            return None
        self._full = True
        return Problem(
            rule="netlist-bound",
            message=f"The deck {what}; no further file is read.",
            remedy="Raise total-bytes or includes in [bounds] if this is meant.",
            location=place,
        )

    def _read(self, found: Path, place: Location, target: str, told: str) -> Opened | Problem:
        try:
            data = bounded(self._from, found, self._bounds)
        except OSError as error:
            return lost(place, f"{target} cannot be read: {error.strerror}.{told}", target)
        if data is None:
            return lost(place, f"{target} is larger than a netlist may be.{told}", target)
        self._total += len(data)
        text, how = decode(data)
        what = no_netlist(data) or no_netlist_text(text)
        if what:
            return lost(place, f"{target} is {what}, no netlist.{told}", target)
        return Opened(path=found, text=text, read_as=how, sha256=hashlib.sha256(data).digest())


def lost(place: Location, message: str, target: str) -> Problem:
    """Say that an included file, or what was asked of it, is not there to be read."""
    name = PurePosixPath(target.replace("\\", "/")).name
    return Problem(
        rule="netlist-include",
        message=f"The included file {message}",
        remedy=f"Put {name} beside the netlist, or take the include out.",
        location=place,
        # What is missing of a library of models costs their figures, not the circuit.
        severity="minor" if holds_models(name) else None,
    )


def _of(place: Location, message: str) -> Problem:
    return Problem(
        rule="netlist-include", message=message, location=Location(place.file, place.line)
    )
