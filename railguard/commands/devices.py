"""`railguard devices`: what the catalogue knows, family by family, with its sources."""

from fnmatch import fnmatchcase
from pathlib import Path

import click
from rich.console import Console
from rich.markup import escape
from rich.table import Table

from railguard.commands.device_sheet import figures
from railguard.commands.measure import measure
from railguard.devices.catalogue import Catalogue, load
from railguard.devices.describe import facts, legend
from railguard.devices.match import spell_out
from railguard.devices.model import Device
from railguard.errors import UsageError
from railguard.settings import file as settings_file


class _ByPattern(click.Group):
    """A group whose unknown first word is a pattern: `railguard devices TL07*`."""

    def parse_args(self, ctx: click.Context, args: list[str]) -> list[str]:
        """Send everything that names no command to `show`."""
        if not args or args[0] not in (*self.commands, "--help", "-h"):
            args = ["show", *args]
        return super().parse_args(ctx, args)


@click.group(cls=_ByPattern, subcommand_metavar="[PATTERN] | COMMAND ...")
def devices() -> None:
    """List the op-amps the catalogue knows, or show one with its sources.

    PATTERN is an order code (TL072CP), part of a family's name, or a name with * and ?. With
    `--devices FILE` the `[[devices]]` tables of that file stand on top of the catalogue.
    """


@devices.command(hidden=True)
@click.argument("pattern", default="")
@click.option(
    "--devices",
    "own",
    type=click.Path(exists=True, dir_okay=False, path_type=Path),
    help="A TOML file with [[devices]] tables.",
)
def show(pattern: str, own: Path | None) -> None:
    """List families, or show the one that PATTERN leads to."""
    catalogue = load(settings_file.load(own).devices if own else ())
    found = _matching(catalogue, pattern)
    console = Console(highlight=False)
    if len(found) == 1 and pattern:
        _show(console, catalogue, found[0])
    else:
        _list(console, catalogue, found)


devices.add_command(measure)


def _matching(catalogue: Catalogue, pattern: str) -> tuple[str, ...]:
    """Return the families a pattern means: by order code first, then by name."""
    if not pattern:
        return catalogue.families()
    match = catalogue.match(pattern)
    if match.device is not None:
        return (match.device.family, *match.also)
    wanted = pattern.upper()
    glob = wanted if any(sign in wanted for sign in "*?[") else f"*{wanted}*"
    found = tuple(
        family
        for family in catalogue.families()
        if any(
            fnmatchcase(name.upper(), glob)
            for code in (family, *catalogue.order_codes(family))
            for name in spell_out(code)
        )
    )
    if found or match.also:
        return found or match.also
    if match.sort not in ("unknown", "op-amp"):
        raise UsageError(f"{pattern} is no op-amp: the catalogue takes it for {_noun(match.sort)}.")
    known = "is an op-amp the catalogue has no figures of" if match.sort == "op-amp" else ""
    near = (
        f"The nearest name is {match.nearest}."
        if match.nearest
        else "`railguard devices` lists all."
    )
    raise UsageError(f"{pattern} {known or 'is not in the catalogue'}.", remedy=near)


def _noun(sort: str) -> str:
    return {
        "instrumentation": "an instrumentation amplifier",
        "generic": "an amplifier without a type",
        "other": "another kind of device",
    }.get(sort, f"a {sort}")


def _list(console: Console, catalogue: Catalogue, families: tuple[str, ...]) -> None:
    table = Table(box=None, pad_edge=False, header_style="bold")
    for heading in ("family", "order codes", "supply, V", "described as"):
        table.add_column(heading, overflow="fold")
    for family in families:
        device = catalogue.device(family)
        table.add_row(
            family, _codes(catalogue.order_codes(family)), _span(device), escape(device.description)
        )
    console.print(table)
    console.print(f"{len(families)} families. `railguard devices NAME` shows one with its sources.")


def _codes(names: tuple[str, ...]) -> str:
    shown = " ".join(names[:3])
    return escape(shown + (" ..." if len(names) > 3 else ""))


def _span(device: Device) -> str:
    ends = (device.supply_low, device.supply_high)
    return " to ".join(f"{volts:g}" if volts is not None else "?" for volts in ends)


def _show(console: Console, catalogue: Catalogue, family: str) -> None:
    device = catalogue.device(family)
    console.print(f"[bold]{escape(family)}[/]  {escape(device.description)}")
    console.print(escape(facts(device)))
    console.print(
        escape("Order codes begin with " + ", ".join(catalogue.order_codes(family)) + ".")
    )
    if device.conditions:
        console.print(escape(f"Figures hold at {device.conditions}, unless a row says otherwise."))
    console.print()
    console.print(figures(device))
    console.print()
    for mark, meaning in legend(device):
        console.print(f"{mark} {meaning}")
    seen = "" if device.source.seen else " (not seen: every figure is from memory)"
    console.print(escape(f"Source: {device.source}{seen}"), soft_wrap=False)
    if device.location is not None:
        console.print(escape(f"Stated in {device.location}."))
    if device.notes:
        console.print()
        console.print(escape(device.notes))
