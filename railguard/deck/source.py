"""Where a deck's files come from: the disk, an archive, a bucket, what is about to be committed."""

import os
from pathlib import Path
from typing import Protocol


class Files(Protocol):
    """A tree of files that a deck and its includes are read from."""

    def read(self, path: Path, most: int) -> bytes:
        """Return a file's bytes, but never more than one over `most`.

        Raises OSError: it cannot be read.
        """
        ...

    def is_file(self, path: Path) -> bool:
        """Tell whether an ordinary file stands there."""
        ...

    def is_dir(self, path: Path) -> bool:
        """Tell whether a folder stands there."""
        ...

    def names(self, folder: Path) -> tuple[str, ...]:
        """Return the names in a folder, sorted."""
        ...

    def real(self, path: Path) -> Path:
        """Return the path with every link and every `..` followed."""
        ...


class Disk:
    """The files of this machine."""

    def read(self, path: Path, most: int) -> bytes:
        """Return a file's bytes, but never more than one over `most`."""
        with path.open("rb") as file:
            return file.read(most + 1)

    def is_file(self, path: Path) -> bool:
        """Tell whether an ordinary file stands there; a pipe or a device is none."""
        return path.is_file()

    def is_dir(self, path: Path) -> bool:
        """Tell whether a folder stands there."""
        return path.is_dir()

    def names(self, folder: Path) -> tuple[str, ...]:
        """Return the names in a folder, sorted."""
        return tuple(sorted(path.name for path in folder.iterdir()))

    def real(self, path: Path) -> Path:
        """Return the path with every link and every `..` followed; a ring of links stays one."""
        return Path(os.path.realpath(path))


DISK = Disk()
