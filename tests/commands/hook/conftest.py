"""A real git repository in a folder of its own, for what happens at a commit."""

import os
import shutil
import subprocess
import sys
from pathlib import Path

import pytest
from click.testing import CliRunner

from railguard.commands.hook import staged
from railguard.commands.hook.command import run
from railguard.errors import RailguardError

ROOT = Path(__file__).parents[3]
CACHE = str(Path.home() / ".cache")

USER = """[user]
name = A Tester
email = tester@example.org
[init]
defaultBranch = main
[protocol "file"]
allow = always
[core]
autocrlf = false
"""


class Repository:
    """A repository, and git with nothing of the tester's own settings."""

    def __init__(self, folder):
        self.folder = folder
        folder.mkdir(parents=True, exist_ok=True)

    def run(self, *command):
        """Run a command in it; return what it did."""
        return subprocess.run(
            command,
            cwd=self.folder,
            stdout=subprocess.PIPE,
            stderr=subprocess.STDOUT,
            text=True,
            encoding="utf-8",
            errors="surrogateescape",
            check=False,
        )

    def git(self, *arguments):
        """Run git, which must do what it is told; return what it printed."""
        done = self.run("git", *arguments)
        assert done.returncode == 0, f"git {' '.join(arguments)}: {done.stdout}"
        return done.stdout

    def railguard(self, *arguments):
        """Run railguard; return what it did."""
        return self.run(sys.executable, "-m", "railguard", *arguments)

    def hook(self, *arguments):
        """Run `railguard hook`, which must do what it is told; return what it printed."""
        done = self.railguard("hook", *arguments)
        assert done.returncode == 0, done.stdout
        return done.stdout

    def write(self, path, text):
        """Write a file, and its folder where it is not there."""
        place = self.folder / path
        place.parent.mkdir(parents=True, exist_ok=True)
        place.write_bytes(text if isinstance(text, bytes) else text.encode())
        return place

    def add(self, path, text):
        """Write a file and stage it."""
        self.write(path, text)
        self.git("add", "--", path)

    def commit(self, *arguments):
        """Try to commit; return whether there is a commit, and what was printed."""
        done = self.run("git", "commit", "-m", "a step", *arguments)
        return done.returncode == 0, done.stdout

    def check(self, *arguments):
        """Do what the hook does, in this process; return whether it lets pass, and what it says."""
        staged.changes.cache_clear()
        with pytest.MonkeyPatch.context() as patch:
            patch.chdir(self.folder)
            done = CliRunner().invoke(run, arguments)
        if isinstance(done.exception, RailguardError):
            return False, str(done.exception)
        assert done.exit_code in (0, 1), done.exception
        return done.exit_code == 0, done.output

    def keep(self):
        """Commit what is staged without a review."""
        self.git("commit", "-q", "--no-verify", "-m", "as it was")


@pytest.fixture
def new(tmp_path, monkeypatch):
    """Make repositories, each in a folder of its own below one home that has no other settings."""
    if shutil.which("git") is None:
        pytest.skip("git is not installed")
    home = tmp_path / "home"
    home.mkdir()
    (home / ".gitconfig").write_text(USER)
    for name in list(os.environ):
        if name.startswith("GIT_"):
            monkeypatch.delenv(name)
    for name, value in (("HOME", home), ("PYTHONPATH", ROOT), ("GIT_CONFIG_NOSYSTEM", "1")):
        monkeypatch.setenv(name, str(value))
    # the grammar's cache stays where it is warm
    monkeypatch.setenv("XDG_CACHE_HOME", os.environ.get("XDG_CACHE_HOME") or CACHE)

    def make(name="repository"):
        made = Repository(tmp_path / name)
        made.git("init", "-q")
        return made

    return make


@pytest.fixture
def repository(new):
    """A repository with the hook in place and no commit yet."""
    made = new()
    made.hook("install")
    return made
