"""The command line itself: its help, its version, and what they cost."""

import subprocess
import sys

import pytest

import railguard

HEAVY = ("numpy", "lark", "rich.console", "scipy", "railguard.reviewing")


def run(*arguments):
    """Run the command in a process of its own, listing what it imported."""
    code = (
        "import sys, atexit\n"
        f"atexit.register(lambda: print(*[m for m in {HEAVY!r} if m in sys.modules],"
        " file=sys.stderr))\n"
        f"sys.argv = ['railguard', *{arguments!r}]\n"
        "from railguard.commands.main import main\n"
        "main()\n"
    )
    return subprocess.run(
        [sys.executable, "-c", code], capture_output=True, text=True, encoding="utf-8", check=False
    )


def test_version_is_the_packages():
    """One line, with the version the package carries."""
    done = run("--version")
    assert done.stdout == f"railguard {railguard.__version__}\n"


@pytest.mark.parametrize("argument", ["--version", "--help"])
def test_help_and_version_import_nothing_of_weight(argument):
    """Neither the numbers nor the reader are needed to say what the tool is."""
    done = run(argument)
    assert done.returncode == 0
    assert done.stderr.split() == []


def test_help_fits_a_screen_and_shows_examples():
    """24 lines of 80 columns, with a command to paste."""
    lines = run("--help").stdout.splitlines()
    assert len(lines) <= 24
    assert max(map(len, lines)) <= 80
    assert any("railguard review station.cir" in line for line in lines)


@pytest.mark.parametrize("command", ["review", "sheet", "rules", "devices"])
def test_every_command_has_help(command):
    """Each command that is listed can be asked what it does."""
    done = run(command, "--help")
    assert done.returncode == 0
    assert done.stdout.startswith(f"Usage: railguard {command}")


@pytest.mark.parametrize("arguments", [["reveiw"], ["review"], ["review", "--holdat", "minor"]])
def test_misspelt_request_has_status_2(arguments):
    """A command, an argument or an option that is not there."""
    done = run(*arguments)
    assert done.returncode == 2
    assert "Traceback" not in done.stderr
