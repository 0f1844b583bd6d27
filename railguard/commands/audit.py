"""`railguard audit`: a whole archive of designs into one SQLite file, and reports from it."""

import datetime as dt
import os
import sys
from pathlib import Path

import click
from rich.console import Console

from railguard.commands import options
from railguard.errors import UsageError
from railguard.words import SEVERITIES, Severity


class _RootsOrReport(click.Group):
    """A group whose first word is a root unless it names a command; `./report` is a folder."""

    def parse_args(self, ctx: click.Context, args: list[str]) -> list[str]:
        """Send everything that names no command to `run`."""
        if args and args[0] not in (*self.commands, "--help", "-h"):
            args = ["run", *args]
        return super().parse_args(ctx, args)


_HELP = """Review every netlist below ROOT, and keep what was found in one file.

\b
railguard audit /share/boards --to boards.sqlite     goes on where it was stopped
railguard audit report boards.sqlite                 ranking, families, unknown devices
railguard audit report boards.sqlite --against last-month.sqlite
railguard audit run --help                           all options
"""


@click.group(cls=_RootsOrReport, subcommand_metavar="ROOT... --to FILE | report FILE", help=_HELP)
def audit() -> None:
    """Hold the two commands; each says for itself what it does."""


@audit.command("run", short_help="Audit folders, archives and files (may be left out).")
@click.argument("roots", nargs=-1, required=True, metavar="ROOT...", type=click.Path())
@click.option(
    "--to",
    "target",
    required=True,
    type=click.Path(dir_okay=False, path_type=Path),
    metavar="FILE",
    help="SQLite file for the results; an older one is brought up to date.",
)
@click.option("--skip", "skips", multiple=True, metavar="PATTERN", help="Leave out. Repeatable.")
@click.option(
    "--settings",
    type=click.Path(exists=True, dir_okay=False, path_type=Path),
    metavar="FILE",
    help="A railguard.toml that counts for every design.",
)
@click.option("--trust-settings", is_flag=True, help="Obey railguard.toml files below ROOT.")
@click.option("--hold-at", type=click.Choice(SEVERITIES), help="What puts a design on hold.")
@options.as_of
@click.option(
    "--workers",
    type=click.IntRange(1, 256),
    metavar="N",
    help="Processes at work [one for each core].",
)
@click.option(
    "--cluster",
    metavar="ADDRESS",
    help="Work on this dask.distributed cluster: tcp://host:8786.",
)
@click.option(
    "--seconds",
    type=click.IntRange(1, 86_400),
    default=30,
    metavar="N",
    show_default=True,
    help="Processor time one file may take.",
)
@click.option(
    "--megabytes",
    type=click.IntRange(64, 1_000_000),
    default=1024,
    metavar="N",
    show_default=True,
    help="Memory one file may take.",
)
def run(
    roots: tuple[str, ...],
    target: Path,
    skips: tuple[str, ...],
    settings: Path | None,
    trust_settings: bool,
    hold_at: Severity | None,
    as_of: dt.date | None,
    workers: int | None,
    cluster: str | None,
    seconds: int,
    megabytes: int,
) -> None:
    """Audit folders, archives (zip, tar, gz), single files, and fsspec URLs (s3://bucket/boards).

    Stopped at any moment, the same command goes on. Files whose content, settings and railguard
    have not changed are not reviewed again. No link is followed. Status 0: done; 2: not carried
    out.
    """
    from railguard.audit import run as running
    from railguard.audit.build import identity
    from railguard.audit.progress import Display
    from railguard.audit.store import Store
    from railguard.audit.trees import is_url
    from railguard.audit.walk import USUAL_SKIPS
    from railguard.audit.wire import Budget, Plan

    for root in roots:
        if not is_url(root) and not Path(root).exists():
            raise UsageError(f"{root} does not exist.", remedy="Check the path.")
    plan = Plan(
        roots=tuple(root if is_url(root) else str(Path(root).absolute()) for root in roots),
        labels=running.labels(roots),
        settings=_text(settings),
        hold_at=hold_at,
        trust=trust_settings,
        day=(as_of or dt.date.today()).isoformat(),
        build=identity(),
        budget=Budget(seconds=seconds, megabytes=megabytes),
    )
    console = Console(stderr=True, highlight=False)
    with Store(target) as store:
        if store.resumed:
            console.print("Going on with the run that was not finished.")
        left_out = (*USUAL_SKIPS, *skips, *_own(target))
        with Display(console) as display:
            if cluster is not None:
                running.audit_on(plan, store, cluster, left_out, display)
            else:
                running.audit(plan, store, workers or _cores(), left_out, display)
    console.print(
        f"{display.done} files met, {display.reviewed} designs reviewed, {display.same} unchanged."
    )
    console.print(f"See what was found: railguard audit report {target}", markup=False)


def _text(settings: Path | None) -> str:
    """Return the settings file's text, once it is known to be one that can be obeyed.

    Raises SettingsError: it cannot.
    """
    if settings is None:
        return ""
    from railguard.rules.registry import known_limits
    from railguard.settings.file import load
    from railguard.settings.names import check_names

    check_names(load(settings), known_limits())
    return settings.read_text(encoding="utf-8-sig")


def _own(target: Path) -> tuple[str, ...]:
    return tuple(f"{target.name}{end}" for end in ("", "-wal", "-shm"))


def _cores() -> int:
    return len(os.sched_getaffinity(0)) if hasattr(os, "sched_getaffinity") else os.cpu_count() or 1


_FORMATS = ("terminal", "html", "csv", "json")


@audit.command("report", short_help="Ranking, families, unknown devices, what was not read.")
@click.argument(
    "base", type=click.Path(exists=True, dir_okay=False, path_type=Path), metavar="FILE"
)
@click.option("--as", "form", type=click.Choice(_FORMATS), default="terminal", show_default=True)
@click.option(
    "--to", "target", type=click.Path(path_type=Path), metavar="FILE", help="Write it there."
)
@click.option(
    "--against",
    type=click.Path(exists=True, dir_okay=False, path_type=Path),
    metavar="OLDER",
    help="An earlier audit: show what is new, gone and worse.",
)
def report(base: Path, form: str, target: Path | None, against: Path | None) -> None:
    """Report what an audit found, the worst design first."""
    from railguard.audit.reports import render
    from railguard.commands.deliver import write_whole

    if target is not None:
        write_whole(target, b"".join(render(form, base, against)))
        return
    for piece in render(form, base, against, sys.stdout if form == "terminal" else None):
        sys.stdout.buffer.write(piece)
    sys.stdout.buffer.flush()
