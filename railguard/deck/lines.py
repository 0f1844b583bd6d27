"""Physical lines to logical lines: comments out, continuations joined, places kept.

A `+` continues the last card, across comments and blank lines; the pieces are joined with one
blank, so no word runs over two lines.
"""

import bisect
import re
import sys

import msgspec

from railguard.location import Location
from railguard.notices import Problem, Remark

_DIRECTIVE = re.compile(r"^\*\s*railguard\s*:\s*(.*)$", re.IGNORECASE)
_PIN_NAMES = re.compile(r";\s*§pnba\s+(.*)$")
_COMMENT = re.compile(r";|(?:(?<=[\s,])|^)\$(?=\s|$)|(?:(?<=\s)|^)//")
_FILE_CARD = re.compile(r"^\s*\.(?:incl?|include|lib)\b", re.IGNORECASE)
_HEADER = (".s", ".S", ".m", ".M")
_MARKS = (";", "$", "//", "\\\\")
_MARKS_READ = {
    "#": "A line that begins with # is a comment here; ngspice stops at it.",
    "//": "// behind a blank begins a comment here and in ngspice, in no other program.",
    "a//b": "// inside a name belongs to it here; ngspice cuts the line off there.",
    "$a": "A $ before a name belongs to it here, as in PSpice; ngspice and HSPICE take the rest of "
    "the line for a comment.",
}
"""What is said once of a file for marks that other programs read otherwise."""
_LETTERS = frozenset("ABCDEFGHIJKLMNOPQRSTUVWXYZabcdefghijklmnopqrstuvwxyz")

LADDER = 16
"""Comment lines kept on either side of a header: no connection ladder is longer."""


class Line(msgspec.Struct, frozen=True, gc=False):
    """One logical line.

    text      the joined pieces, comments removed
    number    physical line of its first character, from 1
    column    column of its first character, from 1
    pieces    of a continued card: (offset in `text`, line, column) of every piece behind the first
    note      pin names written behind the card (`;§pnba`), or ""
    comments  of a subcircuit's header: the lines above and below it, for connection ladders
    """

    file: str
    text: str
    number: int
    column: int = 1
    pieces: tuple[tuple[int, int, int], ...] = ()
    note: str = ""
    comments: tuple[str, ...] = ()

    def at(self, offset: int = 0, length: int = 0) -> Location:
        """Return the place of a character of `text`."""
        start, number, column = 0, self.number, self.column
        piece = bisect.bisect_right(self.pieces, (offset, sys.maxsize, 0))
        if piece:
            start, number, column = self.pieces[piece - 1]
        return Location(self.file, number, column + offset - start, length)

    @property
    def location(self) -> Location:
        """The place of the card: of its first line, where it runs over several."""
        end = self.pieces[0][0] - 1 if self.pieces else len(self.text)
        return Location(self.file, self.number, self.column, end)


class Scanned(msgspec.Struct, frozen=True):
    """The logical lines of one file, and what stood between them."""

    title: str
    lines: tuple[Line, ...]
    directives: tuple[tuple[str, Location], ...]
    problems: tuple[Problem, ...]
    remarks: tuple[Remark, ...]


def physical_lines(text: str) -> list[str]:
    """Split at CRLF, LF and lone CR only; other separators belong to names and comments."""
    if "\r" in text:
        text = text.replace("\r\n", "\n").replace("\r", "\n")
    return text.split("\n")


def strip_comment(text: str) -> str:
    """Cut a trailing comment off: `;`, `$` between blanks, `//` behind a blank.

    Quotes protect; on `.include` and `.lib` cards `//` and `$` may be part of the file's name.
    """
    if ";" not in text and "$" not in text and "//" not in text:
        return text
    named = _FILE_CARD.match(text) is not None
    double = single = start = 0
    for found in _COMMENT.finditer(text):
        double += text.count('"', start, found.start())
        single += text.count("'", start, found.start())
        start = found.start()
        if not (double % 2 or single % 2) and not (named and found[0] != ";"):
            return text[:start]
    return text


class _Assembler:
    def __init__(self, file: str) -> None:
        self.file = file
        self.done: list[Line] = []
        self.directives: list[tuple[str, Location]] = []
        self.problems: list[Problem] = []
        self.remarks: list[Remark] = []
        self.comments: dict[int, list[str]] = {}
        self.odd: dict[str, int] = {}
        self.waiting: list[tuple[str, int, int]] = []
        self.open = False

    def comment(self, text: str, number: int) -> None:
        found = _DIRECTIVE.match(text.strip())
        if found is not None:
            self.directives.append((found[1], Location(self.file, number, 1, len(text))))
        before = self.comments.setdefault(len(self.done), [])
        before.append(text.strip().lstrip("*").strip())

    def card(self, text: str, number: int, column: int, note: str) -> None:
        if self.waiting:
            self.join()
        self.done.append(Line(self.file, text, number, column, (), note))
        self.open = _FILE_CARD.match(text) is None

    def more(self, text: str, number: int, column: int, starred: bool = False) -> None:
        if not self.open:
            self._problem(
                f"A continuation (+) on line {number} has no card before it.",
                "Put the + behind the card it continues.",
                Location(self.file, number, column, len(text)),
            )
        elif starred:
            self._problem(
                f"Line {number} continues a card with a comment (+*); it is left out.",
                "Start a comment line with * alone.",
                Location(self.file, number, column, len(text)),
            )
        elif text:
            self.waiting.append((text, number, column))

    def _problem(self, message: str, remedy: str, place: Location) -> None:
        self.problems.append(
            Problem(rule="netlist-continuation", message=message, remedy=remedy, location=place)
        )

    def note_marks(self, line: str, body: str, number: int) -> None:
        """Note the first use of marks that are comments to some programs and names to others."""
        if line[len(body) :].lstrip().startswith("//"):
            self.odd.setdefault("//", number)
        if _FILE_CARD.match(body) is None:
            if "//" in body:
                self.odd.setdefault("a//b", number)
            if " $" in body:
                self.odd.setdefault("$a", number)

    def join(self) -> None:
        """Put the continuations that were met behind their card."""
        if not self.waiting:
            return
        last = self.done[-1]
        texts, pieces, at = [last.text], [], len(last.text) + 1
        for text, number, column in self.waiting:
            texts.append(text)
            pieces.append((at, number, column))
            at += len(text) + 1
        self.done[-1] = Line(
            self.file, " ".join(texts), last.number, last.column, tuple(pieces), last.note
        )
        self.waiting = []

    def finish(self) -> tuple[Line, ...]:
        """Return the logical lines; headers of subcircuits get the comments round them.

        Comments between two cards may speak of either: a connection ladder stands above its header
        as often as below.
        """
        self.join()
        for mark, number in self.odd.items():
            self.problems.append(
                Problem(
                    rule="netlist-other-dialect",
                    message=_MARKS_READ[mark],
                    location=Location(self.file, number),
                )
            )
        for at in range(len(self.done)) if self.comments else ():
            line = self.done[at]
            if line.text.startswith(_HEADER):
                above, below = self.comments.get(at, []), self.comments.get(at + 1, [])
                round_it = (*above[-LADDER:], *below[:LADDER])
                self.done[at] = msgspec.structs.replace(line, comments=round_it)
        return tuple(self.done)


def scan(text: str, file: str, titled: bool) -> Scanned:
    """Turn a file's text into logical lines.

    titled  True for a main deck: its first line is the title, whatever it looks like
    """
    build = _Assembler(file)
    done = build.done
    raw = physical_lines(text)
    title, first = _title(raw[0], build) if titled else ("", 0)
    marked = any(mark in text for mark in _MARKS)
    joined = False
    for number, line in enumerate(raw[first:], first + 1):
        # Most lines are whole cards without any comment: nothing to look at but the letter.
        if (
            line[:1] in _LETTERS
            and not joined
            and not (marked and any(mark in line for mark in _MARKS))
        ):
            if build.waiting:
                build.join()
            done.append(Line(file, line.rstrip(), number))
            build.open = True  # no file card begins with a letter
            continue
        stripped = line.lstrip()
        if not stripped:
            continue
        column = len(line) - len(stripped) + 1
        if joined:
            joined = False
            stripped = f"+{stripped}"
            column -= 1
        if stripped[0] in "*#":
            build.comment(stripped, number)
            if stripped[0] == "#":
                build.odd.setdefault("#", number)
            continue
        note = _PIN_NAMES.search(stripped) if marked else None
        body = (strip_comment(stripped) if marked else stripped).rstrip()
        if marked and ("$" in stripped or "//" in stripped):
            build.note_marks(stripped, body, number)
        if marked and body.endswith("\\\\"):
            body, joined = body[:-2].rstrip(), True
        if body == ")":
            body = "+)"  # a .model closed on a line of its own
        if body[:1] == "+":
            rest = body[1:]
            at = column + 1 + len(rest) - len(rest.lstrip())
            # `+* remark` was meant as a comment; `+ * 2` goes on with a product.
            build.more(rest.strip(), number, at, starred=rest[:1] == "*")
        elif body:
            build.card(body, number, column, note[1] if note else "")
    return Scanned(
        title, build.finish(), tuple(build.directives), tuple(build.problems),
        tuple(build.remarks),
    )  # fmt: skip


def _title(line: str, build: _Assembler) -> tuple[str, int]:
    """Return a main deck's title and how many lines it takes: none where it is a dot card."""
    title = line.strip()
    word = title.split(None, 1)[0].lower() if title else ""
    if word == ".title":
        return title[len(".title") :].strip(), 1
    if word.startswith("."):
        return "", 0
    if word.startswith("*"):
        build.comment(title, 1)
        return title.lstrip("*").strip(), 1
    return title, 1
