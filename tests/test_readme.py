"""What the README says is what the project does."""

import os
import re
import shlex
import subprocess
import sys
import tomllib
from pathlib import Path

import yaml
from click.testing import CliRunner

import railguard
from railguard.commands.main import railguard as railguard_command
from railguard.commands.rules import as_markdown
from railguard.report.formats import FORMATS
from railguard.report.terminal import terminal
from railguard.reviewing import review
from railguard.settings.file import parse
from tests import write_readme

ROOT = Path(__file__).parents[1]
README = (ROOT / "README.md").read_text(encoding="utf-8")


def _blocks(language):
    return [part.split("```")[0] for part in README.split(f"```{language}\n")[1:]]


def test_rules_table_is_the_registry():
    """The table of rules comes from the rules themselves."""
    table = README.split("<!-- rules -->\n")[1].split("<!-- /rules -->")[0]
    assert table == as_markdown()


def test_shown_report_is_a_real_one(monkeypatch):
    """The pasted report is what the command prints today."""
    monkeypatch.chdir(ROOT)
    name = "fixtures/faults/headroom-output.cir"
    shown = README.split(f"$ railguard review {name}\n")[1].split("```")[0]
    assert shown.rstrip() == terminal(review(Path(name)), None).decode().rstrip()


def test_pictures_are_there_and_the_terminals_is_a_real_one():
    """`python tests/write_readme.py` makes them; the page's own is drawn by a browser."""
    for name in ("terminal.svg", "page.png"):
        assert f"(.pictures/{name})" in README
        assert (ROOT / ".pictures" / name).is_file()
    shown = (ROOT / ".pictures" / "terminal.svg").read_text(encoding="utf-8")
    assert shown == write_readme.terminal_picture()


def test_writing_the_readme_anew_changes_nothing():
    """The script that makes its generated parts finds them as they are."""
    assert write_readme.rewritten(README) == README


def test_settings_example_is_valid():
    """The example of railguard.toml is read without complaint."""
    example = _blocks("toml")[0]
    assert tomllib.loads(example)
    assert parse(example, "railguard.toml").hold_at == "major"


def test_every_report_format_is_listed():
    """The table of reports names each format, and no other."""
    table = README.split("## Reports\n")[1].split("## ")[0]
    cells = [line.split("|")[1] for line in table.splitlines() if line.startswith("| `")]
    assert sorted(name for cell in cells for name in re.findall(r"`(\w+)`", cell)) == sorted(
        FORMATS
    )


def test_workflow_examples_are_yaml():
    """Both can be pasted, and ask for formats there are."""
    examples = [yaml.safe_load(block) for block in _blocks("yaml")]
    assert len(examples) >= 2
    asked = re.findall(r"--report (\w+)", README)
    assert set(asked) <= {*FORMATS, "FORMAT"}


def test_python_example_runs(monkeypatch, capsys):
    """The Python example runs as it stands."""
    monkeypatch.chdir(ROOT)
    exec(compile(_blocks("python")[0], "README.md", "exec"), {})
    assert capsys.readouterr().out.startswith("pass")


def test_pyspice_example_runs_as_a_test(tmp_path):
    """The second Python example is a test that passes, and fails on a gain that is too high."""
    example = _blocks("python")[1]
    assert _passes(tmp_path / "test_sound.py", example)
    assert not _passes(tmp_path / "test_clipped.py", example.replace("20e3", "200e3"))


def _passes(place, text):
    place.write_text(text, encoding="utf-8")
    done = subprocess.run(
        [sys.executable, "-m", "pytest", "-q", "-p", "no:cacheprovider", str(place)],
        cwd=place.parent,
        env={**os.environ, "PYTHONPATH": str(ROOT)},
        capture_output=True,
        text=True,
        check=False,
    )
    assert "1 passed" in done.stdout or "headroom-output" in done.stdout, done.stdout
    return done.returncode == 0


def test_framework_example_names_the_hook():
    """The id and the arguments are those that are offered."""
    example = next(block for block in _blocks("yaml") if "- id:" in block)
    offered = (ROOT / ".pre-commit-hooks.yaml").read_text(encoding="utf-8")
    name = re.search(r"- id: (\S+)", example)[1]
    assert f"- id: {name}\n" in offered
    version = re.search(r"rev: v(\S+)", example)[1]
    assert version == railguard.__version__


def test_every_command_of_the_readme_is_there(tmp_path, monkeypatch):
    """Commands and options that the text names exist; those on shipped files run."""
    monkeypatch.chdir(ROOT)
    named = {tuple(m[1].split()) for m in re.finditer(r"`railguard ([a-z]+(?: [a-z]+)?)", README)}
    assert ("hook", "install") in named
    for words in sorted(named):
        help_ = _run(*_command(words), "--help")
        assert help_.exit_code == 0, words
    for line in re.findall(r"railguard review [^`\n]+", README):
        for option in re.findall(r"(?<= )--[a-z-]+", line):
            assert option in _run("review", "--help").output, line
        for name in re.findall(r"--report ([a-z]+)", line):
            assert name in FORMATS, line


def _command(words):
    known = railguard_command.list_commands(None)
    assert words[0] in known, words
    group = railguard_command.get_command(None, words[0])
    inner = getattr(group, "commands", {})
    return words if len(words) > 1 and words[1] in inner else words[:1]


def _run(*arguments):
    return CliRunner().invoke(railguard_command, arguments)


def test_first_two_commands_install_and_run():
    """The first block sets up and reviews a shipped netlist, the second runs the tests."""
    first, second = (README.split("```")[at] for at in (1, 3))
    assert "railguard review" in first
    shipped = shlex.split(first)[-1]
    assert (ROOT / shipped).is_file()
    assert second.strip().endswith("pytest -q -n 2")


def test_ci_runs_the_test_command_of_the_readme():
    """`.ci/run` takes its command from the README."""
    script = (ROOT / ".ci" / "run").read_text(encoding="utf-8")
    assert "README.md" in script
    assert "pip install -q -e '.[test]'" in README
