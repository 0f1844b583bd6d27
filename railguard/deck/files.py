"""Files in: bytes decoded, includes and library sections followed, bounds kept.

What a netlist names is read only below the deck's own folder, links resolved, unless the user
opens another root. A file that is missing costs only what stands in it.
"""

import hashlib
import re
from collections.abc import Mapping
from pathlib import Path, PurePosixPath
from types import MappingProxyType

import msgspec

from railguard.deck.encoding import decode, mend, no_netlist, no_netlist_text
from railguard.deck.includes import (
    bare,
    chain_of,
    find,
    holds_models,
    library_card,
    section_opened,
)
from railguard.deck.lines import Line, scan
from railguard.deck.numbers import read_number
from railguard.deck.source import DISK, Files
from railguard.location import Location
from railguard.notices import Problem, Remark


class Bounds(msgspec.Struct, frozen=True, kw_only=True):
    """How much of a netlist is read and expanded; all can be set by the user.

    file_bytes       one file
    total_bytes      a netlist with everything it includes, as often as it is included
    includes         include cards followed
    line_characters  one logical line
    word_characters  one name, value or expression
    include_depth    files including files
    subcircuit_depth instances inside instances
    elements         after expansion, empty instances included
    expression       nested parentheses of one expression
    """

    file_bytes: int = 32_000_000
    total_bytes: int = 64_000_000
    includes: int = 2_000
    line_characters: int = 1_000_000
    word_characters: int = 10_000
    include_depth: int = 32
    subcircuit_depth: int = 64
    elements: int = 500_000
    expression: int = 64


class Deck(msgspec.Struct, frozen=True, kw_only=True):
    """A deck: its logical lines with everything it includes, in reading order.

    texts  every file's text as it was decoded, by the name its locations carry
    """

    path: str
    title: str = ""
    lines: tuple[Line, ...] = ()
    directives: tuple[tuple[str, Location], ...] = ()
    problems: tuple[Problem, ...] = ()
    remarks: tuple[Remark, ...] = ()
    files: tuple[str, ...] = ()
    texts: Mapping[str, str] = MappingProxyType({})
    sha256: str = ""
    readable: bool = True
    bounds: Bounds = Bounds()


def read_deck(
    path: Path, bounds: Bounds | None = None, root: Path | None = None, files: Files = DISK
) -> Deck:
    """Read a netlist and everything it includes.

    root  the folder that includes must stay below; None: the netlist's own folder
    files the tree that the netlist and its includes are read from

    A file that cannot be read at all gives a deck that says so: nothing is raised.
    """
    return _Reader(bounds or Bounds(), files.real(root or path.parent), files).main(path)


IN_MEMORY = "<text>"
"""The path of a netlist that came as text, not as a file."""


def deck_from_text(text: str, name: str = IN_MEMORY, bounds: Bounds | None = None) -> Deck:
    """Take a netlist's text; includes are refused, because a text has no folder."""
    reader = _Reader(bounds or Bounds(), None, DISK)
    return reader.deck(name, text, hashlib.sha256(text.encode()).hexdigest())


class _Reader:
    def __init__(self, bounds: Bounds, root: Path | None, files: Files) -> None:
        self._bounds = bounds
        self._root = root
        self._from = files
        self._lines: list[Line] = []
        self._directives: list[tuple[str, Location]] = []
        self._problems: list[Problem] = []
        self._remarks: list[Remark] = []
        self._files: list[str] = []
        self._texts: dict[str, str] = {}
        self._hash = hashlib.sha256()
        self._title = ""
        self._reals: dict[Path, Path] = {}
        self._total = 0
        self._included = 0
        self._full = False

    def main(self, path: Path) -> Deck:
        name = str(path)
        try:
            if not self._from.is_file(path):
                what = self._missing(path)
                return self._refuse(name, f"{name} {what}.", "Check the path.")
            data = self._bounded(path)
        except OSError as error:
            return self._refuse(name, f"{name} cannot be read: {error.strerror}.", "")
        if data is None:
            limit = self._bounds.file_bytes
            return self._refuse(
                name,
                f"{name} is larger than the {limit:,} bytes a netlist may have.",
                "Raise file-bytes in [bounds] if this really is a netlist.",
            )
        text, how = decode(data)
        what = no_netlist(data) or no_netlist_text(text)
        if what:
            return self._refuse(
                name, f"{name} is {what}, not a SPICE netlist.", "Export a SPICE netlist."
            )
        if how:
            self._remarks.append(Remark(f"{name} was read as {how}.", Location(name, 1)))
        return self.deck(name, text, hashlib.sha256(data).hexdigest(), path)

    def deck(self, name: str, text: str, digest: str, path: Path | None = None) -> Deck:
        self._hash.update(digest.encode())
        self._files.append(name)
        if not text.strip("\x1a\x00 \t\r\n"):
            return self._refuse(name, f"{name} is empty.", "Export the netlist again.")
        titled = not _is_library(name, text)
        if not titled:
            told = f"{name} was read as a library: its first line is a card and no title."
            self._remarks.append(Remark(told, Location(name, 1)))
        self._take(text, name, titled, chain=(path,), section="")
        return Deck(
            path=name,
            title=self._title,
            lines=tuple(self._lines),
            directives=tuple(self._directives),
            problems=tuple(self._problems),
            remarks=tuple(self._remarks),
            files=tuple(self._files),
            texts=self._texts,
            sha256=self._hash.hexdigest(),
            bounds=self._bounds,
        )

    def _refuse(self, name: str, message: str, remedy: str) -> Deck:
        problem = Problem(
            rule="netlist-unreadable", message=message, remedy=remedy, location=Location(name, 1)
        )
        return Deck(path=name, problems=(problem,), readable=False, files=(name,))

    def _missing(self, path: Path) -> str:
        if self._from.is_dir(path):
            return "is a folder"
        folder = path.parent
        there = self._from.is_dir(folder) and path.name in self._from.names(folder)
        return "is no ordinary file" if there else "does not exist"

    def _bounded(self, path: Path) -> bytes | None:
        data = self._from.read(path, self._bounds.file_bytes)
        return data if len(data) <= self._bounds.file_bytes else None

    def _take(
        self, text: str, name: str, titled: bool, chain: tuple[Path | None, ...], section: str
    ) -> None:
        mended = mend(text)
        for what, at in mended.found:
            self._problem("netlist-encoding", f"{name} holds {what}.", name, line=at)
        text = mended.text.rstrip("\x1a")
        self._texts[name] = text
        scanned = scan(text, name, titled)
        self._directives += scanned.directives
        self._problems += scanned.problems
        self._remarks += scanned.remarks
        if titled and _is_card(scanned.title):
            self._problem(
                "netlist-title",
                f'"{scanned.title}" stands on the title line and is no part of the circuit.',
                name,
                "Put a title line before it.",
            )
        if titled:
            self._title = scanned.title
        self._follow(scanned.lines, chain, section)

    def _problem(self, rule: str, message: str, name: str, remedy: str = "", line: int = 1) -> None:
        self._problems.append(
            Problem(rule=rule, message=message, remedy=remedy, location=Location(name, line))
        )

    def _follow(
        self, lines: tuple[Line, ...], chain: tuple[Path | None, ...], section: str
    ) -> None:
        keep = self._lines.append
        wanted = not section
        block: Line | None = None
        closing = ""
        for index, line in enumerate(lines):
            if line.text[0] != ".":
                if wanted and block is None:
                    keep(line)
                elif wanted and closing == ".endc" and line.text.split(None, 1)[0] in _RUN:
                    # Never run, but that it is asked for says what the deck was made for.
                    keep(msgspec.structs.replace(line, text=f".{line.text}"))
                continue
            word = line.text.split(None, 1)[0].lower()
            if block is not None:
                block = None if word == closing else block
            elif word == ".lib" and (opened := self._section(lines, index, section)):
                wanted = opened == section
                if not section:
                    self._remarks.append(
                        Remark(f"No card asks for the section {opened} of {line.file}; "
                               "it is left out.", line.location)
                    )  # fmt: skip
            elif word == ".endl":
                wanted = not section
            elif not wanted:
                continue
            elif word in _BLOCKS:
                block, closing = line, _BLOCKS[word]
            elif word == ".end":
                self._ended(lines, index, chain)
                return
            elif word in _INCLUDES:
                self._include(line, bare(line.text[len(word) :]), chain, "")
            elif word == ".lib":
                target, named = library_card(line.text)
                self._include(line, target, chain, named)
            elif word == ".title":
                self._title = line.text[len(word) :].strip()
            else:
                keep(line)
        if block is not None and closing != ".end":
            self._problem(
                "netlist-end",
                f"{block.text.split()[0]} is not closed by {closing}; nothing behind it is read.",
                block.file,
                f"Put {closing} behind its last line.",
                block.number,
            )

    @staticmethod
    def _section(lines: tuple[Line, ...], index: int, asked: str) -> str:
        """Return the section a `.lib name` card opens; "" where it names a file to be read.

        In a file that is read for one section every such card opens one; elsewhere it does where
        `.endl` closes it before the next.
        """
        name = section_opened(lines[index].text)
        if not name or asked:
            return name
        for line in lines[index + 1 :]:
            word = line.text[:5].lower()
            if word == ".endl":
                return name
            if word[:4] == ".lib" and section_opened(line.text):
                return ""
        return ""

    def _ended(self, lines: tuple[Line, ...], index: int, chain: tuple[Path | None, ...]) -> None:
        rest = [line for line in lines[index + 1 :] if line.text.lower() != ".end"]
        if rest and len(chain) == 1:
            self._problem(
                "netlist-end",
                f"{len(rest)} cards behind .end are not read."
                if len(rest) > 1
                else "One card behind .end is not read.",
                lines[index].file,
                "Move them before .end.",
                rest[0].number,
            )

    def _include(
        self, line: Line, target: str, chain: tuple[Path | None, ...], section: str
    ) -> None:
        place = line.location
        if not target:
            self._problem(
                "netlist-include", "An include names no file.", line.file, "", line.number
            )
            return
        told = chain_of(chain, line.file)
        if self._too_much(place):
            return
        if self._root is None or chain[-1] is None:
            self._lost(
                place, f"{target} is not read: a text has no folder to look in.{told}", target
            )
            return
        if len(chain) > self._bounds.include_depth:
            self._problems.append(
                Problem(
                    rule="netlist-bound",
                    message=f"At {target} includes go deeper than {self._bounds.include_depth}."
                    f"{told}",
                    remedy="Raise include-depth in [bounds] if this is meant.",
                    location=place,
                )
            )
            return
        if len(target) > LONGEST_PATH:
            self._problem(
                "netlist-include",
                f"An include names a file of {len(target):,} characters; there is none such.",
                line.file,
                "",
                line.number,
            )
            return
        try:
            found = find(self._from, chain[-1].parent, target, self._root)
        except (OSError, ValueError) as error:
            # A part of a name that is too long, a ring of links, a character no name may hold.
            found = f"cannot be looked for ({getattr(error, 'strerror', None) or error})"
        if isinstance(found, str):
            self._lost(place, f"{target} {found}.{told}", target)
            return
        if any(step is not None and self._real(step) == self._real(found) for step in chain):
            self._lost(place, f"{target} includes itself.{told}", target)
            return
        self._open(found, place, target, chain, section, told)

    def _real(self, path: Path) -> Path:
        known = self._reals.get(path)
        if known is None:
            known = self._reals[path] = self._from.real(path)
        return known

    def _too_much(self, place: Location) -> bool:
        """Tell whether the deck has followed, or read, all it may; the first time it is told.

        Files that include each other twice would be read two to the power of their depth.
        """
        if self._full:
            return True
        self._included += 1
        bounds = self._bounds
        if self._included > bounds.includes:
            what = f"follows more than {bounds.includes:,} include cards"
        elif self._total > bounds.total_bytes:
            what = f"includes more than {bounds.total_bytes:,} bytes"
        elif len(self._lines) > bounds.elements:
            what = f"holds more than {bounds.elements:,} cards"
        else:
            return False
        self._full = True
        self._problems.append(
            Problem(
                rule="netlist-bound",
                message=f"The deck {what}; no further file is read.",
                remedy="Raise total-bytes or includes in [bounds] if this is meant.",
                location=place,
            )
        )
        return True

    def _open(
        self,
        found: Path,
        place: Location,
        target: str,
        chain: tuple[Path | None, ...],
        section: str,
        told: str,
    ) -> None:
        try:
            data = self._bounded(found)
        except OSError as error:
            self._lost(place, f"{target} cannot be read: {error.strerror}.{told}", target)
            return
        if data is None:
            self._lost(place, f"{target} is larger than a netlist may be.{told}", target)
            return
        self._total += len(data)
        text, how = decode(data)
        name = str(found)
        what = no_netlist(data) or no_netlist_text(text)
        if what:
            self._lost(place, f"{target} is {what}, no netlist.{told}", target)
            return
        if how:
            self._remarks.append(Remark(f"{name} was read as {how}.", Location(name, 1)))
        self._hash.update(hashlib.sha256(data).digest())
        self._files.append(name)
        before = len(self._lines)
        self._take(text, name, titled=False, chain=(*chain, found), section=section)
        if section and len(self._lines) == before:
            self._lost(place, f"{target} has no section {section}.{told}", target)

    def _lost(self, place: Location, message: str, target: str) -> None:
        name = PurePosixPath(target.replace("\\", "/")).name
        self._problems.append(
            Problem(
                rule="netlist-include",
                message=f"The included file {message}",
                remedy=f"Put {name} beside the netlist, or take the include out.",
                location=place,
                # What is missing of a library of models costs their figures, not the circuit.
                severity="minor" if holds_models(name) else None,
            )
        )


LONGEST_PATH = 4_096
"""Characters; what Linux and Windows take for a path at most."""

_INCLUDES = frozenset({".include", ".inc", ".incl"})
_BLOCKS = {
    ".control": ".endc",
    ".data": ".enddata",
    ".machine": ".endmachine",
    ".aliases": ".endaliases",
    ".exec": ".endc",
    ".verilog": ".endv",
    ".alter": ".end",
}
"""Blocks that hold no cards, and what closes them."""
_RUN = frozenset({"tran", "ac", "dc", "op", "noise", "tf", "pz", "sens", "disto"})
"""Commands of a control block that are analyses, as their dot cards are."""
_DESIGNATOR = re.compile(r"(?i)^[RCLVIEGFHDQJMX]\S*$")


def _is_card(title: str) -> bool:
    """Tell whether a title line looks like a card that was meant to be one."""
    words = title.split()
    if not 4 <= len(words) <= 6 or not _DESIGNATOR.match(words[0]):
        return False
    grounded = any(word.lower() in ("0", "gnd") for word in words[1:3])
    numbered = any(character.isdigit() for character in words[0])
    return read_number(words[3]) is not None and (grounded or numbered)


def _is_library(name: str, text: str) -> bool:
    if holds_models(name) or name.lower().endswith(".inc"):
        return True
    first = text.lstrip("\ufeff").split("\n", 1)[0].strip().lower()
    return first.startswith((".subckt", ".model", ".param", ".lib"))
