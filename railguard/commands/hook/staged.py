"""What is staged, and whether any netlist can be concerned.

Asked at every commit, so nothing but the standard library is imported, and git's answers are
read as they come. Paths are from the repository's top, with forward slashes.
"""

import os
import re
from collections.abc import Iterable, Iterator
from functools import lru_cache
from typing import NamedTuple

from railguard.commands.hook.git import CANNOT, git
from railguard.deck.suffixes import LIBRARIES, NETLISTS

SETTINGS = "railguard.toml"
CHUNK = 500
"""Paths handed to one git command: a command line has its bounds."""

# Whatever the user has set for their own eyes, git answers us in one form. What was added by
# intent only is not committed.
_PLAIN_DIFF = ("--ignore-submodules=none", "--ita-invisible-in-index")
_PLAIN_GREP = (
    *("--full-name", "--no-color", "--no-line-number", "--no-column", "--no-heading"),
    *("--no-break", "--no-recurse-submodules"),
)

# git compares bytes. In UTF-16 every second one is NUL, which `[^_]` takes and `.` does not.
_CARD = r"\.[^_]?(i[^_]?n[^_]?c|l[^_]?i[^_]?b)"
_INCLUDE = re.compile(r"^\s*\.(?:include|incl|inc|lib)\s+(\S.*)$", re.IGNORECASE)
_WORDS = re.compile(r"\"[^\"]*\"|'[^']*'|\S+")


class Change(NamedTuple):
    """One staged path; `before` is its former name where it was renamed. A tuple: see above."""

    path: str
    before: str


@lru_cache(maxsize=1)
def changes(top: str) -> tuple[Change, ...]:
    """Return what is staged against the commit that is there; against nothing before the first."""
    arguments = ("diff-index", "--cached", "--raw", "-z", "-M", *_PLAIN_DIFF)
    out = git(*arguments, "HEAD", "--", cwd=top, accepted=(0, CANNOT))
    if not out and not has_commit(top):
        nothing = git("hash-object", "-t", "tree", "--stdin", cwd=top).decode().strip()
        out = git(*arguments, nothing, "--", cwd=top)
    return tuple(_parsed(out))


def has_commit(top: str) -> bool:
    """Tell whether there is a commit yet."""
    return bool(git("rev-parse", "-q", "--verify", "HEAD", cwd=top, accepted=(0, 1, CANNOT)))


def _parsed(out: bytes) -> Iterator[Change]:
    fields = iter(os.fsdecode(out).split("\0"))
    for head in fields:
        if not head.startswith(":"):
            continue
        status = head.rsplit(" ", 1)[1]
        path = next(fields)
        before = path
        if status[0] in "RC":
            path = next(fields)
        yield Change(path, before)


def is_netlist(path: str) -> bool:
    """Tell by its name whether a file is a netlist to review."""
    return path.lower().endswith(NETLISTS)


def concerned(top: str, paths: Iterable[str] = ()) -> bool:
    """Tell whether the staged changes can concern any netlist.

    paths  further ones, to be taken as changed
    """
    names = [name for change in changes(top) for name in (change.path, change.before)]
    names += paths
    if not names:
        return False
    if any(is_netlist(name) or name.rsplit("/", 1)[-1] == SETTINGS for name in names):
        return True
    last = {name.rsplit("/", 1)[-1].casefold() for name in names}
    return any(
        not last.isdisjoint(target.casefold().replace("\\", "/").split("/"))
        for targets in include_cards(top).values()
        for target in targets
    )


def include_cards(top: str, paths: Iterable[str] | None = None) -> dict[str, list[str]]:
    """Return which files of the index include what, as their cards write it.

    paths  of the files asked about; None: all that are called netlists or libraries
    """
    if paths is None:
        return _grep(top, [f":(icase)*{suffix}" for suffix in (*NETLISTS, *LIBRARIES)])
    found: dict[str, list[str]] = {}
    listed = [f":(literal){path}" for path in paths]
    for start in range(0, len(listed), CHUNK):
        found |= _grep(top, listed[start : start + CHUNK])
    return found


def _grep(top: str, specs: list[str]) -> dict[str, list[str]]:
    out = git(
        *("grep", "--cached", "-a", "-z", "-i", "-E", *_PLAIN_GREP, "-e", _CARD, "--", *specs),
        cwd=top,
        accepted=(0, 1),
        env={**os.environ, "LC_ALL": "C"},
    )
    found: dict[str, list[str]] = {}
    for row in out.split(b"\n"):
        path, _, text = row.partition(b"\0")
        # a file with the lone CR of old is one line to git
        cards = text.replace(b"\0", b"").decode("utf-8", "replace").split("\r")
        targets = [target for card in cards for target in targets_of(card)]
        if targets:
            found.setdefault(os.fsdecode(path), []).extend(targets)
    return found


def targets_of(card: str) -> Iterator[str]:
    """Yield each file a card may mean: with and without a comment or a section behind it.

    One too many names no file and does no harm.
    """
    match = _INCLUDE.match(card.lstrip("\ufeff"))
    if match is None:
        return
    for whole in dict.fromkeys((match[1].rstrip(), match[1].split(";")[0].rstrip())):
        words = _WORDS.findall(whole)
        yield _bare(whole)
        if len(words) > 1:
            yield _bare(" ".join(words[:-1]))


def _bare(word: str) -> str:
    word = word.strip()
    if len(word) >= 2 and word[0] == word[-1] and word[0] in "\"'":
        return word[1:-1].strip()
    return word
