"""What other systems lack is missed by nothing that can do without it.

Neither Windows nor macOS is run here: their gaps are made by hand, one at a time.
"""

import os
import subprocess
import sys
from pathlib import Path
from types import SimpleNamespace

import pytest

from railguard.audit import lock, pool
from railguard.audit.pool import Pool, WorkerError
from railguard.audit.store import Store
from railguard.audit.wire import Plan
from railguard.deck import includes
from railguard.errors import UsageError
from railguard.reviewing import review

HOUSE = Path(__file__).parents[1]
STATION = HOUSE / "fixtures" / "station" / "station.cir"
FAULTY = HOUSE / "fixtures" / "faults" / "headroom-output.cir"
GONE = ("fcntl", "resource", "pwd", "grp", "termios", "tty", "pty", "syslog")
"""Modules that Windows does not have."""

FUNCTIONS = ("fork", "getuid", "geteuid", "killpg", "mkfifo", "sched_getaffinity", "O_NONBLOCK")
"""Names in `os` that it does not have."""

WITHOUT = f"""
import importlib, os, pkgutil, signal, sys
sys.modules.update(dict.fromkeys({GONE}))
for name in {FUNCTIONS}:
    delattr(os, name)
for name in ("SIGALRM", "SIGKILL", "SIGXCPU"):
    delattr(signal, name)
"""


def without(code, *arguments):
    """Run code in a Python that lacks what Windows lacks; return status, output and errors."""
    done = subprocess.run(
        [sys.executable, "-c", WITHOUT + code, *map(str, arguments)],
        env={**os.environ, "PYTHONPATH": str(HOUSE)},
        cwd=HOUSE,
        capture_output=True,
        text=True,
        check=False,
    )
    return done.returncode, done.stdout, done.stderr


def test_every_module_is_imported_without_them():
    """None is asked for before it is needed."""
    status, out, err = without("""
import railguard
names = [m.name for m in pkgutil.walk_packages(railguard.__path__, "railguard.")]
left_out = {"railguard.engine.shared_worker", "railguard.__main__"}
for name in names:
    if name not in left_out:
        importlib.import_module(name)
print(len(names))
""")
    assert status == 0, err
    assert int(out) > 100


COMMAND = """
from railguard.commands.main import railguard
railguard.main(sys.argv[1:])
"""


@pytest.mark.parametrize(
    ("words", "status"),
    [
        (["review", STATION], 0),
        (["review", "--report", "sarif", FAULTY], 1),
        (["sheet", STATION], 0),
        (["redline", FAULTY], 0),
        (["rules"], 0),
        (["devices", "TL072"], 0),
    ],
    ids=lambda given: given[0] if isinstance(given, list) else "",
)
def test_commands_do_without_them(words, status):
    """The status is that of any other machine, and something is said."""
    done, out, err = without(COMMAND, *words)
    assert (done, bool(out)) == (status, True), err


def test_workers_without_bounds_are_not_started(monkeypatch):
    """The audit says where it can be run instead."""
    monkeypatch.setattr(pool, "BOUNDED", False)
    plan = Plan(roots=("",), labels=("",), day="2027-01-31", build="")
    with pytest.raises(WorkerError, match="Linux or macOS"):
        Pool(plan, 1)


def test_a_file_is_locked_where_there_is_no_fcntl(tmp_path, monkeypatch):
    """By a byte far behind the database, since such a lock keeps readers out too."""
    locked = []

    def locking(handle, how, count):
        place = os.lseek(handle, 0, os.SEEK_CUR)
        if locked:
            raise OSError("held")
        locked.append((place, how, count))

    monkeypatch.setitem(sys.modules, "fcntl", None)
    monkeypatch.setitem(sys.modules, "msvcrt", SimpleNamespace(locking=locking, LK_NBLCK=2))
    with Store(tmp_path / "a.sqlite"):
        assert locked == [(lock._FAR, 2, 1)]
        with pytest.raises(UsageError, match="Another audit is writing"):
            Store(tmp_path / "a.sqlite")
    assert (tmp_path / "a.sqlite").stat().st_size < lock._FAR


def include(folder, target):
    """Return what is said of an include."""
    deck = folder / "gauge.cir"
    deck.write_text(f"gauge\n.include {target}\nR1 a 0 1k\n")
    (found,) = review(deck).designs
    return next(f.message for f in found.findings if f.rule == "netlist-include")


def test_a_drive_is_another_computers_only_where_there_are_none(tmp_path, monkeypatch):
    """On Windows the root decides, as it does for every other path."""
    assert "another computer" in include(tmp_path, "C:\\parts\\gauge.inc")
    monkeypatch.setattr(includes, "HAS_DRIVES", True)
    assert "another computer" not in include(tmp_path, "C:\\parts\\gauge.inc")
    assert "another computer" in include(tmp_path, "\\\\share\\parts\\gauge.inc")


@pytest.mark.parametrize("end", ["\r\n", "\r", "\n"])
def test_line_ends_of_every_system(tmp_path, end):
    """Findings, their lines and what is judged are the same."""
    text = FAULTY.read_text(encoding="utf-8")
    deck = tmp_path / "gauge.cir"
    deck.write_bytes(text.replace("\n", end).encode())
    (here,), (there,) = review(deck).designs, review(FAULTY).designs
    assert [(f.rule, f.location.line if f.location else 0) for f in here.findings] == [
        (f.rule, f.location.line if f.location else 0) for f in there.findings
    ]
    assert here.judged == there.judged
