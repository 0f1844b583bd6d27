"""The grammar as data: found beside the package or inside it, and turned into a parser.

Building a parser costs as much as reading a thousand cards, so it is kept in the user's own cache
folder; never in a shared one, because it is unpickled when read.
"""

import hashlib
import os
import re
import sys
from functools import lru_cache
from importlib.resources import files
from pathlib import Path
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from lark import Lark


def grammar_text(name: str) -> str:
    """Return the grammar file `name`: shipped inside the package, or beside it in a checkout."""
    place = files("railguard") / "grammar" / name
    if not place.is_file():
        return (Path(__file__).resolve().parents[2] / "grammar" / name).read_text(encoding="utf-8")
    return place.read_text(encoding="utf-8")


_TERMINAL = re.compile(r"^([A-Z]+)(?:\.\d+)?: (.+)$", re.MULTILINE)
_PART = re.compile(r"/((?:\\.|[^/\\])+)/(i?)|\"((?:\\.|[^\"\\])+)\"|([A-Z]+)")


@lru_cache(maxsize=4)
def terminals(name: str) -> dict[str, str]:
    """Return the patterns of a grammar file's terminals, so that faster paths are made of them.

    A terminal may be patterns, quoted words and other terminals, one of which has to fit.
    """
    written = dict(_TERMINAL.findall(grammar_text(name)))

    def pattern(terminal: str) -> str:
        parts = []
        for regular, flag, word, other in _PART.findall(written[terminal]):
            if regular:
                parts.append(f"(?i:{regular})" if flag else regular)
            else:
                parts.append(re.escape(word.replace("\\\\", "\\")) if word else pattern(other))
        return f"(?:{'|'.join(parts)})"

    return {terminal: pattern(terminal) for terminal in written}


@lru_cache(maxsize=4)
def parser(name: str) -> "Lark":
    """Return the parser of a grammar file, from the cache where that is safe."""
    # lark costs 50 ms to import, and most decks need only the fast path.
    import lark

    text = grammar_text(name)
    options = {"parser": "lalr", "lexer": "contextual", "maybe_placeholders": False}
    place = _cache(text, lark.__version__)
    if place is not None:
        try:
            return lark.Lark(text, cache=str(place), **options)
        except OSError:
            pass  # a full or vanished cache folder only costs time
    return lark.Lark(text, **options)


def _cache(text: str, version: str) -> Path | None:
    """Return a file only this user can write, or None."""
    home = os.environ.get("XDG_CACHE_HOME") or (Path.home() / ".cache" if _has_home() else "")
    if not home:
        return None
    folder = Path(home) / "railguard"
    try:
        folder.mkdir(mode=0o700, parents=True, exist_ok=True)
        stat = folder.stat()
    except OSError:
        return None
    if hasattr(os, "getuid") and (stat.st_uid != os.getuid() or stat.st_mode & 0o022):
        return None
    key = hashlib.sha256(f"{text}{version}{sys.version}".encode()).hexdigest()[:32]
    return folder / f"grammar-{key}"


def _has_home() -> bool:
    try:
        Path.home()
    except RuntimeError:
        return False
    return True
