"""A netlist and everything it includes, to a deck.

What a netlist names is read only below the deck's own folder, links resolved, unless the user
opens another root. A file that is missing costs only what stands in it.
"""

import hashlib
from collections.abc import Mapping
from pathlib import Path
from types import MappingProxyType

import msgspec

from railguard.deck.bounds import Bounds
from railguard.deck.encoding import decode, no_netlist, no_netlist_text
from railguard.deck.following import Following
from railguard.deck.lines import Line
from railguard.deck.opening import bounded
from railguard.deck.source import DISK, Files
from railguard.deck.titles import is_library
from railguard.location import Location
from railguard.notices import Problem, Remark


class Deck(msgspec.Struct, frozen=True, kw_only=True):
    """A deck: its logical lines with everything it includes, in reading order.

    texts  every file's text as it was decoded, by the name its locations carry
    """

    path: str
    title: str = ""
    lines: tuple[Line, ...] = ()
    directives: tuple[tuple[str, Location], ...] = ()
    problems: tuple[Problem, ...] = ()
    remarks: tuple[Remark, ...] = ()
    files: tuple[str, ...] = ()
    texts: Mapping[str, str] = MappingProxyType({})
    sha256: str = ""
    readable: bool = True
    bounds: Bounds = Bounds()


def read_deck(
    path: Path, bounds: Bounds | None = None, root: Path | None = None, files: Files = DISK
) -> Deck:
    """Read a netlist and everything it includes.

    root  the folder that includes must stay below; None: the netlist's own folder
    files the tree that the netlist and its includes are read from

    A file that cannot be read at all gives a deck that says so: nothing is raised.
    """
    bounds = bounds or Bounds()
    name = str(path)
    try:
        if not files.is_file(path):
            return _refused(name, f"{name} {_missing(files, path)}.", "Check the path.")
        data = bounded(files, path, bounds)
    except OSError as error:
        return _refused(name, f"{name} cannot be read: {error.strerror}.", "")
    if data is None:
        return _refused(
            name,
            f"{name} is larger than the {bounds.file_bytes:,} bytes a netlist may have.",
            "Raise file-bytes in [bounds] if this really is a netlist.",
        )
    text, how = decode(data)
    what = no_netlist(data) or no_netlist_text(text)
    if what:
        return _refused(name, f"{name} is {what}, not a SPICE netlist.", "Export a SPICE netlist.")
    following = Following(bounds, files.real(root or path.parent), files)
    if how:
        following.remarks.append(Remark(f"{name} was read as {how}.", Location(name, 1)))
    return _deck(following, bounds, name, text, hashlib.sha256(data).hexdigest(), path)


IN_MEMORY = "<text>"
"""The path of a netlist that came as text, not as a file."""


def deck_from_text(text: str, name: str = IN_MEMORY, bounds: Bounds | None = None) -> Deck:
    """Take a netlist's text; includes are refused, because a text has no folder."""
    bounds = bounds or Bounds()
    digest = hashlib.sha256(text.encode()).hexdigest()
    return _deck(Following(bounds, None, DISK), bounds, name, text, digest, None)


def _deck(
    following: Following, bounds: Bounds, name: str, text: str, digest: str, path: Path | None
) -> Deck:
    following.enter(name, digest.encode())
    if not text.strip("\x1a\x00 \t\r\n"):
        return _refused(name, f"{name} is empty.", "Export the netlist again.")
    titled = not is_library(name, text)
    if not titled:
        told = f"{name} was read as a library: its first line is a card and no title."
        following.remarks.append(Remark(told, Location(name, 1)))
    following.take(text, name, titled, (path,))
    return Deck(
        path=name,
        title=following.title,
        lines=tuple(following.lines),
        directives=tuple(following.directives),
        problems=tuple(following.problems),
        remarks=tuple(following.remarks),
        files=tuple(following.files),
        texts=following.texts,
        sha256=following.sha256,
        bounds=bounds,
    )


def _refused(name: str, message: str, remedy: str) -> Deck:
    problem = Problem(
        rule="netlist-unreadable", message=message, remedy=remedy, location=Location(name, 1)
    )
    return Deck(path=name, problems=(problem,), readable=False, files=(name,))


def _missing(files: Files, path: Path) -> str:
    if files.is_dir(path):
        return "is a folder"
    folder = path.parent
    there = files.is_dir(folder) and path.name in files.names(folder)
    return "is no ordinary file" if there else "does not exist"
