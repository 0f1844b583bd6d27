"""`railguard redline`: what to change on the cards, proved, as a diff or as a new file."""

import datetime as dt
import sys
from pathlib import Path

import click
import msgspec

from railguard.commands import options
from railguard.commands.deliver import write_whole
from railguard.errors import UsageError
from railguard.redline.difference import unified
from railguard.redline.model import Redline
from railguard.redline.propose import redline as propose
from railguard.report.json_text import encoded
from railguard.report.redline import screen
from railguard.report.visible import visible
from railguard.report.words import near
from railguard.reviewing import review as run
from railguard.settings import file as settings_file
from railguard.settings.model import Settings

HOLD = 1
"""Exit status where something stays at or above the hold level after all changes."""


@click.command()
@click.argument("file", type=click.Path(path_type=Path), metavar="FILE")
@click.option(
    "--write",
    "target",
    type=click.Path(path_type=Path),
    metavar="NEWFILE",
    help="Save the changed deck there; the original is never written over.",
)
@click.option(
    "--as",
    "how",
    type=click.Choice(["screen", "diff", "json"]),
    default="screen",
    help="On the screen; the bare diff, for `patch`; or everything as JSON.",
)
@options.settings
@options.no_settings
@options.kind
@options.as_of
@options.root
def redline(
    file: Path,
    target: Path | None,
    how: str,
    stated: Path | None,
    no_settings: bool,
    kind: str | None,
    as_of: dt.date | None,
    root: Path | None,
) -> None:
    """Propose changed and added cards for what a card can cure, each proved by a review.

    Status 0: nothing at or above the hold level is left after the changes; 1: something is; 2: not
    carried out.
    """
    settings = Settings() if no_settings else None
    if stated is not None:
        settings = settings_file.load(stated)
    changes = {"kind": kind} if kind is not None else {}
    found = run([file], settings, root=root, changes=changes, as_of=as_of)
    result = propose(found.designs[0])
    if target is not None:
        _save(result, target)
    if how == "diff":
        sys.stdout.buffer.write(_diff(result).encode("utf-8", "surrogateescape"))
    elif how == "json":
        plain = msgspec.structs.replace(result, data=(), files=())
        wire = {**msgspec.to_builtins(plain), "diff": unified(result.files)}
        del wire["data"], wire["files"]
        sys.stdout.buffer.write(encoded(wire))
    else:
        from rich.console import Console

        screen(result, Console(highlight=False, markup=False, emoji=False))
        if target is not None:
            click.echo(_written(result, target, found.designs[0].design.settings.file))
    sys.stdout.flush()
    sys.exit(HOLD if result.held else 0)


def _diff(result: Redline) -> str:
    """Return the bare diff: as it is for a program, made safe where a person looks at it."""
    text = unified(result.files)
    if not sys.stdout.isatty():
        return text
    return "".join(f"{visible(line)}\n" for line in text.splitlines())


def _written(result: Redline, target: Path, settings: str) -> str:
    if not result.files:
        return "Nothing to write."
    elsewhere = target.resolve().parent != Path(result.path).resolve().parent
    if settings and elsewhere:
        return f"Written: {target}. Review it with --settings {near(settings)}, as this was."
    return f"Written: {target}"


def _save(result: Redline, target: Path) -> None:
    """Write the changed deck, and the files it includes where they would not be found or change.

    Raises UsageError: that would write over a file of the deck, or over another one.
    """
    if not result.files:
        return
    main, folder = Path(result.path), Path(result.path).resolve().parent
    changed = {changed.file for changed in result.files}
    beside = target.resolve().parent == folder
    wanted: list[tuple[Path, bytes]] = []
    for name, data in result.data:
        if name == result.path:
            wanted.append((target, data))
        elif not beside or name in changed:
            wanted.append((target.parent / _relative(name, folder), data))
    originals = [Path(name) for name, _ in result.data]
    for place, data in wanted:
        for original in originals:
            if _is_same(place, original):
                raise UsageError(
                    f"{place} is a file of the deck itself and is not written over.",
                    remedy="Name a file in another folder: an included file changes with it."
                    if place != target
                    else f"Name another file than {main.name}.",
                )
        if place != target and place.exists() and place.read_bytes() != data:
            raise UsageError(
                f"{place} is there already and is another file.", remedy="Choose an empty folder."
            )
    for place, data in wanted:
        place.parent.mkdir(parents=True, exist_ok=True)
        write_whole(place, data)


def _relative(name: str, folder: Path) -> Path:
    """Return where an included file stands below the deck's folder.

    Raises UsageError: it stands outside, so that the new deck would not find it.
    """
    real = Path(name).resolve()
    if not real.is_relative_to(folder):
        raise UsageError(
            f"The included file {name} stands outside the deck's folder.",
            remedy="Write the new file beside the original, where its includes are found.",
        )
    return real.relative_to(folder)


def _is_same(place: Path, original: Path) -> bool:
    """Tell whether two paths lead to one file, links followed."""
    try:
        return place.samefile(original)
    except OSError:
        return place.resolve() == original.resolve()
