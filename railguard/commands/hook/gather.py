"""Netlists with all they rest on, taken out of git and laid into a folder as they will be.

The review reads this folder and nothing else, so what lies in the working tree cannot reach it.
"""

import posixpath
import re
from collections.abc import Iterable
from pathlib import Path

import msgspec

from railguard.commands.hook.staged import targets_of
from railguard.commands.hook.tree import Tree
from railguard.deck.encoding import decode

_POINTER = b"version https://git-lfs.github.com/spec/"
"""Begins a file whose content a large-file store keeps, and has not given out."""

_CARDS = re.compile(r"^[ \t]*\.(?:inc|lib)[^\r\n]*", re.IGNORECASE | re.MULTILINE)


class Gathered(msgspec.Struct, frozen=True):
    """Files of one tree.

    contents  place -> content; a place is where a file is found by the card that includes it
    rests     netlist -> places and settings it rests on, itself among them
    content   place -> the name git has for the content
    absent    files whose content is kept elsewhere and is not here
    """

    contents: dict[str, bytes]
    rests: dict[str, tuple[str, ...]]
    content: dict[str, str | None]
    absent: tuple[str, ...]

    def alike(self, other: "Gathered", netlist: str) -> bool:
        """Tell whether a netlist rests on the very same files in both."""
        mine, theirs = self.rests.get(netlist), other.rests.get(netlist)
        return (
            mine is not None
            and theirs is not None
            and {p: self.content[p] for p in mine} == {p: other.content[p] for p in theirs}
        )

    def write(self, folder: Path) -> None:
        """Lay the files into a folder, with the mark of a repository's root."""
        # the reader looks for settings up to the root of a repository
        (folder / ".git").mkdir()
        for place, data in self.contents.items():
            path = folder / place
            path.parent.mkdir(parents=True, exist_ok=True)
            path.write_bytes(data)


def gather(tree: Tree, netlists: Iterable[str]) -> Gathered:
    """Collect netlists, what they include, and the settings that hold for them."""
    real = {path: path for path in netlists if path in tree.entries}
    rests = {path: [path] for path in real}
    contents = tree.read(real.values())
    rim = {path: [path] for path in real}
    while rim:
        wanted: dict[str, str] = {}
        following: dict[str, list[str]] = {}
        for place, users in rim.items():
            for further, source in _included(tree, place, contents.get(place, b"")):
                new = [user for user in users if further not in rests[user]]
                for user in new:
                    rests[user].append(further)
                if new:
                    following.setdefault(further, []).extend(new)
                    wanted[further] = source
        read = tree.read(source for place, source in wanted.items() if place not in contents)
        for place, source in wanted.items():
            real[place] = source
            contents.setdefault(place, read.get(source, b""))
        rim = following
    for netlist in rests:
        settings = tree.settings_of(netlist)
        if settings is not None:
            rests[netlist].append(settings)
            real[settings] = settings
    missing = [path for path in real.values() if path not in contents and path in tree.entries]
    contents.update(tree.read(missing))
    return Gathered(
        contents=contents,
        rests={netlist: tuple(places) for netlist, places in rests.items()},
        content={place: tree.identity(source) for place, source in real.items()},
        absent=tuple(p for p, data in sorted(contents.items()) if data.startswith(_POINTER)),
    )


def _included(tree: Tree, place: str, data: bytes) -> Iterable[tuple[str, str]]:
    """Yield where each file that is included is looked for, and where its content is kept."""
    folder = posixpath.dirname(place)
    text, _ = decode(data)
    for card in _CARDS.findall(text):
        for target in targets_of(card):
            source = tree.find(folder, target)
            if source is None:
                continue
            written = posixpath.normpath(posixpath.join(folder, target.replace("\\", "/")))
            linked = written.casefold() != source.casefold()
            yield (written if linked else source), source
