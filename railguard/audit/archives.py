"""Zip, tar and compressed files as folders: bounded in files, bytes and depth, never unpacked.

Nothing is written but one temporary file without a name for a compressed tar, which is gone with
its process however that ends.
"""

import bz2
import contextlib
import gzip
import lzma
import stat
import tarfile
import tempfile
import zipfile
import zlib
from collections.abc import Iterator
from pathlib import PurePosixPath
from typing import IO, Protocol, cast

from railguard.audit.sniff import suffix
from railguard.audit.wire import Budget

_PIECE = 1 << 20


class ArchiveError(Exception):
    """An archive, or something in it, that cannot be opened; the text is a sentence."""


class Archive(Protocol):
    """Files by their path inside, in the order they stand there."""

    @property
    def names(self) -> tuple[str, ...]:
        """Return the ordinary files inside."""
        ...

    @property
    def refused(self) -> tuple[tuple[str, str], ...]:
        """Return what is inside and is not opened: (path, reason)."""
        ...

    def open(self, name: str) -> IO[bytes]:
        """Open one file for reading."""
        ...

    def close(self) -> None:
        """Close the archive, and the file it was opened from."""
        ...


def opened(file: IO[bytes], name: str, budget: Budget) -> Archive:
    """Open an archive.

    file  its bytes, seekable
    name  its name, whose ending says what it is

    Raises ArchiveError: it is none, is damaged, or passes a bound.
    """
    with contextlib.ExitStack() as stack, guarded():
        stack.enter_context(file)
        if suffix(name) == ".zip":
            archive: Archive = _Zip(file, budget)
        elif suffix(name) == ".tar":
            archive = _Tar(file, budget)
        else:
            return _compressed(file, name, budget)
        stack.pop_all()
        return archive


@contextlib.contextmanager
def guarded() -> Iterator[None]:
    """Turn what the standard library raises on damaged archives into one sentence."""
    try:
        yield
    except _DAMAGE as error:
        raise ArchiveError(f"It is damaged, or no archive: {error}.") from error
    except OSError as error:
        if error.errno is not None:
            raise
        # bz2 and gzip say so of damaged data; what the disk refuses has a number.
        raise ArchiveError(f"It is damaged, or no archive: {error}.") from error


_DAMAGE = (
    zipfile.BadZipFile,
    tarfile.TarError,
    lzma.LZMAError,
    zlib.error,
    EOFError,
    NotImplementedError,  # zipfile's word for a compression it does not know
    RuntimeError,  # zipfile's word for an encrypted member
    gzip.BadGzipFile,
    ValueError,
    OverflowError,
)


def _inside(name: str) -> str:
    """Return a member's path without what would lead out of the archive, or ""."""
    parts = [part for part in name.replace("\\", "/").split("/") if part not in ("", ".")]
    return "" if ".." in parts else "/".join(parts)


def _enough(count: int, budget: Budget) -> None:
    if count > budget.members:
        raise ArchiveError(
            f"It holds more than {budget.members:,} files; unpack it, and audit the folder."
        )


class _Zip:
    def __init__(self, file: IO[bytes], budget: Budget) -> None:
        self._file = file
        self._zip = zipfile.ZipFile(file)
        infos = self._zip.infolist()
        _enough(len(infos), budget)
        refused: list[tuple[str, str]] = []
        self._infos: dict[str, zipfile.ZipInfo] = {}
        for info in infos:
            path = _inside(info.filename)
            if info.is_dir():
                continue
            if not path:
                refused.append((PurePosixPath(info.filename).name, "It would lie outside."))
            elif stat.S_ISLNK(info.external_attr >> 16):
                refused.append((path, "It is a link, and no link is followed."))
            else:
                self._infos[path] = info
        whole = sum(info.file_size for info in self._infos.values())
        if whole > budget.unpacked:
            raise ArchiveError(
                f"It would unpack to {whole:,} bytes, more than the {budget.unpacked:,} an archive "
                "may have."
            )
        self.names = tuple(self._infos)
        self.refused = tuple(refused)

    def open(self, name: str) -> IO[bytes]:
        return self._zip.open(self._infos[name])

    def close(self) -> None:
        self._zip.close()
        self._file.close()


class _Tar:
    def __init__(self, file: IO[bytes], budget: Budget) -> None:
        self._file = file
        self._tar = tarfile.open(fileobj=file, mode="r:")  # noqa: SIM115 - it lives as long as this
        refused: list[tuple[str, str]] = []
        self._infos: dict[str, tarfile.TarInfo] = {}
        for count, info in enumerate(self._tar, start=1):
            _enough(count, budget)
            path = _inside(info.name)
            if info.isdir():
                continue
            if not path:
                refused.append((PurePosixPath(info.name).name, "It would lie outside."))
            elif info.isreg():
                self._infos[path] = info
            else:
                refused.append((path, "It is a link or a device, and is not opened."))
        self.names = tuple(self._infos)
        self.refused = tuple(refused)

    def open(self, name: str) -> IO[bytes]:
        found = self._tar.extractfile(self._infos[name])
        if found is None:
            raise ArchiveError("It is no ordinary file.")
        return found

    def close(self) -> None:
        self._tar.close()
        self._file.close()


class _Single:
    """A file that was compressed by itself."""

    def __init__(self, name: str, file: IO[bytes]) -> None:
        self.names = (name,)
        self.refused = ()
        self._file = file

    names: tuple[str, ...]
    refused: tuple[tuple[str, str], ...]

    def open(self, name: str) -> IO[bytes]:
        del name
        self._file.seek(0)
        return cast("IO[bytes]", _Borrowed(self._file))

    def close(self) -> None:
        self._file.close()


class _Borrowed:
    """A file whose user may close it while it stays open for the next one."""

    def __init__(self, file: IO[bytes]) -> None:
        self.read, self.seek, self.tell = file.read, file.seek, file.tell
        self.seekable = file.seekable

    def __enter__(self) -> "_Borrowed":
        return self

    def __exit__(self, *ending: object) -> None:
        return None

    def close(self) -> None:
        return None


_TARS = (".tgz", ".tbz2", ".txz")


def _stream(file: IO[bytes], end: str) -> IO[bytes]:
    if end in (".gz", ".tgz"):
        return cast("IO[bytes]", gzip.GzipFile(fileobj=file))
    if end in (".bz2", ".tbz2"):
        return cast("IO[bytes]", bz2.BZ2File(file))
    return cast("IO[bytes]", lzma.LZMAFile(file))


def _compressed(file: IO[bytes], name: str, budget: Budget) -> Archive:
    end = suffix(name)
    bare = PurePosixPath(name).name.removesuffix(PurePosixPath(name).suffix)
    with contextlib.ExitStack() as stack:
        plain = cast("IO[bytes]", stack.enter_context(tempfile.TemporaryFile()))
        size = 0
        with _stream(file, end) as stream:
            for piece in _pieces(stream):
                size += len(piece)
                if size > budget.unpacked:
                    raise ArchiveError(
                        f"It unpacks to more than the {budget.unpacked:,} bytes an archive may"
                        " have."
                    )
                plain.write(piece)
        plain.seek(0)
        packed = end in _TARS or suffix(bare) == ".tar"
        archive: Archive = _Tar(plain, budget) if packed else _Single(bare, plain)
        stack.pop_all()
        return archive


def _pieces(stream: IO[bytes]) -> Iterator[bytes]:
    while piece := stream.read(_PIECE):
        yield piece
