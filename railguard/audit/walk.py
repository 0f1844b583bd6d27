"""Which files lie below the roots. No link is followed, no pipe opened, no folder entered twice."""

import os
import stat
from collections.abc import Iterator
from fnmatch import fnmatchcase
from pathlib import Path, PurePosixPath

import msgspec

from railguard.audit.sniff import is_archive, worth_opening
from railguard.audit.trees import Bucket, is_url
from railguard.audit.wire import Outcome, Task
from railguard.errors import UsageError
from railguard.settings.file import FILE_NAME

USUAL_SKIPS = (".git", ".hg", ".svn", "__pycache__")
"""Folders that hold no designs of their own."""


class SettingsSeen(msgspec.Struct, frozen=True):
    """A settings file below a root."""

    root: int
    path: str


Step = Task | Outcome | SettingsSeen


def walk(root: int, name: str, skips: tuple[str, ...]) -> Iterator[Step]:
    """Yield what lies below a root, folder by folder, in the order the system lists it.

    A folder is not gone through as a whole first: it may hold millions of files.

    name   the root: a folder, a file or a URL
    skips  patterns of names, or of paths below the root, that are left out

    Raises UsageError: the root is not there.
    """
    if is_url(name):
        yield from _in_bucket(root, name, skips)
        return
    place = Path(name)
    if not place.exists():
        raise UsageError(f"{name} does not exist.", remedy="Check the path.")
    if place.is_dir():
        yield from _in_folder(root, place, "", skips, ())
    else:
        yield from _file(root, place.name)


def skipped(path: str, skips: tuple[str, ...]) -> bool:
    """Tell whether a pattern names a path, or its last name."""
    name = PurePosixPath(path).name
    return any(fnmatchcase(path, skip) or fnmatchcase(name, skip) for skip in skips)


def _in_folder(
    root: int, folder: Path, below: str, skips: tuple[str, ...], above: tuple[tuple[int, int], ...]
) -> Iterator[Step]:
    try:
        own = folder.stat()
        entries = os.scandir(folder)
    except OSError as error:
        yield _passed(root, below or ".", f"The folder cannot be read: {error.strerror}.")
        return
    here = (own.st_dev, own.st_ino)
    if here in above:
        yield _passed(root, below, "The folder lies in itself, and is entered once only.")
        return
    for entry in entries:
        if not _is_text(entry.name):
            shown = entry.name.encode("utf-8", "backslashreplace").decode()
            path = f"{below}/{shown}" if below else shown
            yield _passed(root, path, "Its name is no UTF-8; rename it to have it read.")
            continue
        path = f"{below}/{entry.name}" if below else entry.name
        if skipped(path, skips):
            continue
        try:
            mode = entry.stat(follow_symlinks=False).st_mode
        except OSError as error:
            yield _passed(root, path, f"It cannot be read: {error.strerror}.")
            continue
        if stat.S_ISDIR(mode):
            yield from _in_folder(root, folder / entry.name, path, skips, (*above, here))
        elif stat.S_ISREG(mode):
            yield from _file(root, path)
        elif stat.S_ISLNK(mode):
            yield _passed(root, path, "It is a link, and no link is followed.")
        else:
            yield _passed(root, path, "It is a pipe or a device, not a file.")


def _is_text(name: str) -> bool:
    """Tell whether a name can be written down: one in another encoding cannot."""
    try:
        name.encode()
    except UnicodeEncodeError:
        return False
    return True


def _file(root: int, path: str) -> Iterator[Step]:
    if PurePosixPath(path).name == FILE_NAME:
        yield SettingsSeen(root, path)
    elif is_archive(path):
        yield Task(root, path, opens=True)
    elif worth_opening(path):
        yield Task(root, path)


def _passed(root: int, path: str, why: str) -> Outcome:
    return Outcome(root=root, path=path, state="passed", why=why)


def _in_bucket(root: int, url: str, skips: tuple[str, ...]) -> Iterator[Step]:
    bucket = Bucket(url)
    folders = [""]
    while folders:
        folder = folders.pop()
        entries = bucket.listing(folder)
        found = sorted((bucket.below(str(entry["name"])), entry["type"]) for entry in entries)
        below = []
        for path, sort in found:
            # A store may list a folder in itself, as a file of no length or as a folder.
            if PurePosixPath(path).parent != PurePosixPath(folder) or skipped(path, skips):
                continue
            if sort == "directory":
                below.append(path)
            else:
                yield from _file(root, path)
        folders += reversed(below)
