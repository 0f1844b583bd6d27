"""The unified diff of a redline: one hunk after the other, each with its reasons.

Form: POSIX diff -u. A reason stands behind a hunk's range, where the format leaves room for a
heading, so that `patch` takes the whole as it is.
"""

import re
from collections.abc import Iterator
from difflib import SequenceMatcher

from railguard.redline.model import Changed

CONTEXT = 3
"""Lines left standing round a change, as diff -u has them."""
_LINE = re.compile(r"[^\r\n]*(?:\r\n|\r|\n)?")


def unified(files: tuple[Changed, ...]) -> str:
    """Return the diff of all changed files; "" where none is."""
    return "".join(piece for file in files for piece in _file(file))


def _file(changed: Changed) -> Iterator[str]:
    before, after = _lines(changed.before), _lines(changed.after)
    yield f"--- {_name(changed.file)}\n+++ {_name(changed.file)}\n"
    matcher = SequenceMatcher(None, before, after, autojunk=False)
    for group in matcher.get_grouped_opcodes(CONTEXT):
        first, last = group[0], group[-1]
        old, new = _range(first[1], last[2]), _range(first[3], last[4])
        touched = {j + 1 for tag, _, _, j1, j2 in group if tag != "equal" for j in range(j1, j2)}
        reasons = dict.fromkeys(r for number, r in changed.reasons if number in touched)
        heading = f" {'; '.join(reasons)}" if reasons else ""
        yield f"@@ -{old} +{new} @@{_visible(heading)}\n"
        for tag, i1, i2, j1, j2 in group:
            if tag == "equal":
                yield from (_shown(" ", line) for line in before[i1:i2])
                continue
            yield from (_shown("-", line) for line in before[i1:i2])
            yield from (_shown("+", line) for line in after[j1:j2])


def _lines(text: str) -> list[str]:
    return [m for m in _LINE.findall(text) if m]


def _range(start: int, stop: int) -> str:
    length = stop - start
    if length == 1:
        return str(start + 1)
    return f"{start if not length else start + 1},{length}"


def _shown(mark: str, line: str) -> str:
    """Return one line of the diff; a lone CR ends a line as a line feed does."""
    body = line.rstrip("\r\n")
    end = "\r\n" if line.endswith("\r\n") else "\n"
    missing = "" if line != body else "\\ No newline at end of file\n"
    return f"{mark}{body}{end}{missing}"


def _name(file: str) -> str:
    return _visible(file)


def _visible(text: str) -> str:
    """Show what would steer a terminal or break the diff's lines as a question mark."""
    return "".join(c if c.isprintable() else "?" for c in text)
