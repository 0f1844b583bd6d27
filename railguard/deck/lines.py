"""Physical lines to logical lines: comments out, continuations joined, places kept.

A `+` continues the last card, across comments and blank lines; the pieces are joined with one
blank, so no word runs over two lines.
"""

import bisect
import re
from collections.abc import Iterator

import msgspec

from railguard.location import Location
from railguard.notices import Problem, Remark

_LINE_END = re.compile(r"\r\n|\n|\r")
_DIRECTIVE = re.compile(r"^\*\s*railguard\s*:\s*(.*)$", re.IGNORECASE)
_PIN_NAMES = re.compile(r";\s*§pnba\s+(.*)$")
_COMMENT = re.compile(r";|(?:(?<=[\s,])|^)\$(?=\s|$)|(?:(?<=\s)|^)//")
_FILE_CARD = re.compile(r"^\s*\.(?:inc|include|lib)\b", re.IGNORECASE)


LADDER = 16
"""Comment lines kept on either side of a card: no connection ladder is longer."""


class Line(msgspec.Struct, frozen=True):
    """One logical line.

    text      the joined pieces, comments removed
    starts    offsets in `text` at which each piece begins
    places    (line, column) of each piece's first character
    note      pin names written behind the card (`;§pnba`), or ""
    comments  lines above and below the card, for connection ladders
    """

    file: str
    text: str
    starts: tuple[int, ...]
    places: tuple[tuple[int, int], ...]
    note: str = ""
    comments: tuple[str, ...] = ()

    def at(self, offset: int = 0, length: int = 0) -> Location:
        """Return the place of a character of `text`."""
        piece = bisect.bisect_right(self.starts, offset) - 1
        line, column = self.places[piece]
        return Location(self.file, line, column + offset - self.starts[piece], length)

    @property
    def location(self) -> Location:
        """The place of the whole card."""
        line, column = self.places[0]
        return Location(self.file, line, column, len(self.text))


class Scanned(msgspec.Struct, frozen=True):
    """The logical lines of one file, and what stood between them."""

    title: str
    lines: tuple[Line, ...]
    directives: tuple[tuple[str, Location], ...]
    problems: tuple[Problem, ...]
    remarks: tuple[Remark, ...]


def physical_lines(text: str) -> list[str]:
    """Split at CRLF, LF and lone CR only; other separators belong to names and comments."""
    return _LINE_END.split(text)


def strip_comment(text: str) -> str:
    """Cut a trailing comment off: `;`, `$` between blanks, `//` behind a blank.

    Quotes protect; on `.include` and `.lib` cards `//` and `$` may be part of the file's name.
    """
    if ";" not in text and "$" not in text and "//" not in text:
        return text
    named = _FILE_CARD.match(text) is not None
    start = 0
    while (found := _COMMENT.search(text, start)) is not None:
        head = text[: found.start()]
        quoted = head.count('"') % 2 or head.count("'") % 2
        if not quoted and not (named and found[0] != ";"):
            return head
        start = found.end()
    return text


class _Assembler:
    def __init__(self, file: str) -> None:
        self.file = file
        self.done: list[Line] = []
        self.directives: list[tuple[str, Location]] = []
        self.problems: list[Problem] = []
        self.remarks: list[Remark] = []
        self._pieces: list[str] = []
        self._places: list[tuple[int, int]] = []
        self._note = ""
        self._above: list[str] = []
        self._comments: list[str] = []
        self._open = False

    def comment(self, text: str, number: int) -> None:
        found = _DIRECTIVE.match(text.strip())
        if found is not None:
            self.directives.append((found[1], Location(self.file, number, 1, len(text))))
        self._comments.append(text.strip().lstrip("*").strip())

    def card(self, text: str, number: int, column: int, note: str) -> None:
        self.flush()
        # Comments between two cards may speak of either: a connection ladder stands above its
        # header as often as below.
        self._above, self._comments = self._comments, []
        self._pieces, self._places, self._note, self._open = [text], [(number, column)], note, True

    def more(self, text: str, number: int, column: int) -> None:
        if not self._open:
            self.problems.append(
                Problem(
                    rule="netlist-continuation",
                    message=f"A continuation (+) on line {number} has no card before it.",
                    remedy="Put the + behind the card it continues.",
                    location=Location(self.file, number, column, len(text)),
                )
            )
            return
        if text.lstrip().startswith("*"):
            self.problems.append(
                Problem(
                    rule="netlist-continuation",
                    message=f"Line {number} continues a card with a comment (+*); it is left out.",
                    remedy="Start a comment line with * alone.",
                    location=Location(self.file, number, column, len(text)),
                )
            )
            return
        if text:
            self._pieces.append(text)
            self._places.append((number, column))

    def close(self) -> None:
        """End the current card so that nothing can continue it."""
        self.flush()
        self._open = False

    def flush(self) -> None:
        if not self._pieces:
            return
        starts, at = [], 0
        for piece in self._pieces:
            starts.append(at)
            at += len(piece) + 1
        self.done.append(
            Line(
                self.file,
                " ".join(self._pieces),
                tuple(starts),
                tuple(self._places),
                self._note,
                (*self._above[-LADDER:], *self._comments[:LADDER]),
            )
        )
        self._pieces, self._places, self._note = [], [], ""


def scan(text: str, file: str, titled: bool) -> Scanned:
    """Turn a file's text into logical lines.

    titled  True for a main deck: its first line is the title, whatever it looks like
    """
    build = _Assembler(file)
    raw = physical_lines(text)
    title, first = "", 0
    if titled and raw:
        title, first = raw[0].strip(), 1
        word = title.split(None, 1)[0].lower() if title else ""
        if word.startswith(".") and word != ".title":
            title, first = "", 0
        elif word.startswith("*"):
            build.comment(title, 1)
            title = title.lstrip("*").strip()
        elif word == ".title":
            title = title[len(".title") :].strip()
    joined = ""
    for number, line in _numbered(raw, first):
        stripped = line.lstrip()
        if joined and stripped:
            build.more(strip_comment(line).strip(), number, len(line) - len(stripped) + 1)
            joined = ""
            continue
        if not stripped:
            continue
        head = stripped[0]
        if head in "*#":
            build.comment(stripped, number)
            continue
        note = _PIN_NAMES.search(stripped)
        body = strip_comment(stripped)
        column = len(line) - len(stripped) + 1
        if body.rstrip().endswith("\\\\"):
            body, joined = body.rstrip()[:-2], "more"
        if head == "+":
            rest = body[1:]
            indent = len(rest) - len(rest.lstrip())
            build.more(rest.strip(), number, column + 1 + indent)
        elif body.strip():
            build.card(body.rstrip(), number, column, note[1] if note else "")
            if _FILE_CARD.match(body):
                build.close()
    build.flush()
    return Scanned(
        title, tuple(build.done), tuple(build.directives), tuple(build.problems),
        tuple(build.remarks),
    )  # fmt: skip


def _numbered(raw: list[str], first: int) -> Iterator[tuple[int, str]]:
    for index in range(first, len(raw)):
        yield index + 1, raw[index]
