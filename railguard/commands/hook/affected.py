"""Which netlists a commit concerns: those that changed, and those that rest on what changed."""

import os
import posixpath
import re
from collections.abc import Iterable, Iterator, Mapping
from pathlib import Path
from typing import NamedTuple

from railguard.commands.hook.git import CANNOT, git, one_line
from railguard.commands.hook.staged import (
    SETTINGS,
    Change,
    changes,
    include_cards,
    is_netlist,
)
from railguard.commands.hook.tree import FILE, Tree

_HEAD_NAME = re.compile(r"GITHEAD_([0-9a-f]{40,64})$")


class Concerned(NamedTuple):
    """A netlist to review; `before` is its former path where it was renamed."""

    path: str
    before: str


def concerned_netlists(index: Tree, paths: Iterable[str] = ()) -> list[Concerned]:
    """Return the netlists of the index that the staged changes concern, in order of their paths.

    paths  further ones, to be taken as changed
    """
    staged = changes(index.top)
    changed = {name.casefold() for change in staged for name in (change.path, change.before)}
    changed.update(path.casefold() for path in paths)
    reached = _with_includers(index, changed)
    folders = [path.rpartition("/")[0] for path in changed if _name(path) == SETTINGS]
    renamed = _renamed(staged)
    return [
        Concerned(path, renamed.get(path, path))
        for path, entry in sorted(index.entries.items())
        if is_netlist(path)
        and entry.mode.startswith(FILE)
        and (path.casefold() in reached or _is_below(path, folders))
    ]


def _name(path: str) -> str:
    return path.rsplit("/", 1)[-1]


def _is_below(path: str, folders: Iterable[str]) -> bool:
    whole = path.casefold()
    return any(not folder or whole.startswith(f"{folder}/") for folder in folders)


def _renamed(staged: Iterable[Change]) -> Mapping[str, str]:
    return {change.path: change.before for change in staged}


def _with_includers(index: Tree, changed: set[str]) -> set[str]:
    """Return the changed paths and all files that include one of them, directly or not.

    Paths are casefolded: an include may be written in another case.
    """
    if not changed:
        return set()
    includers: dict[str, set[str]] = {}
    cards = include_cards(index.top)
    seen = set(cards)
    while cards:
        further = set()
        for path, targets in cards.items():
            for target in targets:
                for key, real in _names_of(index, path, target):
                    includers.setdefault(key, set()).add(path)
                    if real is not None and real not in seen and real in index.entries:
                        further.add(real)
        seen |= further
        # what is included need not be called a library
        cards = include_cards(index.top, sorted(further))
    reached, rim = set(changed), set(changed)
    while rim:
        rim = {path.casefold() for key in rim for path in includers.get(key, ())} - reached
        reached |= rim
    return reached


def _names_of(index: Tree, path: str, target: str) -> Iterator[tuple[str, str | None]]:
    """Yield the names by which an included file may stand among the changed paths.

    As written and as found, each with the folders it is in: one of them may be a symbolic link
    or a submodule. A file that was deleted is found by its name as written.
    """
    folder = posixpath.dirname(path)
    written = posixpath.normpath(posixpath.join(folder, target.replace("\\", "/")))
    real = index.find(folder, target)
    for name in dict.fromkeys((written, real or written)):
        parts = name.casefold().split("/")
        for count in range(1, len(parts) + 1):
            yield "/".join(parts[:count]), real if name == real else None


def parents(top: str, environ: Mapping[str, str] = os.environ) -> list[str]:
    """Return the commits that the one to be made follows; several where it is a merge.

    While a merge runs its hook, git names the merged commits in the environment only; when a
    person commits a merge that had conflicts they stand in a file.
    """
    head = git("rev-parse", "-q", "--verify", "HEAD", cwd=top, accepted=(0, 1, CANNOT))
    found = [head.decode().strip()] if head else []
    place = Path(top, one_line("rev-parse", "--git-path", "MERGE_HEAD", cwd=top))
    if place.is_file():
        found += place.read_text(encoding="ascii").split()
    else:
        matches = (_HEAD_NAME.match(name) for name in environ)
        found += sorted(match[1] for match in matches if match)
    return list(dict.fromkeys(found))
