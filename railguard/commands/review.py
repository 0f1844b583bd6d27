"""`railguard review`: netlists in, reports out, and the status that stops a commit or a build."""

import datetime as dt
import sys
from importlib import resources
from pathlib import Path
from typing import get_args

import click

from railguard.analysis.solution import Options
from railguard.commands import options
from railguard.commands.deliver import check_places, write_whole
from railguard.commands.progress import progress
from railguard.errors import UsageError
from railguard.report.formats import FORMATS, render
from railguard.reviewing import Review, Simulator
from railguard.reviewing import review as run
from railguard.settings import file as settings_file
from railguard.settings.model import Settings
from railguard.words import SEVERITIES, Family, Severity

HOLD = 1
"""Exit status where something stands at or above the hold level."""


def _show_schema(context: click.Context, _: click.Parameter, wanted: bool) -> None:
    """Print the schema that ships with the package."""
    if not wanted:
        return
    shipped = resources.files("railguard.report").joinpath("report.schema.json")
    sys.stdout.buffer.write(shipped.read_bytes())
    context.exit()


@click.command()
@click.argument("files", nargs=-1, required=True, metavar="FILE...", type=click.Path())
@click.option(
    "--report",
    "reports",
    multiple=True,
    metavar="FORMAT[=FILE]",
    help=f"Format ({', '.join(FORMATS)}); with =FILE into a file. Repeatable.",
)
@click.option("--hold-at", type=click.Choice(SEVERITIES), help="What gives status 1 [major].")
@click.option("--require", metavar="FAMILIES", help="What must not stay open: headroom,drive.")
@options.settings
@options.no_settings
@options.kind
@options.as_of
@options.root
@click.option(
    "--corners",
    type=click.Choice(["extreme", "exact"]),
    default="extreme",
    help="Follow sensitivities to the corners, or solve each corner anew.",
)
@options.monte_carlo
@click.option(
    "--engine",
    type=click.Choice(["ngspice"]),
    help="Let it work out what rests on diodes and transistors.",
)
@click.option("--confirm", is_flag=True, help="Hold range and current findings against ngspice.")
@click.option(
    "--schema",
    is_flag=True,
    is_eager=True,
    expose_value=False,
    callback=_show_schema,
    help="Print the JSON Schema of the JSON report, and review nothing.",
)
@options.no_plugins
def review(  # one parameter an option: click hands them over by name
    files: tuple[str, ...],
    reports: tuple[str, ...],
    hold_at: Severity | None,
    require: str | None,
    stated: Path | None,
    no_settings: bool,
    kind: str | None,
    as_of: dt.date | None,
    root: Path | None,
    corners: str,
    monte_carlo: int,
    no_plugins: bool,
    engine: str | None,
    confirm: bool,
) -> None:
    """Review netlists and report what fails, by what margin, and what to fit instead.

    Status 0: nothing at or above the hold level; 1: something is; 2: not carried out.
    """
    wanted = [_wanted(text) for text in reports] or [("terminal", None)]
    _refuse_two_in_one(wanted)
    check_places(
        [place for _, place in wanted if place is not None], [Path(name) for name in files]
    )
    if root is not None and not root.is_dir():
        raise UsageError(f"{root} is no folder.", remedy="--root names one that holds the decks.")
    changes: dict[str, object] = {}
    if hold_at is not None:
        changes["hold_at"] = hold_at
    if kind is not None:
        changes["kind"] = kind
    if require:
        changes["require"] = _families(require)
    with progress(len(files), "netlists") as step:
        result = run(
            [Path(name) for name in files],
            _settings(stated, no_settings),
            as_of=as_of,
            root=root,
            plugins=not no_plugins,
            options=Options(exact=corners == "exact", samples=monte_carlo),
            changes=changes,
            engine=_engine(engine is not None, confirm),
            step=step,
        )
    for name, place in wanted:
        _deliver(result, name, place, root)
    sys.exit(HOLD if result.held else 0)


def _engine(fill: bool, confirm: bool) -> Simulator | None:
    if not fill and not confirm:
        return None
    # The engine's modules are of use to this request only.
    from railguard.engine.shared import find
    from railguard.simulated import Ngspiced

    return Ngspiced(find(), fill=fill, confirm=confirm)


def _settings(stated: Path | None, none: bool) -> Settings | None:
    if none:
        return Settings()
    return settings_file.load(stated) if stated is not None else None


def _wanted(text: str) -> tuple[str, Path | None]:
    name, sign, place = text.partition("=")
    if name not in FORMATS:
        raise UsageError(
            f'There is no report format "{name}".', remedy=f"Choose one of {', '.join(FORMATS)}."
        )
    if sign and not place:
        raise UsageError(f"--report {text} names no file.", remedy=f"Write --report {name}=FILE.")
    return name, Path(place) if place else None


def _refuse_two_in_one(wanted: list[tuple[str, Path | None]]) -> None:
    """Refuse two reports in one place: neither could be read."""
    places = [place.absolute() if place is not None else None for _, place in wanted]
    for place in places:
        if places.count(place) > 1:
            where = f"go to {place}" if place is not None else "go to the screen"
            raise UsageError(
                f"Two reports {where}.", remedy="Give each a file of its own: --report FORMAT=FILE."
            )


def _families(text: str) -> tuple[Family, ...]:
    known: tuple[Family, ...] = get_args(Family)
    words = [word.strip() for word in text.split(",") if word.strip()]
    for word in words:
        if word not in known:
            raise UsageError(
                f'There is no family "{word}".', remedy=f"The families are {', '.join(known)}."
            )
    return tuple(family for family in known if family in words)


def _deliver(result: Review, name: str, place: Path | None, root: Path | None) -> None:
    """Write one report: to the screen, or into a file whole or not at all."""
    if place is not None:
        write_whole(place, render(name, result, root=root))
    elif name == "terminal":
        render(name, result, sys.stdout)
    else:
        sys.stdout.buffer.write(render(name, result, root=root))
        sys.stdout.buffer.flush()
