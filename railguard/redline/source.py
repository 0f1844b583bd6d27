"""A deck's files as bytes, and what edits make of them: encoding and line ends stay.

The deck is read from these bytes alone, so what is reviewed is what is shown and written.
"""

import os
import re
from collections.abc import Iterable, Mapping
from pathlib import Path

import msgspec

from railguard.deck.bounds import Bounds
from railguard.deck.encoding import decode, mend
from railguard.deck.files import Deck, read_deck
from railguard.deck.source import Disk
from railguard.errors import UsageError
from railguard.redline.model import Edit
from railguard.reviewing import DesignReview

_LINE_END = re.compile(r"\r\n|\n|\r")
_MARKS = (
    (b"\xef\xbb\xbf", "utf-8"),
    (b"\xff\xfe", "utf-16-le"),
    (b"\xfe\xff", "utf-16-be"),
    (b"", "utf-8"),
    (b"", "utf-16-le"),
    (b"", "utf-16-be"),
    (b"", "cp1252"),
)
"""Byte order marks and encodings in the order `deck.encoding.decode` tries them."""


class Source(msgspec.Struct, frozen=True):
    """The files of one deck.

    path   of the main deck, as the user gave it
    files  bytes by the name each file has in the circuit
    root   the folder includes must stay below
    """

    path: str
    files: Mapping[str, bytes]
    root: Path

    def deck(self, bounds: Bounds | None = None) -> Deck:
        """Read the deck from these bytes; a file that is not among them is not there."""
        return read_deck(Path(self.path), bounds, self.root, _Tree(self.files))

    def text(self, file: str) -> str:
        """Return a file's text as the reader decodes it."""
        return decode(self.files[file])[0]

    def patched(self, edits: Iterable[Edit]) -> "Source":
        """Return the deck with some edits made."""
        files = dict(self.files)
        wanted = sorted(set(edits))
        for file in dict.fromkeys(edit.file for edit in wanted):
            data = files[file]
            changed = patch(decode(data)[0], [e for e in wanted if e.file == file])
            files[file] = encoded(changed, data)
        return msgspec.structs.replace(self, files=files)


class _Tree(Disk):
    """The files of one deck; folders and links are those of this machine."""

    def __init__(self, files: Mapping[str, bytes]) -> None:
        self._files = files

    def read(self, path: Path, most: int) -> bytes:
        """Return a file's bytes, never more than one over `most`."""
        data = self._files.get(str(path))
        if data is None:
            raise FileNotFoundError(2, "it is no file of this deck", str(path))
        return data[: most + 1]

    def is_file(self, path: Path) -> bool:
        """Tell whether a path is one of the deck's files."""
        return str(path) in self._files


def of_review(found: DesignReview) -> Source | None:
    """Get back the files a review has read; None where they have changed since.

    They are read again from the disk, else taken from the texts the circuit keeps, where those are
    what was read: a netlist given as text, or read from another tree of files. Only files the
    reader was allowed to read are in a circuit's list, so none else is opened.
    """
    circuit = found.design.circuit
    names = tuple(dict.fromkeys(circuit.files))
    if not names:
        return None
    root = Path(os.path.commonpath([str(Path(name).resolve().parent) for name in names]))
    for files in (_from_disk(names), _from_texts(names, circuit.texts)):
        source = Source(circuit.path, files, root)
        if files and source.deck().sha256 == circuit.sha256:
            return source
    return None


def _from_disk(names: tuple[str, ...]) -> dict[str, bytes]:
    try:
        return {name: Path(name).read_bytes() for name in names}
    except OSError:
        return {}


def _from_texts(names: tuple[str, ...], texts: Mapping[str, str]) -> dict[str, bytes]:
    return {name: texts[name].encode() for name in names} if set(names) <= set(texts) else {}


def of_text(text: str, path: str = "deck.cir") -> Source:
    """Take one deck's text as if it stood in a file of its own."""
    return Source(path, {path: text.encode()}, Path.cwd())


def can_be_patched(source: Source, file: str) -> bool:
    """Tell whether a file's text gives its bytes back, so that what is not edited stays."""
    data = source.files.get(file)
    if data is None:
        return False
    text = decode(data)[0]
    if len(mend(text).text) != len(text):
        return False  # characters were left out, so columns are not the file's
    try:
        return encoded(text, data) == data
    except UsageError:
        return False


def line_end(text: str) -> str:
    """Return the line end a text uses most; a line feed where it has none."""
    ends = _LINE_END.findall(text)
    return max(("\n", "\r\n", "\r"), key=ends.count)


def patch(text: str, edits: Iterable[Edit]) -> str:
    """Make edits in a text; new cards take the line ends of the text.

    Raises ValueError: two edits overlap, or one lies outside the text.
    """
    starts = [0, *(m.end() for m in _LINE_END.finditer(text))]
    ends = [*(m.start() for m in _LINE_END.finditer(text)), len(text)]
    end, pieces, at = line_end(text), [], 0
    for edit in sorted(edits):
        begin = starts[edit.line - 1] + edit.column - 1
        if begin < at or begin + edit.length > ends[edit.line - 1]:
            raise ValueError(f"the edit at {edit.location} cannot be made")
        pieces += [text[at:begin], edit.text.replace("\n", end)]
        at = begin + edit.length
    return "".join([*pieces, text[at:]])


def encoded(text: str, like: bytes) -> bytes:
    """Encode a text as a file was that is to be replaced.

    Raises UsageError: the file's own bytes cannot be told from its text.
    """
    before = decode(like)[0]
    for mark, codec in _MARKS:
        if like.startswith(mark) and mark + _encode(before, codec) == like:
            return mark + _encode(text, codec)
    raise UsageError("The encoding of the deck cannot be kept.", None, "Save it as UTF-8 first.")


def _encode(text: str, codec: str) -> bytes:
    if codec != "cp1252":
        return text.encode(codec, "replace")
    # Five bytes are undefined in Windows-1252; the reader takes them as Latin-1.
    return b"".join(
        c.encode("latin-1") if 0x80 <= ord(c) <= 0x9F else c.encode("cp1252", "replace")
        for c in text
    )
