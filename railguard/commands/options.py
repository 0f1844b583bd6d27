"""Options that several commands have, each in the same words."""

import datetime as dt
from pathlib import Path

import click

from railguard.errors import UsageError


def _day(_context: click.Context, _parameter: click.Parameter, text: str | None) -> dt.date | None:
    if text is None:
        return None
    try:
        return dt.date.fromisoformat(text)
    except ValueError:
        raise UsageError(f'"{text}" is no date.', remedy="Write it as 2027-01-31.") from None


settings = click.option(
    "--settings",
    "stated",
    type=click.Path(path_type=Path),
    metavar="FILE",
    help="This file instead of the railguard.toml beside the netlist.",
)
no_settings = click.option("--no-settings", is_flag=True, help="Obey no railguard.toml.")
kind = click.option("--kind", type=click.Choice(["board", "bench"]), help="Judge it as this.")
root = click.option(
    "--root",
    type=click.Path(path_type=Path),
    metavar="DIR",
    help="Includes may lie anywhere below it [the netlist's folder].",
)
as_of = click.option(
    "--as-of", metavar="DATE", callback=_day, help="Judge waivers on this day [today]."
)
monte_carlo = click.option(
    "--monte-carlo",
    type=click.IntRange(0, 1_000_000),
    default=0,
    metavar="N",
    help="Draw N samples beside the corners.",
)
no_plugins = click.option(
    "--no-plugins", is_flag=True, help="Leave out the rules other packages bring."
)
