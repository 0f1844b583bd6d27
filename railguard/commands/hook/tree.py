"""The files of the index, or of a commit, as git keeps them: names resolved, contents read.

Nothing here looks at the working tree. Paths are from the repository's top, with forward slashes.
"""

import os
import posixpath
import re
from collections.abc import Iterable, Iterator
from functools import cached_property
from pathlib import Path
from secrets import token_hex
from typing import NamedTuple

from railguard.commands.hook.git import CANNOT, elsewhere, git
from railguard.commands.hook.staged import SETTINGS

FILE, LINK, SUBMODULE = "100", "120", "160"
"""How the mode of a file, a symbolic link and a submodule begins."""

LINKS = 16
"""Symbolic links followed one after the other; more is a circle."""

_DRIVE = re.compile(r"[A-Za-z]:")


class Entry(NamedTuple):
    """One path: its mode, and the name of its content."""

    mode: str
    content: str


class Tree:
    """The index (`commit` None) or one commit of the repository at `top`."""

    def __init__(self, top: str, commit: str | None = None) -> None:
        self.top = top
        self.commit = commit
        self._modules: dict[str, Tree | None] = {}
        self._texts: dict[str, str] = {}

    @cached_property
    def entries(self) -> dict[str, Entry]:
        """Every path with its entry; unmerged ones are left out."""
        if self.commit is None:
            listing = git("ls-files", "-s", "-z", cwd=self.top)
            return dict(_listed(listing, content=1))
        listing = git("ls-tree", "-r", "-z", "--full-tree", self.commit, cwd=self.top)
        return dict(_listed(listing, content=2))

    @cached_property
    def _by_fold(self) -> dict[str, str]:
        return {path.casefold(): path for path in reversed(self.entries)}

    def find(self, folder: str, target: str) -> str | None:
        """Return the path an include means, or None: as the reader finds it on a disk.

        As written, with Windows separators, in another case, through links and submodules.
        """
        plain = target.replace("\\", "/")
        if not plain or plain.startswith("/") or _DRIVE.match(plain):
            return None
        return self._resolve(posixpath.normpath(posixpath.join(folder, plain)), LINKS)

    def _resolve(self, path: str, hops: int) -> str | None:
        if path.startswith("..") or not hops:
            return None
        known = path if path in self.entries else self._by_fold.get(path.casefold())
        if known is not None:
            if self.entries[known].mode.startswith(LINK):
                return self._through(known, "", hops)
            return known
        parts = path.split("/")
        for count in range(1, len(parts)):
            head, rest = "/".join(parts[:count]), "/".join(parts[count:])
            entry = self.entries.get(head)
            if entry is not None and entry.mode.startswith(LINK):
                return self._through(head, rest, hops)
            if entry is not None and entry.mode.startswith(SUBMODULE):
                module = self.module(head)
                inner = module._resolve(rest, hops) if module is not None else None
                return f"{head}/{inner}" if inner is not None else None
        return None

    def _through(self, link: str, rest: str, hops: int) -> str | None:
        goal = self.text(link)
        if goal.startswith("/"):
            return None
        joined = posixpath.join(posixpath.dirname(link), goal, rest)
        return self._resolve(posixpath.normpath(joined), hops - 1)

    def text(self, path: str) -> str:
        """Return a link's goal."""
        if path not in self._texts:
            self._texts[path] = os.fsdecode(self.read([path])[path])
        return self._texts[path]

    def module(self, path: str) -> "Tree | None":
        """Return a submodule at the commit that is pinned, or None where it is not there."""
        if path not in self._modules:
            place = f"{self.top}/{path}"
            pinned = self.entries[path].content
            there = Path(place, ".git").exists() and git(
                *("rev-parse", "-q", "--verify", f"{pinned}^{{tree}}"),
                cwd=place,
                accepted=(0, 1, CANNOT),
                env=elsewhere(),
            )
            self._modules[path] = _Module(place, pinned) if there else None
        return self._modules[path]

    def owner(self, path: str) -> tuple["Tree", str] | None:
        """Return the tree a path is kept in, its own or a submodule's, and its name there."""
        if path in self.entries:
            return self, path
        parts = path.split("/")
        for count in range(1, len(parts)):
            head = "/".join(parts[:count])
            if head in self.entries and self.entries[head].mode.startswith(SUBMODULE):
                module = self.module(head)
                return module.owner("/".join(parts[count:])) if module is not None else None
        return None

    def identity(self, path: str) -> str | None:
        """Return the name of a path's content; None: there is no such path."""
        found = self.owner(path)
        return found[0].entries[found[1]].content if found is not None else None

    def read(self, paths: Iterable[str]) -> dict[str, bytes]:
        """Return the contents of files and links, as a checkout would write them."""
        by_tree: dict[int, tuple[Tree, list[tuple[str, str]]]] = {}
        for path in dict.fromkeys(paths):
            found = self.owner(path)
            if found is not None:
                tree, name = found
                by_tree.setdefault(id(tree), (tree, []))[1].append((path, name))
        contents: dict[str, bytes] = {}
        for tree, wanted in by_tree.values():
            contents.update(tree._own(wanted))
        return contents

    def _environment(self) -> dict[str, str] | None:
        return None

    def _own(self, wanted: list[tuple[str, str]]) -> Iterator[tuple[str, bytes]]:
        """Yield the contents of paths of this tree; `wanted` pairs the name asked by and its own.

        The filters that git would run on checking a file out (line ends, large files) are run.
        """
        # git prints the size before its filters have run; a name nobody has marks the ends instead
        end = token_hex(16)
        rows = []
        for _, name in wanted:
            rows.append(f"{self.entries[name].content} {name.replace(chr(10), ' ')}\n{end} -\n")
        out = git(
            *("cat-file", "--batch", "--filters"),
            cwd=self.top,
            stdin=os.fsencode("".join(rows)),
            env=self._environment(),
        )
        answers = out.split(f"\n{end} missing\n".encode())
        for (asked, _), answer in zip(wanted, answers, strict=False):
            yield asked, answer.partition(b"\n")[2]

    def settings_of(self, netlist: str) -> str | None:
        """Return the nearest railguard.toml beside a netlist and upwards."""
        folder = posixpath.dirname(netlist)
        while True:
            place = posixpath.join(folder, SETTINGS)
            if place in self.entries:
                return place
            if not folder:
                return None
            folder = posixpath.dirname(folder)


class _Module(Tree):
    """A submodule: a repository of its own, whose git is told nothing of the outer one."""

    @cached_property
    def entries(self) -> dict[str, Entry]:
        listing = git(
            *("ls-tree", "-r", "-z", "--full-tree", str(self.commit)),
            cwd=self.top,
            env=elsewhere(),
        )
        return dict(_listed(listing, content=2))

    def _environment(self) -> dict[str, str] | None:
        return elsewhere()


def _listed(listing: bytes, content: int) -> Iterator[tuple[str, Entry]]:
    """Yield what `ls-files -s` or `ls-tree` print; `content` says which word names the content."""
    for row in os.fsdecode(listing).split("\0"):
        head, tab, path = row.partition("\t")
        words = head.split()
        merged = content == 2 or (len(words) == 3 and words[2] == "0")
        # git itself refuses to check such names out
        unsafe = any(part in ("", ".", "..", ".git") for part in path.split("/"))
        if tab and merged and not unsafe:
            yield path, Entry(words[0], words[content])
