"""What an include card names, and where that file is."""

import os
import re
from pathlib import Path, PurePosixPath

from railguard.deck.source import Files

_PARTS = re.compile(r"\"[^\"]*\"|'[^']*'|\S+")
_DRIVE = re.compile(r"^[A-Za-z]:")
HAS_DRIVES = os.name == "nt"
"""Whether `C:` names a drive of this machine; the root decides what is read of it."""
_SECTION = re.compile(r"(?i)^\.lib\s+([\w-]+)\s*$")


_OF_MODELS = frozenset(
    {".lib", ".mod", ".sub", ".subckt", ".model", ".models", ".mdl", ".pm", ".dio", ".bjt", ".mos",
     ".jft", ".olb"}
)  # fmt: skip
"""Suffixes of files that hold definitions: common practice, no source."""


def holds_models(name: str) -> bool:
    """Tell by a file's name whether it holds models and subcircuits rather than a circuit."""
    return PurePosixPath(name.replace("\\", "/")).suffix.lower() in _OF_MODELS


def bare(word: str) -> str:
    """Take the quotes off a file's or section's name."""
    word = word.strip()
    if len(word) >= 2 and word[0] == word[-1] and word[0] in "\"'":
        return word[1:-1].strip()
    return word


def library_card(text: str) -> tuple[str, str]:
    """Return the file and the section, or "", that a `.lib` card names.

    A path without quotes may hold blanks: what has a separator or a dot is no section.
    """
    parts = _PARTS.findall(text)[1:]
    if len(parts) < 2 or re.search(r"[\\/.]", parts[-1]):
        return bare(" ".join(parts)), ""
    return bare(" ".join(parts[:-1])), bare(parts[-1]).lower()


def section_opened(text: str) -> str:
    """Return the name of the section that a `.lib name` card may open, lower-cased, or ""."""
    found = _SECTION.match(text)
    return found[1].lower() if found else ""


def find(files: Files, folder: Path, target: str, root: Path) -> Path | str:
    """Find an included file: as written, with Windows separators, in another case.

    root  the folder it has to lie below, links resolved

    Returns its path, or in words why there is none to read. Whether a file outside exists is not
    told.
    """
    plain = target.replace("\\", "/")
    elsewhere = _DRIVE.match(plain) and not HAS_DRIVES
    if elsewhere or plain.startswith("//") or "://" in plain:
        return "stands on another computer and is not read"
    outside = "lies outside the deck's folder and is not read"
    if not files.real(folder / plain).is_relative_to(root):
        return outside
    found = _in_any_case(files, folder, plain)
    if found is None:
        return "is a folder" if files.is_dir(folder / plain) else "is not there"
    return found if files.real(found).is_relative_to(root) else outside


def _in_any_case(files: Files, folder: Path, plain: str) -> Path | None:
    direct = folder / plain
    if files.is_file(direct):
        return direct
    at = folder if not plain.startswith("/") else Path("/")
    for part in PurePosixPath(plain).parts:
        if part in ("/", "."):
            continue
        if part == "..":
            at = at.parent
            continue
        if not files.is_dir(at):
            return None
        hit = next((name for name in files.names(at) if name.lower() == part.lower()), None)
        if hit is None:
            return None
        at = at / hit
    return at if files.is_file(at) else None


def chain_of(chain: tuple[Path | None, ...], file: str) -> str:
    """Say through which files an include card was reached."""
    names = [step.name for step in chain if step is not None]
    return f" It is included by {' which is included by '.join(reversed(names)) or file}."
