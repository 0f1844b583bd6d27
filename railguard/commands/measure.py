"""`railguard devices measure`: an op-amp's macromodel on ngspice benches, as a catalogue entry."""

from pathlib import Path
from typing import TYPE_CHECKING

import click
from rich.console import Console
from rich.markup import escape
from rich.progress import BarColumn, MofNCompleteColumn, Progress, TextColumn

from railguard.commands.device_sheet import figures
from railguard.devices.catalogue import load
from railguard.devices.layout import read_table
from railguard.devices.schema import faults
from railguard.devices.tables import device_of
from railguard.errors import UsageError

if TYPE_CHECKING:
    from railguard.engine.measure import Outcome
    from railguard.engine.process import Engine
    from railguard.engine.specimen import Specimen

USUAL_SUPPLY = 5.0
"""V, for a model whose name the catalogue does not know."""


@click.command()
@click.argument("file", type=click.Path(exists=True, dir_okay=False, path_type=Path))
@click.option(
    "--subckt", "name", required=True, metavar="NAME", help="Name of the macromodel in FILE."
)
@click.option("--supply", type=click.FloatRange(0.5, 200.0), metavar="VOLTS", help="Total supply.")
@click.option(
    "--pins", default="", metavar="ORDER", help='Order of its ports: "in+ in- v+ v- out".'
)
@click.option(
    "--write",
    "target",
    type=click.Path(path_type=Path),
    metavar="NEWFILE",
    help="Write the entry here.",
)
@click.option(
    "--ngspice", "binary", default="", metavar="PATH", help="Path of the ngspice program."
)
def measure(
    file: Path, name: str, supply: float | None, pins: str, target: Path | None, binary: str
) -> None:
    """Measure the macromodel NAME of FILE and show it as a catalogue entry.

    Offset, bias and supply current, swing into several loads, source and sink limit,
    gain-bandwidth product, slew rate and input range are taken with ngspice. With --write the entry
    goes to a file that `--devices` and railguard.toml understand.
    """
    # The reader and the simulator's side bring lark, numpy and PySpice, which the catalogue's own
    # commands do without.
    from railguard.deck.files import read_deck
    from railguard.engine.entry import as_toml, entry
    from railguard.engine.ngspice import find
    from railguard.engine.specimen import specimen

    if target is not None and target.exists():
        raise UsageError(f"{target} exists already.", remedy="Name a file that does not.")
    engine = find(binary)
    made = specimen(read_deck(file), name, tuple(pins.split()))
    volts = supply or _sheet_supply(made.name)
    console = Console(highlight=False)
    outcomes = _run(console, made, engine, volts)
    if all(outcome.failed for outcome in outcomes):
        raise UsageError(f"{made.name} could not be measured: {outcomes[0].failed}")
    table = entry(made, str(file), volts, outcomes)
    _show(console, table, outcomes)
    if target is not None:
        target.write_text(as_toml(table), encoding="utf-8")
        console.print(escape(f"Written to {target}."))


def _sheet_supply(name: str) -> float:
    """Return the supply the family's sheet is written for, where the catalogue knows the name."""
    device = load().match(name).device
    return (device.sheet_supply if device else None) or USUAL_SUPPLY


def _run(
    console: Console, made: "Specimen", engine: "Engine", supply: float
) -> "tuple[Outcome, ...]":
    from railguard.engine.measure import BENCHES
    from railguard.engine.measure import measure as run_benches

    columns = (TextColumn("{task.description}"), BarColumn(24), MofNCompleteColumn())
    outcomes = []
    with Progress(
        *columns, console=console, transient=True, disable=not console.is_terminal
    ) as progress:
        task = progress.add_task(BENCHES[0][0], total=len(BENCHES))
        for done, outcome in enumerate(run_benches(made, engine, supply), start=1):
            outcomes.append(outcome)
            following = BENCHES[min(done, len(BENCHES) - 1)][0]
            progress.update(task, advance=1, description=following)
    return tuple(outcomes)


def _show(console: Console, table: dict[str, object], outcomes: "tuple[Outcome, ...]") -> None:
    device = device_of(read_table(table), stated_by_user=True)
    console.print(f"[bold]{escape(device.family)}[/]  {escape(device.conditions)}")
    console.print()
    console.print(figures(device))
    console.print()
    for outcome in outcomes:
        for remark in outcome.remarks:
            console.print(escape(remark))
        if outcome.failed:
            console.print(escape(f"Not measured: {outcome.bench}. {outcome.failed}"))
    for fault in faults(device):
        console.print(escape(f"No real op-amp: {fault}."))
    console.print("Typical behaviour of a macromodel: nothing here is guaranteed.")
