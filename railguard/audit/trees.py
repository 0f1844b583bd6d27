"""The trees an audit reads from: a folder, an archive, a bucket, each seen from its own top."""

import os
import posixpath
from collections import OrderedDict
from pathlib import Path, PurePosixPath
from typing import IO, Any, Protocol, cast

from railguard.audit.archives import Archive, ArchiveError, guarded, opened
from railguard.audit.wire import Budget, Task
from railguard.deck.source import Files
from railguard.errors import UsageError

OPEN_ARCHIVES = 3
"""Archives a worker keeps open: one after another is read, and one may lie in another."""

_HOW = getattr(os, "O_NONBLOCK", 0) | getattr(os, "O_BINARY", 0)
"""POSIX: a pipe is not waited for. Windows: bytes are taken as they are."""


class Tree(Files, Protocol):
    """Files of a deck, any of which can also be opened as an archive."""

    def open(self, path: Path) -> IO[bytes]:
        """Open a file for reading from anywhere in it."""
        ...


def is_url(root: str) -> bool:
    """Tell whether a root is an fsspec URL: `s3://bucket/boards`, `zip://::file:///x.zip`."""
    return "://" in root


class Folder:
    """A folder of this machine."""

    def __init__(self, base: Path) -> None:
        self._base = base

    def read(self, path: Path, most: int) -> bytes:
        """Return a file's bytes, but never more than one over `most`."""
        with self.open(path) as file:
            return file.read(most + 1)

    def open(self, path: Path) -> IO[bytes]:
        """Open an ordinary file; never waits for the other end of a pipe."""
        handle = os.open(self._base / path, os.O_RDONLY | _HOW)
        return os.fdopen(handle, "rb")

    def is_file(self, path: Path) -> bool:
        """Tell whether an ordinary file stands there."""
        return (self._base / path).is_file()

    def is_dir(self, path: Path) -> bool:
        """Tell whether a folder stands there."""
        return (self._base / path).is_dir()

    def names(self, folder: Path) -> tuple[str, ...]:
        """Return the names in a folder, sorted."""
        return tuple(sorted(path.name for path in (self._base / folder).iterdir()))

    def real(self, path: Path) -> Path:
        """Return the path with every link and every `..` followed."""
        return (self._base / path).resolve()


class Inside:
    """The inside of an archive, under the archive's own path."""

    def __init__(self, top: str, archive: Archive) -> None:
        self.archive = archive
        self._files = {f"{top}/{name}": name for name in archive.names}
        self._folders = {top} | {
            str(above)
            for name in self._files
            for above in PurePosixPath(name).parents
            if len(above.parts) >= len(PurePosixPath(top).parts)
        }

    def read(self, path: Path, most: int) -> bytes:
        """Return a file's bytes, but never more than one over `most`."""
        with guarded(), self.open(path) as file:
            return file.read(most + 1)

    def open(self, path: Path) -> IO[bytes]:
        """Open a file for reading."""
        name = self._files.get(_plain(path))
        if name is None:
            raise FileNotFoundError(2, "No such file in the archive")
        with guarded():
            return self.archive.open(name)

    def is_file(self, path: Path) -> bool:
        """Tell whether a file stands there."""
        return _plain(path) in self._files

    def is_dir(self, path: Path) -> bool:
        """Tell whether a folder stands there."""
        return _plain(path) in self._folders

    def names(self, folder: Path) -> tuple[str, ...]:
        """Return the names in a folder, sorted."""
        start = f"{_plain(folder)}/"
        below = {p[len(start) :].split("/", 1)[0] for p in self._files if p.startswith(start)}
        return tuple(sorted(below))

    def real(self, path: Path) -> Path:
        """Return the path with every `..` followed, as if the root were the top of a disk."""
        return Path("/" + _plain(path))


class Bucket:
    """What fsspec reaches under a URL."""

    def __init__(self, url: str) -> None:
        try:
            from fsspec.core import url_to_fs
        except ImportError as error:
            raise UsageError(
                f"The URL {url} needs fsspec.", remedy="pip install 'railguard[audit]'."
            ) from error
        self._fs, base = url_to_fs(url)
        self._base = str(base).rstrip("/")

    def read(self, path: Path, most: int) -> bytes:
        """Return a file's bytes, but never more than one over `most`."""
        try:
            return bytes(self._fs.cat_file(self._at(path), start=0, end=most + 1))
        except FileNotFoundError:
            raise
        except (OSError, ValueError):
            # A range of an empty file is refused by some stores.
            with self._fs.open(self._at(path), "rb") as file:
                return bytes(file.read(most + 1))

    def open(self, path: Path) -> IO[bytes]:
        """Open a file for reading from anywhere in it."""
        return cast("IO[bytes]", self._fs.open(self._at(path), "rb"))

    def is_file(self, path: Path) -> bool:
        """Tell whether a file stands there."""
        return bool(self._fs.isfile(self._at(path)))

    def is_dir(self, path: Path) -> bool:
        """Tell whether a folder stands there."""
        return bool(self._fs.isdir(self._at(path)))

    def names(self, folder: Path) -> tuple[str, ...]:
        """Return the names in a folder, sorted."""
        found = self._fs.ls(self._at(folder), detail=False)
        return tuple(sorted(PurePosixPath(str(name)).name for name in found))

    def real(self, path: Path) -> Path:
        """Return the path with every `..` followed, as if the root were the top of a disk."""
        return Path("/" + _plain(path))

    def listing(self, folder: str) -> list[dict[str, Any]]:
        """Return what stands in a folder, as fsspec describes it."""
        found = list(self._fs.ls(self._at(Path(folder)), detail=True))
        self._fs.invalidate_cache()  # a listing is read once, and would be kept for ever
        return found

    def below(self, name: str) -> str:
        """Return a full name as seen from the URL."""
        return name.strip("/")[len(self._base.strip("/")) :].strip("/")

    def _at(self, path: Path) -> str:
        return "/".join(filter(None, (self._base, _plain(path))))


class Over:
    """A tree one file of which has been read already."""

    def __init__(self, tree: Files, path: Path, data: bytes) -> None:
        self._tree, self._path, self._data = tree, path, data

    def read(self, path: Path, most: int) -> bytes:
        """Return a file's bytes, but never more than one over `most`."""
        return self._data[: most + 1] if path == self._path else self._tree.read(path, most)

    def is_file(self, path: Path) -> bool:
        """Tell whether an ordinary file stands there."""
        return path == self._path or self._tree.is_file(path)

    def is_dir(self, path: Path) -> bool:
        """Tell whether a folder stands there."""
        return self._tree.is_dir(path)

    def names(self, folder: Path) -> tuple[str, ...]:
        """Return the names in a folder, sorted."""
        return self._tree.names(folder)

    def real(self, path: Path) -> Path:
        """Return the path with every link and every `..` followed."""
        return self._tree.real(path)


class Trees:
    """The trees of all roots, with the archives last used kept open."""

    def __init__(self, roots: tuple[str, ...], budget: Budget) -> None:
        self._roots = roots
        self._budget = budget
        self._bases: dict[int, Tree] = {}
        self._archives: OrderedDict[tuple[int, str], Inside] = OrderedDict()

    def of(self, task: Task) -> Tree:
        """Return the tree a task's file lies in.

        Raises OSError, ArchiveError: an archive on the way to it cannot be opened.
        """
        tree = self._base(task.root)
        for top in task.archives:
            tree = self._inside(task.root, top, tree)
        return tree

    def archive(self, task: Task) -> Archive:
        """Open the archive a task names."""
        if len(task.archives) >= self._budget.nested:
            raise ArchiveError(f"Archives go deeper than {self._budget.nested} into each other.")
        self._inside(task.root, task.path, self.of(task))
        return self._archives[task.root, task.path].archive

    def close(self) -> None:
        """Close every archive that is open."""
        while self._archives:
            self._archives.popitem()[1].archive.close()

    def _base(self, root: int) -> Tree:
        if root not in self._bases:
            name = self._roots[root]
            self._bases[root] = Bucket(name) if is_url(name) else Folder(base_of(Path(name)))
        return self._bases[root]

    def _inside(self, root: int, top: str, around: Tree) -> Inside:
        key = (root, top)
        if key not in self._archives:
            archive = opened(around.open(Path(top)), top, self._budget)
            self._archives[key] = Inside(top, archive)
            while len(self._archives) > OPEN_ARCHIVES:
                self._archives.popitem(last=False)[1].archive.close()
        self._archives.move_to_end(key)
        return self._archives[key]


def base_of(root: Path) -> Path:
    """Return the folder a root's paths are seen from: its own where it is a file."""
    return root if root.is_dir() else root.parent


def _plain(path: Path) -> str:
    """Return a path from the tree's top with every `..` followed, never above the top."""
    return posixpath.normpath("/" + path.as_posix()).strip("/")
