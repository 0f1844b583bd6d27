"""The command line itself: its help, its version, and what they cost."""

import os
import subprocess
import sys
from pathlib import Path

import pytest

import railguard
from railguard.commands.main import main

STATION = Path(__file__).parents[2] / "fixtures" / "station" / "station.cir"
HEAVY = ("numpy", "lark", "rich.console", "scipy", "railguard.reviewing")


def run(*arguments, env=None):
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
        [sys.executable, "-c", code],
        env={**os.environ, **(env or {})},
        capture_output=True,
        text=True,
        encoding="utf-8",
        check=False,
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


def completed(shell, *words):
    """Return what a shell is offered for the last of some words."""
    line = " ".join(("railguard", *words))
    asked = {"COMP_WORDS": line, "COMP_CWORD": str(len(words))}
    done = run(env={"_RAILGUARD_COMPLETE": f"{shell}_complete", **asked})
    assert done.returncode == 0
    return done


@pytest.mark.parametrize(
    ("words", "offered"),
    [
        (["re"], "plain,review"),
        (["rules", "headroom-out"], "plain,headroom-output"),
        (["review", "--hold"], "plain,--hold-at"),
        (["review", "--hold-at", "ma"], "plain,major"),
        (["review", "boards/ga"], "file,"),
        (["hook", "ins"], "plain,install"),
    ],
)
def test_the_shell_completes(words, offered):
    """Commands, rules, options, their values, and files."""
    told = completed("bash", *words).stdout
    assert any(line.startswith(offered) for line in told.splitlines()), told


def test_completing_a_command_imports_no_command():
    """A key press waits for nothing of weight."""
    assert completed("bash", "re").stderr.split() == []


@pytest.mark.parametrize("shell", ["bash", "zsh", "fish"])
def test_a_shells_script_is_printed(shell):
    """As the README says."""
    done = run(env={"_RAILGUARD_COMPLETE": f"{shell}_source"})
    assert "_RAILGUARD_COMPLETE" in done.stdout
    readme = (Path(__file__).parents[2] / "README.md").read_text(encoding="utf-8")
    assert f"_RAILGUARD_COMPLETE={shell}_source railguard" in readme


@pytest.mark.parametrize("command", ["review", "sheet", "hook", "audit", "rules", "devices"])
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


def test_a_fault_of_railguard_itself_is_status_2(monkeypatch, capsys):
    """Status 1 would say that the netlist is on hold; a hook would block on a false claim."""

    def broken(*_):
        raise TypeError("no such \x1b[31mmatrix")

    monkeypatch.setattr("railguard.reviewing.analyse", broken)
    monkeypatch.setattr(sys, "argv", ["railguard", "review", str(STATION)])
    with pytest.raises(SystemExit) as stopped:
        main()
    said = capsys.readouterr().err
    assert stopped.value.code == 2
    assert "a fault in railguard" in said
    assert f"while reviewing {STATION}" in said
    assert "\x1b" not in said
