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

from railguard.deck.lines import Line, scan
from railguard.deck.source import DISK, Files
from railguard.location import Location
from railguard.notices import Problem, Remark


class Bounds(msgspec.Struct, frozen=True, kw_only=True):
    """How much of a netlist is read and expanded; all can be set by the user.

    file_bytes       one file
    line_characters  one logical line
    include_depth    files including files
    subcircuit_depth instances inside instances
    elements         after expansion
    expression       nested parentheses of one expression
    """

    file_bytes: int = 32_000_000
    line_characters: int = 1_000_000
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


def deck_from_text(text: str, name: str = "<text>", bounds: Bounds | None = None) -> Deck:
    """Take a netlist's text; includes are refused, because a text has no folder."""
    reader = _Reader(bounds or Bounds(), None, DISK)
    return reader.deck(name, text, hashlib.sha256(text.encode()).hexdigest())


_UNREADABLE = (
    (b"PK\x03\x04", "a zip archive"),
    (b"\x1f\x8b", "a gzip archive"),
    (b"%PDF", "a PDF document"),
    (b"<?xml", "an XML file"),
    (b"<Binary", "a binary library"),
    (b"\x7fELF", "a program"),
    (b"(export", "a board netlist in another format"),
    (b"(kicad", "a schematic or symbol file"),
    (b"EESchema", "a schematic or symbol library"),
    (b"Version 4\r\nSHEET", "a schematic"),
    (b"Version 4\nSHEET", "a schematic"),
)


def decode(data: bytes) -> tuple[str, str]:
    """Return a netlist's text and how it was decoded, in words; "" for plain UTF-8 or ASCII."""
    for mark, codec, words in (
        (b"\xef\xbb\xbf", "utf-8", ""),
        (b"\xff\xfe", "utf-16-le", "UTF-16"),
        (b"\xfe\xff", "utf-16-be", "UTF-16"),
    ):
        if data.startswith(mark):
            return data[len(mark) :].decode(codec, "replace"), words
    sample = data[:4096]
    if len(sample) >= 8:
        odd = sample[1::2].count(0) / max(len(sample[1::2]), 1)
        even = sample[0::2].count(0) / max(len(sample[0::2]), 1)
        if odd >= 0.3 and even < 0.05:
            return data.decode("utf-16-le", "replace"), "UTF-16 without a byte order mark"
        if even >= 0.3 and odd < 0.05:
            return data.decode("utf-16-be", "replace"), "UTF-16 without a byte order mark"
    try:
        return data.decode("utf-8"), ""
    except UnicodeDecodeError:
        # Five bytes are undefined in cp1252; Latin-1 gives them a character all the same.
        text = "".join(_cp1252(byte) for byte in data)
        return text, "Windows-1252"


def _cp1252(byte: int) -> str:
    try:
        return bytes((byte,)).decode("cp1252")
    except UnicodeDecodeError:
        return chr(byte)


def _looks_binary(text: str) -> bool:
    head = text[:4096]
    odd = sum(1 for c in head if ord(c) < 32 and c not in "\t\r\n\f\x0b\x1a")
    return bool(head) and odd > 0.1 * len(head)


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
        self._top = Path()

    def main(self, path: Path) -> Deck:
        name = str(path)
        self._top = path.parent
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
                "Raise the bound if this really is a netlist.",
            )
        for start, words in _UNREADABLE:
            if data.lstrip()[:32].startswith(start):
                return self._refuse(
                    name, f"{name} is {words}, not a SPICE netlist.", "Export a SPICE netlist."
                )
        text, how = decode(data)
        if _looks_binary(text):
            return self._refuse(
                name, f"{name} is a binary file, not a SPICE netlist.", "Export a SPICE netlist."
            )
        if how:
            self._remarks.append(Remark(f"{name} was read as {how}.", Location(name, 1)))
        return self.deck(name, text, hashlib.sha256(data).hexdigest(), path)

    def deck(self, name: str, text: str, digest: str, path: Path | None = None) -> Deck:
        self._hash.update(digest.encode())
        self._files.append(name)
        if not text.strip("\x1a\x00 \t\r\n"):
            return self._refuse(name, f"{name} is empty.", "Export the netlist again.")
        title = self._take(
            text, name, titled=not _is_library(name, text), chain=(path,), section=""
        )
        return Deck(
            path=name,
            title=title,
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
    ) -> str:
        if "\x00" in text:
            text = text.replace("\x00", "")
            self._problem("netlist-encoding", f"{name} holds NUL bytes; they are left out.", name)
        text = text.rstrip("\x1a")
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
        self._follow(scanned.lines, chain, section)
        return scanned.title

    def _problem(self, rule: str, message: str, name: str, remedy: str = "", line: int = 1) -> None:
        self._problems.append(
            Problem(rule=rule, message=message, remedy=remedy, location=Location(name, line))
        )

    def _follow(
        self, lines: tuple[Line, ...], chain: tuple[Path | None, ...], section: str
    ) -> None:
        block = ""
        wanted = not section
        for index, line in enumerate(lines):
            word = _word(line.text)
            if block:
                block = "" if word in _BLOCKS[block] else block
                continue
            if section:
                if word == ".lib" and len(line.text.split()) == 2:
                    wanted = _bare(line.text.split()[1]).lower() == section
                    continue
                if word == ".endl":
                    wanted = False
                    continue
            if not wanted:
                continue
            if word in _BLOCKS:
                block = word
            elif word == ".end":
                rest = len(lines) - index - 1
                if rest and len(chain) == 1:
                    self._problem(
                        "netlist-end",
                        f"{rest} card{'s' if rest > 1 else ''} behind .end are not read.",
                        line.file,
                        "Move them before .end.",
                        lines[index + 1].location.line,
                    )
                return
            elif word in (".include", ".inc", ".incl"):
                self._include(line, line.text.split(None, 1)[1:], chain, "")
            elif word == ".lib":
                self._library(line, chain)
            elif word != ".endl":
                self._lines.append(line)

    def _library(self, line: Line, chain: tuple[Path | None, ...]) -> None:
        parts = re.findall(r"\"[^\"]*\"|'[^']*'|\S+", line.text)[1:]
        if not parts:
            return
        if len(parts) == 1:
            self._include(line, parts, chain, "")
        else:
            self._include(line, [" ".join(parts[:-1])], chain, _bare(parts[-1]).lower())

    def _include(
        self, line: Line, named: list[str], chain: tuple[Path | None, ...], section: str
    ) -> None:
        target = _bare(named[0]) if named else ""
        place = line.location
        if not target:
            self._problem("netlist-include", "An include names no file.", line.file, "", place.line)
            return
        told = _chain(chain, line.file)
        if self._root is None or chain[-1] is None:
            self._lost(
                place, f"{target} is not read: a text has no folder to look in.{told}", target
            )
            return
        if len(chain) > self._bounds.include_depth:
            self._problems.append(
                Problem(
                    rule="netlist-bound",
                    message=f"At {target} includes go deeper than {self._bounds.include_depth}.",
                    remedy="Raise the bound if this is meant.",
                    location=place,
                )
            )
            return
        found = _find(self._from, chain[-1].parent, target)
        if found is None:
            self._lost(place, f"{target} is not there.{told}", target)
            return
        real = self._from.real(found)
        if not real.is_relative_to(self._root):
            self._lost(
                place, f"{target} lies outside the deck's folder and is not read.{told}", target
            )
            return
        if any(step is not None and self._from.real(step) == real for step in chain):
            self._lost(place, f"{target} includes itself.{told}", target)
            return
        self._open(found, place, target, chain, section, told)

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
        text, how = decode(data)
        name = str(found)
        if _looks_binary(text) or any(data.lstrip()[:32].startswith(s) for s, _ in _UNREADABLE):
            self._lost(place, f"{target} is no readable netlist.{told}", target)
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
            )
        )


_BLOCKS = {
    ".control": (".endc",),
    ".data": (".enddata",),
    ".machine": (".endmachine",),
    ".aliases": (".endaliases",),
    ".exec": (".endc",),
    ".verilog": (".endv",),
    ".alter": (".end",),
}
_CARD = re.compile(r"(?i)^[RCLVIEGFHDQJMX]\S*\s+\S+\s+\S+\s+[\d.+-]")


def _is_card(title: str) -> bool:
    """Tell whether a title line looks like a card that was meant to be one."""
    return bool(_CARD.match(title)) and len(title.split()) <= 6


def _word(text: str) -> str:
    return text.split(None, 1)[0].lower() if text.startswith(".") else ""


def _bare(word: str) -> str:
    word = word.strip()
    if len(word) >= 2 and word[0] == word[-1] and word[0] in "\"'":
        return word[1:-1].strip()
    return word


def _is_library(name: str, text: str) -> bool:
    suffix = PurePosixPath(name.replace("\\", "/")).suffix.lower()
    if suffix in (".lib", ".mod", ".sub", ".subckt", ".inc", ".model", ".mdl"):
        return True
    first = text.lstrip("\ufeff").split("\n", 1)[0].strip().lower()
    return first.startswith((".subckt", ".model", ".param", ".lib"))


def _find(files: Files, folder: Path, target: str) -> Path | None:
    """Find an included file: as written, with Windows separators, in another case."""
    plain = target.replace("\\", "/")
    if re.match(r"^[A-Za-z]:", plain) or plain.startswith("//"):
        return None
    direct = folder / plain
    if files.is_file(direct):
        return direct
    at = folder if not plain.startswith("/") else Path("/")
    for part in PurePosixPath(plain).parts:
        if part in ("/", "."):
            continue
        if part == "..":
            at = at.parent
            continue
        if not files.is_dir(at):
            return None
        hit = next((name for name in files.names(at) if name.lower() == part.lower()), None)
        if hit is None:
            return None
        at = at / hit
    return at if files.is_file(at) else None


def _chain(chain: tuple[Path | None, ...], file: str) -> str:
    names = [step.name for step in chain if step is not None]
    return f" It is included by {' which is included by '.join(reversed(names)) or file}."
