"""The user's file: `railguard.toml` found, read and turned into `Settings`.

It is looked for beside the netlist and upwards. What it cannot mean is refused with the line and
the nearest valid name, never passed over.
"""

import os
import re
import tomllib
from collections.abc import Callable
from pathlib import Path

from railguard.errors import SettingsError
from railguard.location import Location
from railguard.settings.model import Settings
from railguard.settings.places import places
from railguard.settings.sections import read_sections

FILE_NAME = "railguard.toml"

LARGEST = 1_000_000
"""Bytes; nobody writes a longer one by hand."""


def find(start: Path, top: Path | None = None) -> Path | None:
    """Look for the user's file beside a netlist and upwards; the nearest one is taken.

    start  the netlist, or a folder
    top    the highest folder looked into; never above the repository's root all the same

    Without a repository the search ends at the user's home folder, and outside of that it does
    not leave the netlist's own folder: a file in a folder shared by all is nobody's intent.
    """
    folder = Path(os.path.abspath(start))  # noqa: PTH100 - `resolve` would follow symbolic links
    if not folder.is_dir():
        folder = folder.parent
    chain = [folder, *folder.parents]
    last = _last(chain, top)
    for place in chain[: last + 1]:
        if _exists(place / FILE_NAME):
            return place / FILE_NAME
    return None


def _last(chain: list[Path], top: Path | None) -> int:
    """Return the index of the last folder to look into."""
    root = next((i for i, place in enumerate(chain) if _exists(place / ".git")), None)
    ends = [] if root is None else [root]
    if top is not None:
        above = Path(os.path.abspath(top))  # noqa: PTH100 - as in `find`
        ends.append(chain.index(above) if above in chain else 0)
    if not ends:
        home = _home()
        ends.append(chain.index(home) if home in chain else 0)
    return min(ends)


def _home() -> Path | None:
    try:
        return Path.home()
    except RuntimeError:
        return None


def _exists(path: Path) -> bool:
    try:
        return path.exists()
    except OSError:
        return False


def load(path: Path, read: Callable[[Path], bytes] = Path.read_bytes) -> Settings:
    """Read the user's file.

    read  gives a file's bytes; a hook reads what is about to be committed instead of the disk

    Raises SettingsError: it cannot be opened, is no UTF-8, no TOML, or states what cannot be.
    """
    name = str(path)
    try:
        data = read(path)
    except OSError as error:
        reason = error.strerror or str(error)
        raise SettingsError(f"The settings file {name} cannot be opened: {reason}.") from error
    if len(data) > LARGEST:
        raise SettingsError(f"The settings file {name} is longer than {LARGEST} bytes.")
    try:
        text = data.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        place = Location(name, data.count(b"\n", 0, error.start) + 1)
        raise SettingsError("The settings file is no UTF-8.", place) from error
    return parse(text, name)


def parse(text: str, name: str) -> Settings:
    """Turn the text of a railguard.toml into Settings.

    name  the file's name, for locations and for the report

    Raises SettingsError with the line at fault.
    """
    try:
        tables = tomllib.loads(text)
        where = places(text, name)
    except tomllib.TOMLDecodeError as error:
        raise _syntax(error, text, name) from error
    except ValueError as error:
        # an integer with more digits than Python converts
        raise SettingsError(f"The settings file {name} holds a number without end.") from error
    except RecursionError as error:
        raise SettingsError(f"The settings file {name} is nested too deeply.") from error
    return read_sections(tables, where, name)


_POSITION = re.compile(r"(.*?) ?\(at (?:line (\d+), column (\d+)|end of document)\)$", re.DOTALL)


def _syntax(error: tomllib.TOMLDecodeError, text: str, name: str) -> SettingsError:
    """Turn the parser's complaint into ours; it tells the position only in its words."""
    words, place = str(error), None
    match = _POSITION.match(words)
    if match:
        words = match[1]
        line = int(match[2]) if match[2] else text.count("\n") + 1
        place = Location(name, line, int(match[3]) if match[3] else 1)
    what = f"The settings file is no valid TOML: {words[0].lower()}{words[1:]}."
    return SettingsError(
        what,
        place,
        "Texts need quotes, and names with signs other than letters, digits, - and _ as well.",
    )
