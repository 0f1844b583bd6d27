"""The lines of a deck in reading order: sections, blocks and includes followed."""

import hashlib
from pathlib import Path

import msgspec

from railguard.deck.bounds import Bounds
from railguard.deck.encoding import mend
from railguard.deck.includes import bare, chain_of, library_card, section_opened
from railguard.deck.lines import Line, scan
from railguard.deck.opening import Chain, Opening, lost
from railguard.deck.source import Files
from railguard.deck.titles import is_card
from railguard.location import Location
from railguard.notices import Problem, Remark

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


class Following:
    """What was read of a deck so far; its fields are those of `Deck`."""

    def __init__(self, bounds: Bounds, root: Path | None, files: Files) -> None:
        self._opening = Opening(bounds, root, files)
        self._hash = hashlib.sha256()
        self.lines: list[Line] = []
        self.directives: list[tuple[str, Location]] = []
        self.problems: list[Problem] = []
        self.remarks: list[Remark] = []
        self.files: list[str] = []
        self.texts: dict[str, str] = {}
        self.title = ""

    @property
    def sha256(self) -> str:
        """The digest of every file's digest, in reading order."""
        return self._hash.hexdigest()

    def enter(self, name: str, digest: bytes) -> None:
        """Count a file in that is about to be taken."""
        self._hash.update(digest)
        self.files.append(name)

    def take(self, text: str, name: str, titled: bool, chain: Chain, section: str = "") -> None:
        """Read a file's text on: all of it, or one section.

        titled  whether its first line is a title
        """
        mended = mend(text)
        for what, at in mended.found:
            self._problem("netlist-encoding", f"{name} holds {what}.", name, line=at)
        text = mended.text.rstrip("\x1a")
        self.texts[name] = text
        scanned = scan(text, name, titled)
        self.directives += scanned.directives
        self.problems += scanned.problems
        self.remarks += scanned.remarks
        if titled and is_card(scanned.title):
            self._problem(
                "netlist-title",
                f'"{scanned.title}" stands on the title line and is no part of the circuit.',
                name,
                "Put a title line before it.",
            )
        if titled:
            self.title = scanned.title
        self._follow(scanned.lines, chain, section)

    def _problem(self, rule: str, message: str, name: str, remedy: str = "", line: int = 1) -> None:
        self.problems.append(
            Problem(rule=rule, message=message, remedy=remedy, location=Location(name, line))
        )

    def _follow(self, lines: tuple[Line, ...], chain: Chain, section: str) -> None:
        keep = self.lines.append
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
                    self.remarks.append(
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
                self.title = line.text[len(word) :].strip()
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

    def _ended(self, lines: tuple[Line, ...], index: int, chain: Chain) -> None:
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

    def _include(self, line: Line, target: str, chain: Chain, section: str) -> None:
        place = line.location
        told = chain_of(chain, line.file)
        opened = self._opening.open(target, place, chain, told, len(self.lines))
        if opened is None:
            return
        if isinstance(opened, Problem):
            self.problems.append(opened)
            return
        name = str(opened.path)
        if opened.read_as:
            self.remarks.append(Remark(f"{name} was read as {opened.read_as}.", Location(name, 1)))
        self.enter(name, opened.sha256)
        before = len(self.lines)
        self.take(opened.text, name, False, (*chain, opened.path), section)
        if section and len(self.lines) == before:
            self.problems.append(lost(place, f"{target} has no section {section}.{told}", target))
