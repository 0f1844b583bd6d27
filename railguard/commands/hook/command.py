"""The four things to do with the hook: install, remove, status, and run, which git does."""

import sys
from collections.abc import Callable
from pathlib import Path
from typing import TypeVar

import click

from railguard.commands.hook import script
from railguard.commands.hook.git import top_folder
from railguard.commands.hook.staged import concerned
from railguard.errors import UsageError
from railguard.words import SEVERITIES, Severity

HOLD = 1
"""Exit status that stops a commit."""

_Command = TypeVar("_Command", bound=Callable[..., object])


def _options(command: _Command) -> _Command:
    """Give a command the options of a review of what is staged."""
    for option in (
        click.option("--no-plugins", is_flag=True, help="Leave out rules other packages bring."),
        click.option(
            "--root",
            metavar="DIR",
            help="Includes may lie anywhere below it, seen from the top [each netlist's folder].",
        ),
        click.option("--hold-at", type=click.Choice(SEVERITIES), help="What stops [major]."),
        click.option(
            "--new-only",
            is_flag=True,
            help="Let pass what the committed version already had, unless it got worse.",
        ),
    ):
        command = option(command)
    return command


@click.group(context_settings={"help_option_names": ["-h", "--help"]})
def hook() -> None:
    """Review netlists as they are about to be committed.

    \b
    railguard hook install               in this repository, beside other hooks
    railguard hook install --new-only    stop what is new or worse only
    git commit --no-verify               commit without a review
    """  # noqa: D301 - click's own mark for lines to be left as they are


@hook.command()
@_options
def install(new_only: bool, hold_at: Severity | None, root: str | None, no_plugins: bool) -> None:
    """Put the hook into this repository; one that is there already runs first."""
    top = top_folder()
    options = [
        *(["--new-only"] if new_only else []),
        # in one word each: what stands alone is a path
        *([f"--hold-at={hold_at}"] if hold_at is not None else []),
        *([f"--root={root}"] if root is not None else []),
        *(["--no-plugins"] if no_plugins else []),
    ]
    hooks = script.install(top, options)
    _tell(top, hooks)


@hook.command()
def remove() -> None:
    """Take the hook out, and put back the one that was there before."""
    removed = script.remove(top_folder())
    for one in removed:
        back = ", and the one before it is back" if one.kept else ""
        click.echo(f"{one.path} is removed{back}.")
    if not removed:
        click.echo("There is no hook of railguard here.")


@hook.command()
def status() -> None:
    """Tell where the hook is and what it does. Status 0: it is in place and can run."""
    top = top_folder()
    hooks = script.look(top)
    _tell(top, hooks)
    works = all(one.state in ("ours", "changed") and _runs(one) for one in hooks)
    sys.exit(0 if works else 1)


def _runs(one: script.Hook) -> bool:
    return Path(one.python).exists()


_WORDS: dict[script.State, str] = {
    "absent": "not installed",
    "ours": "installed",
    "changed": "installed, and edited by hand since",
    "foreign": "another hook; 'railguard hook install' keeps it and runs it first",
}


def _tell(top: str, hooks: tuple[script.Hook, ...]) -> None:
    for one in hooks:
        click.echo(f"{one.name:<18}{_WORDS[one.state]}")
        click.echo(f"{'':<18}{one.path}")
        if one.state not in ("ours", "changed"):
            continue
        if one.options:
            click.echo(f"{'':<18}options: {one.options}")
        if one.kept:
            click.echo(f"{'':<18}first runs {one.before.name}, which was there before")
        if not _runs(one):
            click.echo(f"{'':<18}{one.python} is gone: run 'railguard hook install' again")
    scope = script.placed_by(top)
    if scope in ("global", "system"):
        click.echo(
            f"core.hooksPath is set for {'this user' if scope == 'global' else 'this machine'}: "
            "the folder serves every repository without one of its own."
        )


def _from_top(path: str, top: str) -> str:
    whole = Path(path).absolute()
    for way in (whole, whole.resolve()):
        if way.is_relative_to(top):
            return way.relative_to(top).as_posix()
    raise UsageError(f"{path} is not in the repository at {top}.")


@hook.command()
@click.argument("paths", nargs=-1, metavar="[PATH]...", type=click.Path())
@_options
def run(
    paths: tuple[str, ...],
    new_only: bool,
    hold_at: Severity | None,
    root: str | None,
    no_plugins: bool,
) -> None:
    """Review what is staged, as git does before a commit; each PATH is taken as changed.

    Status 0: nothing at or above the hold level; 1: something is; 2: not carried out.
    """
    top = top_folder()
    named = [_from_top(path, top) for path in paths]
    if not concerned(top, named):
        return
    # only a commit that concerns a netlist pays for these
    from railguard.commands.hook.run import Wanted, review_staged
    from railguard.commands.hook.tell import tell

    wanted = Wanted(
        new_only=new_only,
        root=root,
        plugins=not no_plugins,
        changes={"hold_at": hold_at} if hold_at is not None else {},
    )
    outcome = review_staged(top, wanted, named)
    tell(outcome, sys.stdout)
    sys.exit(HOLD if outcome.review is not None and outcome.review.held else 0)
