"""Where something stands, as addresses other programs follow: relative to the run's root."""

import os
from pathlib import Path, PurePath
from urllib.parse import quote

from railguard.deck.files import IN_MEMORY


def real(path: str) -> Path:
    """Return a path with its links followed; a ring of links stays one, and nothing is raised."""
    return Path(os.path.realpath(path))


def posix(path: str) -> str:
    """Return a path with forward slashes."""
    return PurePath(path).as_posix()


def below(path: str, root: Path) -> str | None:
    """Return a path from the run's root, with forward slashes; None where it lies elsewhere."""
    whole = Path(path).absolute()
    plain = real(path) if ".." in whole.parts else whole
    for base in (root.absolute(), real(str(root))):
        if plain.is_relative_to(base):
            return posix(str(plain.relative_to(base)))
    return None


def from_root(path: str, root: Path) -> str:
    """Return a path as a fingerprint names it: from the run's root, where it lies below it.

    Whatever folder the command is given in, and however the path is spelled, the same deck has
    the same name.
    """
    inside = below(path, root)
    return posix(path) if inside is None else inside


def address(path: str, root: Path) -> tuple[str, bool] | None:
    """Return a file's address (RFC 3986) and whether it is relative to the run's root.

    None for a netlist that came as text, which has no address.
    """
    if path == IN_MEMORY:
        return None
    inside = below(path, root)
    if inside is not None:
        # A name that is no UTF-8 is quoted byte by byte.
        return quote(inside.encode("utf-8", "surrogateescape")), True
    return real(path).as_uri(), False
