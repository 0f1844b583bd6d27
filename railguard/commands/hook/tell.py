"""What a person reads who is about to commit: what holds, and nothing else."""

from typing import IO

import click

from railguard.commands.hook.run import Outcome
from railguard.report.visible import visible
from railguard.report.words import plural
from railguard.reviewing import Review


def tell(outcome: Outcome, stream: IO[str]) -> None:
    """Print what came of the review; one line where nothing stops the commit."""
    for note in outcome.notes:
        click.echo(f"railguard: {visible(note)}", file=stream)
    if outcome.review is None:
        return
    if outcome.review.held:
        # a commit that passes does not pay for the drawing of scales
        from railguard.report.terminal import held

        held(outcome.review, stream)
        _stopped(outcome, outcome.review, stream)
    else:
        click.echo(f"railguard: {_passed(outcome, outcome.review)}", file=stream)


def _stopped(outcome: Outcome, review: Review, stream: IO[str]) -> None:
    held_paths = [visible(d.path) for d in review.designs if d.verdict == "hold"]
    count = plural(len(review.designs), "netlist")
    click.echo(
        f"railguard: commit stopped; {len(held_paths)} of {count} on hold.{_left_out(outcome)}",
        file=stream,
    )
    click.echo(f"  all that was found      railguard review {_quoted(held_paths[0])}", file=stream)
    click.echo("  commit it all the same  git commit --no-verify", file=stream)


def _passed(outcome: Outcome, review: Review) -> str:
    levels = sorted({design.design.settings.hold_at for design in review.designs})
    open_ = sum(design.open for design in review.designs)
    unchecked = f"; {open_} not checked" if open_ else ""
    return (
        f"{plural(len(review.designs), 'netlist')} reviewed, nothing at {' or '.join(levels)} "
        f"or above{unchecked}.{_left_out(outcome)}"
    )


def _left_out(outcome: Outcome) -> str:
    if not outcome.left_out:
        return ""
    return f" {plural(outcome.left_out, 'finding')} of the committed version not counted."


def _quoted(path: str) -> str:
    return f'"{path}"' if " " in path else path
