"""Putting the hook in place beside others, and taking it away without a trace."""

import os
import shutil
import stat
import subprocess
import sys
from pathlib import Path

import pytest

from railguard.commands.hook import script
from railguard.errors import RailguardError
from tests.gauge import CLIPPED, SOUND

OTHER = "#!/bin/sh\necho other hook\n{}\n"


def other(repository, last="exit 0", name="pre-commit", mode=0o755):
    """Write somebody else's hook; return its place."""
    place = repository.write(f".git/hooks/{name}", OTHER.format(last))
    place.chmod(mode)
    return place


def states(folder):
    """Return the states of both hooks of a repository."""
    return [hook.state for hook in script.look(str(folder))]


def test_install_status_remove(new):
    """There, running, and gone again; nothing is left behind."""
    repository = new()
    before = sorted((repository.folder / ".git" / "hooks").iterdir())
    assert repository.railguard("hook", "status").returncode == 1
    told = repository.hook("install", "--new-only", "--hold-at", "minor")
    assert "installed" in told
    assert "options: --new-only --hold-at=minor" in told
    assert states(repository.folder) == ["ours", "ours"]
    assert repository.hook("status") == told
    assert "is removed" in repository.hook("remove")
    assert sorted((repository.folder / ".git" / "hooks").iterdir()) == before
    assert "no hook of railguard" in repository.hook("remove")


def test_installing_again_changes_the_options(new):
    """One hook, with what was asked for last; another's hook stays where it was kept."""
    repository = new()
    place = other(repository)
    for options in (["--new-only"], []):
        script.install(str(repository.folder), options)
    first, _ = script.look(str(repository.folder))
    assert (first.state, first.kept, first.options) == ("ours", True, "")
    assert "other hook" in first.before.read_text()
    assert place == first.path


def test_existing_hook_runs_first_and_can_stop_the_commit(new):
    """It is chained, with its own say, and put back as it was."""
    repository = new()
    place = other(repository)
    content = place.read_bytes()
    told = repository.hook("install")
    assert "first runs pre-commit.before-railguard" in told
    repository.add("gauge.cir", CLIPPED)
    made, told = repository.commit()
    assert not made
    assert told.index("other hook") < told.index("headroom-output")
    repository.add("gauge.cir", SOUND)
    assert repository.commit()[0]
    first, _ = script.look(str(repository.folder))
    first.before.write_text(OTHER.format("exit 3"))
    repository.add("notes.txt", "level")
    made, told = repository.commit()
    assert not made
    assert told == "other hook\n"
    first.before.write_bytes(content)
    repository.hook("remove")
    assert place.read_bytes() == content
    assert place.stat().st_mode & stat.S_IXUSR


@pytest.mark.skipif(os.name == "nt", reason="Windows has no such mode")
def test_an_existing_hook_that_was_switched_off_stays_off(new):
    """Git runs no hook without the right to be run; nor does ours."""
    repository = new()
    other(repository, mode=0o644)
    repository.hook("install")
    repository.add("notes.txt", "level")
    made, told = repository.commit()
    assert made
    assert "other hook" not in told


def test_a_hook_that_is_a_link_is_kept_as_one(new):
    """The file it leads to belongs to somebody else and is not written to."""
    repository = new()
    goal = repository.write("tools/hook.sh", OTHER.format("exit 0"))
    goal.chmod(0o755)
    place = repository.folder / ".git" / "hooks" / "pre-commit"
    place.symlink_to("../../tools/hook.sh")
    repository.hook("install")
    assert goal.read_text() == OTHER.format("exit 0")
    assert not place.is_symlink()
    repository.hook("remove")
    assert place.readlink() == Path("../../tools/hook.sh")


def test_core_hooks_path_of_the_repository(new):
    """Git looks there, so that is where it goes; seen from the top, also from below."""
    repository = new()
    repository.git("config", "core.hooksPath", "tools/hooks")
    below = repository.folder / "boards"
    below.mkdir()
    done = subprocess.run(
        [sys.executable, "-m", "railguard", "hook", "install"],
        cwd=below,
        capture_output=True,
        check=False,
    )
    assert done.returncode == 0, done.stderr
    assert (repository.folder / "tools" / "hooks" / "pre-commit").is_file()
    repository.add("gauge.cir", CLIPPED)
    assert not repository.commit()[0]


def test_core_hooks_path_of_the_user(new, tmp_path):
    """It is obeyed, and it is said that other repositories are served by it as well."""
    repository = new()
    repository.git("config", "--global", "core.hooksPath", str(tmp_path / "all hooks"))
    told = repository.hook("install")
    assert "core.hooksPath is set for this user" in told
    assert (tmp_path / "all hooks" / "pre-commit").is_file()
    repository.add("gauge.cir", CLIPPED)
    assert not repository.commit()[0]


def test_a_hook_that_was_edited_is_not_touched(new):
    """Neither overwritten nor removed: the lines are somebody's work."""
    repository = new()
    script.install(str(repository.folder), [])
    place = repository.folder / ".git" / "hooks" / "pre-commit"
    edited = place.read_text() + "echo mine\n"
    place.write_text(edited)
    with pytest.raises(RailguardError, match="edited since"):
        script.install(str(repository.folder), [])
    with pytest.raises(RailguardError, match="edited by hand"):
        script.remove(str(repository.folder))
    assert place.read_text() == edited
    assert "edited by hand" in repository.hook("status")


def test_a_hook_kept_before_is_never_overwritten(new):
    """A second tool has put its hook over ours: both are somebody's, so we stop."""
    repository = new()
    other(repository)
    script.install(str(repository.folder), [])
    place = other(repository, "exit 4")
    with pytest.raises(RailguardError, match="kept already"):
        script.install(str(repository.folder), [])
    assert place.read_text() == OTHER.format("exit 4")
    assert states(repository.folder) == ["foreign", "ours"]


def test_an_interpreter_that_is_gone_is_told(new):
    """A commit is not let through unseen, and the way out is printed."""
    repository = new()
    script.install(str(repository.folder), [])
    for name in script.HOOKS:
        place = repository.folder / ".git" / "hooks" / name
        place.write_bytes(script.text(name, [], "/gone/bin/python").encode())
    repository.add("notes.txt", "level")
    bare = f"{shutil.which('git').rpartition('/')[0]}:/bin"
    done = subprocess.run(
        ["git", "commit", "-m", "x"],
        cwd=repository.folder,
        env={**os.environ, "PATH": bare},
        capture_output=True,
        text=True,
        check=False,
    )
    if shutil.which("railguard", path=bare) is None:
        assert done.returncode != 0
        assert "railguard is no longer at /gone/bin/python" in done.stderr
        assert "git commit --no-verify" in done.stderr
    status = repository.railguard("hook", "status")
    assert status.returncode == 1
    assert "/gone/bin/python is gone" in status.stdout


def test_outside_of_a_repository(tmp_path, new):
    """One sentence and status 2."""
    home = new("elsewhere")
    for action in ("install", "remove", "status", "run"):
        done = subprocess.run(
            [sys.executable, "-m", "railguard", "hook", action],
            cwd=tmp_path,
            capture_output=True,
            text=True,
            check=False,
        )
        assert done.returncode == 2
        assert done.stderr.startswith("railguard: This is no git repository")
        assert len(done.stderr.splitlines()) == 1
    assert home.folder.is_dir()


@pytest.mark.parametrize("python", ["/opt/my tools/python", "/it's here/python", "/a$b/`c`"])
def test_the_interpreters_path_may_hold_anything(python, tmp_path):
    """The shell takes it as one word and runs nothing out of it."""
    place = tmp_path / "pre-commit"
    place.write_bytes(script.text("pre-commit", [], python).encode())
    hook = script._look("pre-commit", place)
    assert (hook.state, hook.python) == ("ours", python)
    line = next(row for row in place.read_text().splitlines() if row.startswith("python="))
    done = subprocess.run(
        ["sh", "-c", f'{line}\nprintf %s "$python"'], capture_output=True, text=True, check=True
    )
    assert done.stdout == python


def test_the_script_has_the_line_ends_of_a_shell(new):
    """On every system: a carriage return would be part of the last word."""
    repository = new()
    script.install(str(repository.folder), [])
    assert b"\r" not in (repository.folder / ".git" / "hooks" / "pre-commit").read_bytes()
