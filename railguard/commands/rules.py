"""`railguard rules`: what is judged, by which limits, from which published reason."""

import difflib
from collections.abc import Iterable
from typing import get_args

import click
from rich.console import Console
from rich.table import Table
from rich.text import Text

from railguard.commands import options
from railguard.errors import UsageError
from railguard.rules import third_party
from railguard.rules.circuits import CIRCUITS, Assumed
from railguard.rules.protocol import Limit, Rule
from railguard.rules.registry import RULES
from railguard.units import si
from railguard.words import Family


def _names(context: click.Context, parameter: click.Parameter, begun: str) -> list[str]:
    """Complete the name of a rule or a family, for the user's shell."""
    del context, parameter
    every = (*get_args(Family), *(rule.name for rule in RULES))
    return [name for name in every if name.startswith(begun)]


@click.command()
@click.argument("name", required=False, shell_complete=_names)
@click.option("--markdown", is_flag=True, help="List them as the table of a README.")
@options.no_plugins
def rules(name: str | None, markdown: bool, no_plugins: bool) -> None:
    """List the rules, or explain the one called NAME (or a family).

    `railguard rules circuits` says what is assumed of circuits that are no plain stage.
    """
    if markdown:
        click.echo(as_markdown(), nl=False)
        return
    console = Console(highlight=False)
    brought = third_party.Installed() if no_plugins else third_party.installed()
    families = get_args(Family)
    every = sorted((*RULES, *brought.rules), key=lambda rule: families.index(rule.family))
    if name is None:
        _list(console, every)
        for remark in brought.remarks:
            click.echo(remark.message)
        return
    if name == "circuits":
        for circuit in CIRCUITS:
            _assume(console, circuit)
        return
    found = next((rule for rule in every if rule.name == name), None)
    if found is None:
        family = [rule for rule in every if rule.family == name]
        if not family:
            near = difflib.get_close_matches(name, [rule.name for rule in every], 1)
            hint = f"The nearest is {near[0]}." if near else "railguard rules lists them."
            raise UsageError(f'There is no rule "{name}".', remedy=hint)
        for rule in family:
            _explain(console, rule)
        return
    _explain(console, found)


def _list(console: Console, every: Iterable[Rule]) -> None:
    table = Table(box=None, pad_edge=False, padding=(0, 2, 0, 0))
    for heading in ("rule", "judges", "default limits"):
        table.add_column(heading, overflow="fold", no_wrap=heading == "rule")
    family = ""
    for rule in every:
        if rule.family != family:
            table.add_row(Text(rule.family, style="bold"), "", "")
            family = rule.family
        limits = ", ".join(f"{limit.name} {value_of(limit)}" for limit in rule.limits)
        table.add_row(f"  {rule.name}", Text(rule.judges), Text(limits))
    console.print(table)


def as_markdown() -> str:
    """Return the rules with their limits as a Markdown table, one block a family."""
    lines = ["| rule | speaks when | limits, with their defaults |", "| --- | --- | --- |"]
    for rule in RULES:
        limits = ", ".join(f"`{limit.name}` {value_of(limit)}" for limit in rule.limits)
        judges = rule.judges.replace("|", "\\|")
        lines.append(f"| `{rule.name}` | {judges} | {limits} |")
    return "\n".join(lines) + "\n"


def _assume(console: Console, circuit: Assumed) -> None:
    console.print(Text(circuit.name, style="bold"))
    for label, words in (
        ("seen", circuit.seen),
        ("assumed", circuit.assumed),
        ("instead", circuit.instead),
    ):
        console.print(Text.assemble((f"  {label:<8}", "dim"), words))
    console.print()


def _explain(console: Console, rule: Rule) -> None:
    console.print(Text(rule.name, style="bold"))
    for label, words in (
        ("judges", rule.judges),
        ("because", rule.reason),
        ("source", rule.source),
        ("silent", rule.silent),
    ):
        if words:
            console.print(Text.assemble((f"  {label:<8}", "dim"), words), soft_wrap=False)
    for limit in rule.limits:
        console.print(
            Text.assemble(
                ("  limit   ", "dim"),
                f"{limit.name} = {value_of(limit)}: {limit.meaning} ({limit.source})",
            )
        )
    if rule.limits:
        first = rule.limits[0]
        console.print(
            Text.assemble(
                ("  set     ", "dim"), f"[limits.{rule.name}] {first.name} = ... in railguard.toml"
            )
        )
    console.print()


def value_of(limit: Limit) -> str:
    """Return a limit's default as a report writes it."""
    if limit.unit in ("", "share"):
        return f"{limit.default:g}"
    return si(limit.default, limit.unit)
