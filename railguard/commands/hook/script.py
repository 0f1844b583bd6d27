"""The hook itself: a short script in the folder git looks in, put there and taken away.

A hook that is there already is kept under another name and run first.
"""

import hashlib
import os
import re
import shlex
import stat
import sys
from collections.abc import Sequence
from pathlib import Path
from typing import Literal

import msgspec

from railguard.commands.hook.git import GitError, git, one_line

HOOKS = ("pre-commit", "pre-merge-commit")
"""Run before a commit, and before one that a merge without conflicts makes."""

BEFORE = ".before-railguard"
"""Ends the name under which a hook that was there before is kept."""

_MARK = re.compile(r"\A#!/bin/sh\n# railguard hook ([0-9a-f]{16})\n(.*)\Z", re.DOTALL)

_BODY = """\
# Reviews the netlists that are about to be committed. Take it out: railguard hook remove
before="${{0%/*}}/{name}{before}"
if [ -x "$before" ]; then
  "$before" "$@" || exit $?
fi
python={python}
if [ -x "$python" ]; then
  exec "$python" -P -m railguard hook run{options}
elif command -v railguard >/dev/null 2>&1; then
  exec railguard hook run{options}
fi
echo "railguard is no longer at $python: install it again and run 'railguard hook install'," >&2
echo "or take the hook out by removing $0. To commit all the same: git commit --no-verify" >&2
exit 1
"""

State = Literal["absent", "ours", "changed", "foreign"]
"""Of one hook: there is none; as we wrote it; ours, but edited since; somebody else's."""


class Hook(msgspec.Struct, frozen=True, kw_only=True):
    """One hook of a repository.

    path     where git looks for it
    kept     whether one that was there before is kept beside it
    options  of `railguard hook run`, as the script states them
    python   the interpreter the script names
    """

    name: str
    path: Path
    state: State
    kept: bool = False
    options: str = ""
    python: str = ""

    @property
    def before(self) -> Path:
        """Return where a hook that was there before is kept."""
        return self.path.with_name(self.name + BEFORE)


def text(name: str, options: Sequence[str], python: str | None = None) -> str:
    """Return the script of one hook."""
    # forward slashes: git runs it in a shell of its own on Windows too
    program = Path(python or sys.executable).as_posix()
    words = "".join(f" {shlex.quote(option)}" for option in options)
    body = _BODY.format(name=name, before=BEFORE, python=shlex.quote(program), options=words)
    return f"#!/bin/sh\n# railguard hook {_digest(body)}\n{body}"


def _digest(body: str) -> str:
    return hashlib.sha256(body.encode("utf-8", "surrogateescape")).hexdigest()[:16]


def folder(top: str) -> Path:
    """Return the folder git looks for hooks in, wherever the user's settings place it."""
    return Path(top, one_line("rev-parse", "--git-path", "hooks", cwd=top))


def placed_by(top: str) -> str:
    """Return which of git's settings files states `core.hooksPath`, or ""."""
    out = git("config", "--show-scope", "--get", "core.hooksPath", cwd=top, accepted=(0, 1))
    return os.fsdecode(out).split("\t")[0].strip()


def look(top: str) -> tuple[Hook, ...]:
    """Return the state of each hook."""
    place = folder(top)
    return tuple(_look(name, place / name) for name in HOOKS)


def _look(name: str, path: Path) -> Hook:
    kept = os.path.lexists(path.with_name(name + BEFORE))
    if not os.path.lexists(path):
        return Hook(name=name, path=path, state="absent", kept=kept)
    try:
        content = path.read_bytes().decode("utf-8", "surrogateescape")
    except OSError:
        content = ""
    match = _MARK.match(content.replace("\r\n", "\n"))
    if match is None or path.is_symlink():
        return Hook(name=name, path=path, state="foreign", kept=kept)
    run = re.search(r"-m railguard hook run(.*)\n", match[2])
    python = re.search(r"^python=(.*)$", match[2], re.MULTILINE)
    return Hook(
        name=name,
        path=path,
        state="ours" if match[1] == _digest(match[2]) else "changed",
        kept=kept,
        options=run[1].strip() if run else "",
        python="".join(shlex.split(python[1])) if python else "",
    )


def install(top: str, options: Sequence[str]) -> tuple[Hook, ...]:
    """Put the hooks in place, each before one that is there already.

    Raises GitError: a hook was edited by hand, a kept one would be overwritten, or the folder
    cannot be written. Then nothing was changed.
    """
    hooks = look(top)
    for hook in hooks:
        if hook.state == "changed":
            raise GitError(
                f"{hook.path} was written by railguard and edited since.",
                None,
                "Move your lines into a hook of your own, remove it, and install again.",
            )
        if hook.state == "foreign" and hook.kept:
            raise GitError(
                f"{hook.path} is another hook, and {hook.before.name} beside it is kept already.",
                None,
                "Join the two, or remove the one that is no longer wanted.",
            )
    try:
        for hook in hooks:
            hook.path.parent.mkdir(parents=True, exist_ok=True)
            if hook.state == "foreign":
                hook.path.rename(hook.before)
            _write(hook.path, text(hook.name, options))
    except OSError as error:
        raise GitError(f"The hook {hook.path} cannot be written: {error.strerror}.") from error
    return look(top)


def _write(path: Path, script: str) -> None:
    # bytes: a carriage return would break it where the text mode of Windows writes one
    path.write_bytes(script.encode("utf-8", "surrogateescape"))
    path.chmod(path.stat().st_mode | stat.S_IXUSR | stat.S_IXGRP | stat.S_IXOTH)


def remove(top: str) -> tuple[Hook, ...]:
    """Take the hooks away, and put back those that were there before; return what was removed.

    Raises GitError: a hook was edited by hand, or the folder cannot be written.
    """
    hooks = look(top)
    for hook in hooks:
        if hook.state == "changed":
            raise GitError(
                f"{hook.path} was edited by hand since railguard wrote it.",
                None,
                "Remove it yourself; nothing was changed.",
            )
    ours = tuple(hook for hook in hooks if hook.state == "ours")
    try:
        for hook in ours:
            if hook.kept:
                hook.before.replace(hook.path)
            else:
                hook.path.unlink()
    except OSError as error:
        raise GitError(f"The hook {hook.path} cannot be removed: {error.strerror}.") from error
    return ours
