"""Running git: its own commands only, on paths that may hold anything but NUL.

Light on purpose: every commit pays for what is imported here.
"""

import os
import subprocess
from collections.abc import Mapping, Sequence

from railguard.errors import RailguardError

CANNOT = 128
"""Exit status of a git command that could not be carried out."""


class GitError(RailguardError):
    """git is not here, or refused."""


def git(
    *arguments: str,
    cwd: str | None = None,
    stdin: bytes = b"",
    accepted: Sequence[int] = (0,),
    env: Mapping[str, str] | None = None,
) -> bytes:
    """Run a git command and return what it printed.

    accepted  exit statuses that are an answer; with any other it failed
    env       the whole environment; None: this process's, by which a hook is told its index

    Raises GitError with git's own last words.
    """
    try:
        done = subprocess.run(
            ("git", *arguments), input=stdin, capture_output=True, cwd=cwd, env=env, check=False
        )
    except OSError as error:
        raise GitError(f"git cannot be run: {error.strerror}.") from error
    if done.returncode not in accepted:
        words = done.stderr.decode("utf-8", "replace").strip().splitlines()
        raise GitError(f"git {arguments[0]} failed: {words[-1] if words else 'without a word'}.")
    return done.stdout


def one_line(*arguments: str, cwd: str | None = None) -> str:
    """Run a git command that answers with one line, such as a path."""
    return os.fsdecode(git(*arguments, cwd=cwd)).removesuffix("\n")


def top_folder(cwd: str | None = None) -> str:
    """Return the folder the working tree begins at.

    Raises GitError: there is none here.
    """
    try:
        return one_line("rev-parse", "--show-toplevel", cwd=cwd)
    except GitError as error:
        raise GitError(
            "This is no git repository with a working tree.", None, error.what
        ) from error


def elsewhere() -> dict[str, str]:
    """Return an environment for another repository: without what a hook is told of this one."""
    return {name: value for name, value in os.environ.items() if not name.startswith("GIT_")}
