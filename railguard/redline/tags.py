"""Which line of a changed deck is there for which reason, while one edit is laid over another."""

from collections.abc import Iterable

from railguard.redline.model import Edit
from railguard.redline.source import Source, patch


class Tagged:
    """The lines of a deck's files, each with the reasons it was changed for."""

    def __init__(self, source: Source) -> None:
        """Take the deck as it was, without any reason."""
        self._lines = {
            file: [(text, ()) for text in _lines(source.text(file))] for file in source.files
        }  # type: dict[str, list[tuple[str, tuple[str, ...]]]]

    def edit(self, edits: Iterable[Edit], reason: str) -> None:
        """Make edits and note their reason on every line they change or add."""
        wanted = sorted(set(edits))
        for file in dict.fromkeys(e.file for e in wanted):
            own = {
                number: [e for e in wanted if e.file == file and e.line == number]
                for number in dict.fromkeys(e.line for e in wanted if e.file == file)
            }
            lines: list[tuple[str, tuple[str, ...]]] = []
            for number, (text, reasons) in enumerate(self._lines[file], start=1):
                if number not in own:
                    lines.append((text, reasons))
                    continue
                here = [Edit(e.file, 1, e.column, e.length, e.text) for e in own[number]]
                for made in patch(text, here).split("\n"):
                    known = reasons if made == text else (*reasons, reason)
                    lines.append((made, tuple(dict.fromkeys(known))))
            self._lines[file] = lines

    def reasons(self, file: str) -> tuple[tuple[int, str], ...]:
        """Return (line number, reason) of every line that has one."""
        return tuple(
            (number, reason)
            for number, (_, reasons) in enumerate(self._lines[file], start=1)
            for reason in reasons
        )


def _lines(text: str) -> list[str]:
    return text.replace("\r\n", "\n").replace("\r", "\n").split("\n")
