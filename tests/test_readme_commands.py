"""Every `railguard ...` the README writes is run, on shipped netlists in its files' places."""

import re
import shlex
import shutil
import subprocess
from pathlib import Path

import pytest
from click.testing import CliRunner

from railguard.commands.main import railguard

ROOT = Path(__file__).parents[1]
README = (ROOT / "README.md").read_text(encoding="utf-8")
PLACES = {
    "FILE": "station.cir",
    "FILE...": "station.cir",
    "ROOT...": "boards",
    "/share/boards": "boards",
    "[NAME]": "headroom-output",
    "NAME": "headroom-output",
    "[PATTERN]": "TL072",
    "NEWFILE": "changed.cir",
    "boards/*.net": "boards/gauge_board.cir boards/clipped.cir",
}
"""What stands for a file or a name of the reader's, and what is taken for it here."""

BEHIND = {"--to": "boards.sqlite", "--write": "changed.cir", "--hold-at": "minor", "--root": "."}
"""What stands for a value behind an option, and what is taken for it."""


def written():
    """Return every command the README writes: in its blocks, and between backquotes."""
    # In a block that shows a screen only what stands behind the prompt is a command.
    blocks = "\n".join(
        block.split("\n")[1] if block.startswith("\n$ ") else block
        for block in README.split("```")[1::2]
    )
    lines = re.findall(r"^(?:\$ |  - run: |    - )?(railguard [a-z].*)$", blocks, re.MULTILINE)
    prose = re.sub(r"```.*?```", "", README, flags=re.DOTALL).split("<!-- rules -->")[0]
    quoted = [" ".join(text.split()) for text in re.findall(r"`(railguard [a-z][^`]*)`", prose)]
    return list(dict.fromkeys(line.split("  #")[0].strip() for line in [*lines, *quoted]))


def taken(command):
    """Return a command's words with files that are there."""
    words = []
    for word in shlex.split(command)[1:]:
        if words and words[-1] in BEHIND and word.isupper():
            words.append(BEHIND[words[-1]])
        else:
            words += PLACES.get(word, word).split()
    return words


@pytest.fixture(scope="module")
def laid(tmp_path_factory):
    """A git repository with what the commands are given."""
    folder = tmp_path_factory.mktemp("reader")
    (folder / "boards").mkdir()
    shutil.copy(ROOT / "fixtures" / "station" / "station.cir", folder)
    shutil.copy(ROOT / "fixtures" / "board" / "gauge_board.cir", folder / "boards")
    shutil.copy(ROOT / "fixtures" / "faults" / "headroom-output.cir", folder / "boards/clipped.cir")
    shutil.copytree(ROOT / "fixtures" / "faults", folder / "fixtures" / "faults")
    subprocess.run(["git", "init", "-q", str(folder)], check=True)
    for base in ("boards.sqlite", "last-month.sqlite"):
        made = ["audit", str(folder / "boards"), "--to", str(folder / base), "--workers", "1"]
        assert CliRunner().invoke(railguard, made).exit_code == 0
    return folder


def test_there_are_commands_to_run():
    """Of every kind the README tells of."""
    first = {command.split()[1] for command in written()}
    assert first >= {"review", "sheet", "audit", "redline", "hook", "rules", "devices"}


@pytest.mark.parametrize("command", written())
def test_a_command_of_the_readme_runs(command, laid, monkeypatch):
    """Status 0 or 1, never 2: it is carried out."""
    monkeypatch.chdir(laid)
    words = taken(command)
    if words[:2] == ["devices", "measure"] or len(words) == 1:
        words.append("--help")  # the text names the command, and gives it nothing to do
    result = CliRunner().invoke(railguard, words)
    assert result.exit_code in (0, 1), (words, result.output, result.exception)
    assert result.exception is None or isinstance(result.exception, SystemExit)
