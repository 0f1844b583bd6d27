"""`railguard sheet`: every op-amp with its numbers, fit to be filed as review evidence."""

import datetime as dt
import sys
from pathlib import Path

import click

from railguard.analysis.solution import Options
from railguard.commands import options
from railguard.errors import UsageError
from railguard.report import sheet as sheets
from railguard.report import sheet_forms as forms
from railguard.reviewing import review as run
from railguard.settings import file as settings_file

_BYTES = {"csv": forms.as_csv, "json": forms.as_json, "markdown": forms.as_markdown}


@click.command()
@click.argument("files", nargs=-1, required=True, metavar="FILE...", type=click.Path())
@click.option("--of", "only", default="", metavar="XU3", help="This stage alone.")
@click.option("--as", "how", type=click.Choice(["screen", *_BYTES]), default="screen")
@options.settings
@options.as_of
@options.monte_carlo
def sheet(
    files: tuple[str, ...],
    only: str,
    how: str,
    stated: Path | None,
    as_of: dt.date | None,
    monte_carlo: int,
) -> None:
    """Print the stage sheet: for every op-amp what is asked for and what it can do."""
    result = run(
        [Path(name) for name in files],
        settings_file.load(stated) if stated is not None else None,
        as_of=as_of,
        options=Options(samples=monte_carlo),
    )
    found = sheets.rows(result, only)
    if only and not found:
        names = [s.designator for d in result.designs for s in d.design.stages]
        known = f"There are {', '.join(names[:12])}." if names else "No op-amp was recognised."
        raise UsageError(f'There is no stage "{only}".', remedy=known)
    if how != "screen":
        sys.stdout.buffer.write(_BYTES[how](found))
        return
    from rich.console import Console

    forms.screen(found, Console(highlight=False, markup=False, emoji=False))
