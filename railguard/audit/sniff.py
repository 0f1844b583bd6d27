"""Whether a file is a netlist, by its ending and by what stands in it.

A file of a netlist's ending is taken for one unless its content says otherwise; a file of any
other ending has to look like one.
"""

import re
from pathlib import PurePosixPath
from typing import Literal

from railguard.deck.encoding import decode
from railguard.deck.lines import physical_lines

Sort = Literal["netlist", "library", "other"]

SURE = frozenset({".cir", ".sp", ".spice", ".ckt", ".net"})
"""Endings of netlists: what such a file holds is reported even where it cannot be read."""

LIBRARIES = frozenset({".lib", ".inc", ".mod", ".sub", ".mdl"})
"""Endings that other trades use too: their content decides."""

ARCHIVES = (".zip", ".tar", ".tgz", ".gz", ".tbz2", ".bz2", ".txz", ".xz")

_HOPELESS = """
7z avi bmp c chm class cpp css dll doc docx dwg dxf exe gif h hpp html ico iso jar java jpeg jpg js
json mp3 mp4 msi o odt pdf png ppt pptx ps py pyc rar raw so sqlite sqlite-wal sqlite-shm step stl
stp svg tif tiff ttf wav woff xls xlsx xml
"""
HOPELESS = frozenset(f".{word}" for word in _HOPELESS.split())
"""Endings that are not even opened."""

HEAD = 4096
"""Bytes in which a NUL tells a binary file."""

CARDS = 400
"""Cards by which it is decided whether a text is a netlist."""

_ELEMENT = re.compile(
    r"""(?ix)^(?:
        [RCL][\w.#:-]{0,40}\s+[^\s=]+\s+[^\s=]+\s+(?:['"{\d.+-]|[RCL]=|\w+\s*$)   # value or model
      | [VI][\w.#:-]{0,40}\s+[^\s=]+\s+[^\s=]+\s+(?:[{'\d.+-]|DC\b|AC\b|SIN|PULSE|PWL|EXP|SFFM)
      | [EGFHB][\w.#:-]{0,40}\s+\S+\s+\S+\s+\S.*
      | [DQJM][\w.#:-]{0,40}\s+\S+\s+\S+\s+\w\S*.*
      | (?:X|U|IC)[\w.#:-]{0,40}(?:\s+\S+){3,}
      )"""
)
_DESIGNATOR = re.compile(r"^[A-Za-z]{1,3}[A-Za-z_]{0,8}\d|^[A-Za-z]{1,4}$|^[A-Za-z][A-Z_0-9]+$")
_DOT = re.compile(
    r"(?i)^\.(?:subckt|ends|model|param|include|inc|lib|endl|end|tran|ac|dc|op|noise|options?|temp|"
    r"control|endc|global|nodeset|ic|save|print|plot|probe|meas\w*|func|title|step|backanno)\b"
)
_STARTS_CIRCUIT = re.compile(r"(?i)^\.subckt\b")
_RUNS = re.compile(r"(?i)^\.(?:tran|ac|dc|op|noise)\b")
_ENDS_CIRCUIT = re.compile(r"(?i)^\.ends\b")

FEWEST = 3
"""Cards an unknown file must have to count as a netlist."""

LARGEST_REST = 0.4
"""Share of lines that may be neither card nor dot card in one."""


def suffix(path: str) -> str:
    """Return a file's ending, lower-cased."""
    return PurePosixPath(path).suffix.lower()


def is_archive(path: str) -> bool:
    """Tell by its ending whether a file is an archive."""
    return suffix(path) in ARCHIVES


def worth_opening(path: str) -> bool:
    """Tell by its ending whether a file may be a netlist at all."""
    return suffix(path) not in HOPELESS


def sort_of(path: str, data: bytes) -> Sort:
    """Say what a file is.

    data  its bytes, or as many as the bound on netlists lets through
    """
    end = suffix(path)
    if b"\0" in data[:HEAD] and decode(data[:HEAD])[1] == "":
        return "netlist" if end in SURE else "other"
    seen = _Seen(decode(data)[0])
    if end in SURE:
        return "library" if seen.cards and not seen.circuit else "netlist"
    known = seen.cards + seen.dots
    if not known or seen.rest > LARGEST_REST * (known + seen.rest):
        return "other"
    if end not in LIBRARIES and known < FEWEST:
        return "other"
    if end not in LIBRARIES and (not seen.cards or not seen.dots) and seen.cards < 2 * FEWEST:
        return "other"
    return "netlist" if seen.circuit else "library"


class _Seen:
    """What stands in a text.

    cards, dots, rest  element cards, dot cards and other lines among the first `CARDS`
    circuit            anything of a circuit or a run outside of subcircuits, in the whole text
    """

    def __init__(self, text: str) -> None:
        self.cards = self.dots = self.rest = 0
        self.circuit = False
        self._depth = 0
        for number, line in enumerate(physical_lines(text)):
            word = line.strip()
            if not word or word[0] in "*+;#$":
                continue
            if self.cards + self.dots + self.rest < CARDS:
                self._count(word, titled=not number)
            elif self.circuit:
                return
            self._place(word, titled=not number)

    def _count(self, word: str, titled: bool) -> None:
        if word[0] == ".":
            known = _DOT.match(word) is not None
            self.dots += known
            self.rest += not known
        elif _is_card(word):
            self.cards += 1
        elif not titled:
            self.rest += 1

    def _place(self, word: str, titled: bool) -> None:
        if word[0] == ".":
            self._depth += _STARTS_CIRCUIT.match(word) is not None
            self._depth -= _ENDS_CIRCUIT.match(word) is not None
            self.circuit |= _RUNS.match(word) is not None
        elif self._depth <= 0 and not titled:
            self.circuit |= _is_card(word)


def _is_card(word: str) -> bool:
    return bool(_ELEMENT.match(word) and _DESIGNATOR.match(word.split(None, 1)[0]))
