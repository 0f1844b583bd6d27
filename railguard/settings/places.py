"""Where each key of a TOML text stands: `tomllib` gives values without their lines.

Only for a text that `tomllib` has read without complaint: this scanner tells keys from values
and trusts the rest.
"""

import re
import tomllib
from bisect import bisect_right

from railguard.location import Location

Path = tuple[str | int, ...]
"""The way to a value: `("waivers", 0, "rule")`."""

_BLANK = re.compile(r"(?:[ \t\r\n]|#[^\n]*)*")
_PART = re.compile(
    r"""[ \t]*(?P<part>[A-Za-z0-9_-]+|"(?:[^"\\\n]|\\.)*"|'[^'\n]*')[ \t]*(?P<dot>\.?)"""
)
_STRING = re.compile(
    r'''"""(?:[^\\]|\\.)*?"{3,5}|\'\'\'.*?'{3,5}|"(?:[^"\\\n]|\\.)*"|'[^'\n]*\'''', re.DOTALL
)
_PLAIN = re.compile(r"[^,\]}\n#]*")


def places(text: str, name: str) -> dict[Path, Location]:
    """Return the place of every key, table and array entry of a TOML text."""
    return _Scanner(text, name).scan()


class _Scanner:
    """Walks once over a TOML text; `at` is the next character to read."""

    def __init__(self, text: str, name: str) -> None:
        self.text = text
        self.name = name
        self.at = 0
        self.found: dict[Path, Location] = {}
        self.entries: dict[Path, int] = {}
        self.starts = [0, *(m.end() for m in re.finditer("\n", text))]

    def scan(self) -> dict[Path, Location]:
        table: Path = ()
        self._blank()
        while self.at < len(self.text):
            if self.text[self.at] == "[":
                table = self._header()
            else:
                self._pair(table)
            self._blank()
        return self.found

    def _blank(self) -> None:
        match = _BLANK.match(self.text, self.at)
        self.at = match.end() if match else self.at

    def _mark(self, path: Path, start: int, stop: int) -> None:
        line = bisect_right(self.starts, start)
        column = start - self.starts[line - 1] + 1
        self.found.setdefault(path, Location(self.name, line, column, stop - start))

    def _key(self) -> list[tuple[str, int, int]]:
        """Read a dotted key: its parts, each with where it begins and ends."""
        parts: list[tuple[str, int, int]] = []
        while match := _PART.match(self.text, self.at):
            self.at = match.end()
            part = match["part"]
            if part[0] in "\"'":
                part = str(tomllib.loads(f"key = {part}")["key"])
            parts.append((part, match.start("part"), match.end("part")))
            if not match["dot"]:
                break
        return parts

    def _within(self, path: Path) -> Path:
        """Go into the newest entry where `path` is an array of tables."""
        return (*path, self.entries[path]) if path in self.entries else path

    def _header(self) -> Path:
        array = self.text.startswith("[[", self.at)
        self.at += 2 if array else 1
        path: Path = ()
        start = stop = self.at
        for part, start, stop in self._key():
            path = (*self._within(path), part)
            self._mark(path, start, stop)
        if array:
            self.entries[path] = self.entries.get(path, -1) + 1
            self._mark(self._within(path), start, stop)
        self.at += 2 if array else 1
        return self._within(path)

    def _pair(self, table: Path) -> None:
        path = table
        for part, start, stop in self._key():
            path = (*path, part)
            self._mark(path, start, stop)
        self.at += 1  # the equals sign
        self._value(path)

    def _value(self, path: Path) -> None:
        self._blank()
        character = self.text[self.at]
        if character == "[":
            self._array(path)
        elif character == "{":
            self._inline(path)
        else:
            shape = _STRING if character in "\"'" else _PLAIN
            match = shape.match(self.text, self.at)
            self.at = match.end() if match else len(self.text)

    def _array(self, path: Path) -> None:
        self.at += 1
        index = 0
        while True:
            self._blank()
            if self.text[self.at] == "]":
                break
            start = self.at
            self._value((*path, index))
            self._mark((*path, index), start, self.at)
            index += 1
            self._comma()
        self.at += 1

    def _inline(self, path: Path) -> None:
        self.at += 1
        while True:
            self._blank()
            if self.text[self.at] == "}":
                break
            self._pair(path)
            self._comma()
        self.at += 1

    def _comma(self) -> None:
        self._blank()
        if self.text[self.at] == ",":
            self.at += 1
