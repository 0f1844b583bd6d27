"""Bytes to text: encodings, what is no netlist, and characters that only look like others."""

import codecs
import re

import msgspec

_UNREADABLE = (
    (b"PK\x03\x04", "a zip archive"),
    (b"\x1f\x8b", "a gzip archive"),
    (b"%PDF", "a PDF document"),
    (b"<?xml", "an XML file"),
    (b"<html", "a web page"),
    (b"<!doctype", "a web page"),
    (b"<binary", "a binary library"),
    (b"\x7felf", "a program"),
    (b"(export", "a board netlist in another format"),
    (b"(kicad", "a schematic or symbol file"),
    (b"(netlist", "a board netlist in another format"),
    (b"(edif", "a board netlist in another format"),
    (b"eeschema", "a schematic or symbol library"),
    (b"version 4\r\nsheet", "a schematic"),
    (b"version 4\nsheet", "a schematic"),
    (b"<qucs", "a schematic or library of another program"),
    (b"v {xschem", "a schematic"),
    (b"`include", "a hardware description"),
    (b"#include <", "a program's source text"),
)
"""How files begin that carry a netlist's suffix and are none; lower-cased."""

_HEX_ROW = re.compile(r"^[*$\s]*[0-9A-Fa-f]{32,}\s*$")
_ENCRYPTED = re.compile(r"(?i)^\W*(begin\s+encrypt|cdnencstart|encrypted)|\$cdnencstart")
_LISTING = re.compile(r"(?im)^(\s*circuit: |doing analysis at temp|\s*no\. of data rows )")


def no_netlist(data: bytes) -> str:
    """Return what a file is, in words, where its bytes tell that it is no netlist; or ""."""
    head = data.removeprefix(b"\xef\xbb\xbf").lstrip()[:48].lower()
    for start, words in _UNREADABLE:
        if head.startswith(start):
            return words
    return ""


def no_netlist_text(text: str) -> str:
    """Return what a text is where its characters tell that it is no netlist; or ""."""
    head = text[:4096]
    odd = sum(1 for c in head if ord(c) < 32 and c not in "\t\r\n\f\x0b\x1a\x00")
    if head.count("\x00") > 0.1 * len(head) or odd > 0.05 * len(head):
        return "a binary file"
    rows = head.split("\n")
    if sum(bool(_HEX_ROW.match(row)) for row in rows) > 0.5 * len(rows) > 2:
        return "an encrypted library"
    if _LISTING.search(head):
        return "a simulator's listing"
    return ""


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
        return data.decode("cp1252", "railguard-latin"), "Windows-1252"


def _latin(error: UnicodeError) -> tuple[str, int]:
    """Give the five bytes that cp1252 leaves undefined the character Latin-1 gives them."""
    if not isinstance(error, UnicodeDecodeError):
        raise error
    return error.object[error.start : error.end].decode("latin-1"), error.end


codecs.register_error("railguard-latin", _latin)


class Mended(msgspec.Struct, frozen=True):
    """A text with its look-alikes replaced.

    found  for each kind that was met: what it is, in words, and the 1-based line it is first on
    """

    text: str
    found: tuple[tuple[str, int], ...] = ()


_LOOK_ALIKES = (
    ("NUL bytes, which are left out", re.compile("\x00"), ""),
    (
        "blanks that are no ASCII blank, read as blanks",
        re.compile("[\u00a0\u2000-\u200a\u202f\u3000]"),
        " ",
    ),
    ("characters without width, which are left out", re.compile("[\u200b\ufeff]"), ""),
    ("a dash for a minus, read as one", re.compile(r"[\u2212\u2013](?=[\d.])"), "-"),
    ("typographic quotes, read as plain ones", re.compile("[\u2018\u2019]"), "'"),
    ("typographic quotes, read as plain ones", re.compile("[\u201c\u201d]"), '"'),
)  # fmt: skip
LOST = "characters lost in an earlier conversion (U+FFFD): a micro or ohm sign may be among them"


def mend(text: str) -> Mended:
    """Replace characters that stand for plain ones; comment lines are left as they are."""
    if text.isascii() and "\x00" not in text:
        return Mended(text)
    found: dict[str, int] = {}
    for words, pattern, plain in _LOOK_ALIKES:
        at = _first(text, pattern)
        if at:
            found.setdefault(words, at)
            text = pattern.sub(plain, text)
    at = _first(text, re.compile("\ufffd"))
    if at:
        found[LOST] = at
    return Mended(text, tuple(found.items()))


def _first(text: str, pattern: re.Pattern[str]) -> int:
    """Return the line of the first match outside comment lines, or 0."""
    for match in pattern.finditer(text):
        start = max(text.rfind(end, 0, match.start()) for end in "\r\n") + 1
        if text[start : match.start()].lstrip()[:1] != "*":
            return 1 + len(re.findall(r"\r\n|\r|\n", text[: match.start()]))
    return 0
