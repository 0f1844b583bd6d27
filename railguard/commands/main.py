"""The command line: which commands there are, and how a request that fails is told.

Commands are imported when they are called, so that `--version` and `--help` cost nothing.
"""

import importlib
import sys

import click
from click.shell_completion import CompletionItem

from railguard import __version__
from railguard.errors import RailguardError

CANNOT = 2
"""Exit status of a request that could not be carried out."""

_COMMANDS = {
    "review": ("railguard.commands.review", "review", "Review netlists and report what fails."),
    "sheet": (
        "railguard.commands.sheet",
        "sheet",
        "Print every op-amp with its numbers, as evidence.",
    ),
    "hook": ("railguard.commands.hook.command", "hook", "Review what is about to be committed."),
    "audit": (
        "railguard.commands.audit",
        "audit",
        "Review a whole archive of designs, and see what changed.",
    ),
    "redline": (
        "railguard.commands.redline",
        "redline",
        "Propose changed cards, each proved by a review.",
    ),
    "rules": ("railguard.commands.rules", "rules", "List the rules, or explain one."),
    "devices": (
        "railguard.commands.devices",
        "devices",
        "List the op-amps the catalogue knows, show or measure one.",
    ),
}


class _Lazy(click.Group):
    """A group that imports a command's module only when the command is called."""

    def list_commands(self, ctx: click.Context) -> list[str]:
        del ctx
        return list(_COMMANDS)

    def get_command(self, ctx: click.Context, cmd_name: str) -> click.Command | None:
        del ctx
        if cmd_name not in _COMMANDS:
            return None
        module, name, _ = _COMMANDS[cmd_name]
        command = getattr(importlib.import_module(module), name)
        return command if isinstance(command, click.Command) else None

    def shell_complete(self, ctx: click.Context, incomplete: str) -> list[CompletionItem]:
        """Complete a command's name without importing the commands."""
        options = click.Command.shell_complete(self, ctx, incomplete)
        return options + [
            CompletionItem(name, help=words)
            for name, (_, _, words) in _COMMANDS.items()
            if name.startswith(incomplete)
        ]

    def format_commands(self, ctx: click.Context, formatter: click.HelpFormatter) -> None:
        del ctx
        with formatter.section("Commands"):
            formatter.write_dl([(name, words) for name, (_, _, words) in _COMMANDS.items()])


_HELP = """Check the op-amp stages of SPICE netlists against their devices' limits.

\b
railguard review station.cir         one netlist, before its review
railguard review boards/*.net        many; a table first
railguard redline station.cir        what to change, as a diff
railguard hook install               review what is committed, from now on
railguard rules headroom-output      what a rule judges, and its limits
railguard devices TL072CP            what is known of a device
"""


@click.group(cls=_Lazy, help=_HELP, context_settings={"help_option_names": ["-h", "--help"]})
@click.version_option(__version__, prog_name="railguard", message="%(prog)s %(version)s")
def railguard() -> None:
    """Take the options that stand before a command; there are none but help and version."""


def _plain(error: RailguardError) -> str:
    """Return what an error says; it may quote a settings file that came with a netlist."""
    # Loaded only where there is something to say.
    from railguard.report.visible import visible

    return "\n".join(map(visible, str(error).splitlines()))


def _fault(error: Exception) -> str:
    """Return what is said where railguard itself fails; the trace may quote a netlist."""
    import traceback

    from railguard.report.visible import visible

    trace = "".join(traceback.format_exception(error)).splitlines()
    told = [*getattr(error, "__notes__", []), f"{type(error).__name__}: {error}"]
    return "\n".join(
        [
            *map(visible, trace),
            "",
            f"railguard: this is a fault in railguard, not in the netlist: "
            f"{visible('; '.join(told))}. Nothing was judged. A report with the lines above and, "
            "where it may be shown, the netlist helps to mend it.",
        ]
    )


def main() -> None:
    """Run the command line; a request that cannot be carried out is one sentence and status 2."""
    try:
        railguard(standalone_mode=False)
    except click.exceptions.Abort:
        sys.exit(130)
    except click.ClickException as error:
        error.show()
        sys.exit(CANNOT)
    except RailguardError as error:
        click.echo(f"railguard: {_plain(error)}", err=True)
        sys.exit(CANNOT)
    except BrokenPipeError:
        # The reader of a pipe has gone; nothing is wrong with the review.
        sys.stderr.close()
        sys.exit(0)
    except Exception as error:  # noqa: BLE001 - its own status, 1, would put a netlist on hold
        click.echo(_fault(error), err=True)
        sys.exit(CANNOT)
