"""`railguard rules`: what is judged, by which limits, from which published reason."""

import difflib

import click
from rich.console import Console
from rich.table import Table
from rich.text import Text

from railguard.errors import UsageError
from railguard.rules.protocol import Limit, Rule
from railguard.rules.registry import RULES
from railguard.units import si


@click.command()
@click.argument("name", required=False)
@click.option("--markdown", is_flag=True, help="List them as the table of a README.")
def rules(name: str | None, markdown: bool) -> None:
    """List the rules, or explain the one called NAME (or a family)."""
    if markdown:
        click.echo(as_markdown(), nl=False)
        return
    console = Console(highlight=False)
    if name is None:
        _list(console)
        return
    found = next((rule for rule in RULES if rule.name == name), None)
    if found is None:
        family = [rule for rule in RULES if rule.family == name]
        if not family:
            near = difflib.get_close_matches(name, [rule.name for rule in RULES], 1)
            hint = f"The nearest is {near[0]}." if near else "railguard rules lists them."
            raise UsageError(f'There is no rule "{name}".', remedy=hint)
        for rule in family:
            _explain(console, rule)
        return
    _explain(console, found)


def _list(console: Console) -> None:
    table = Table(box=None, pad_edge=False, padding=(0, 2, 0, 0))
    for heading in ("rule", "judges", "default limits"):
        table.add_column(heading, overflow="fold", no_wrap=heading == "rule")
    family = ""
    for rule in RULES:
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
