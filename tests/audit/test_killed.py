"""An audit that is killed and goes on ends with what an undisturbed one ends with."""

import os
import random
import signal
import subprocess
import sys
import time

import pytest

from tests.audit.conftest import STARTED, Audited
from tests.audit.designs import BARE, CLIPPED, LIBRARY, SOUND, UNKNOWN, put
from tests.audit.test_archives import zipped

KILLS = 10


@pytest.fixture
def share(tmp_path):
    """Twice the designs that ten commits hold, of several kinds, with includes and an archive."""
    kinds = (SOUND, CLIPPED, BARE, UNKNOWN, LIBRARY)
    names = {f"lot{k % 7}/design{k:04}.cir": kinds[k % 5] for k in range(2800)}
    names |= {
        f"bench{k}.cir": f'bench {k}\n.include "lot0/design{7 * k:04}.cir"\n.tran 1u 1m\n.end\n'
        for k in range(5)
    }
    folder = put(tmp_path / "share", **names)
    inside = {f"{k}.cir": kinds[k % 4].encode() for k in range(30)}
    (folder / "old.zip").write_bytes(zipped(inside))
    os.mkfifo(folder / "pipe.cir")
    return folder


def start(share, base):
    """Start the command in a process of its own, with workers of its own."""
    command = [sys.executable, "-m", "railguard", "audit", share, "--to", base, "--workers", "2"]
    STARTED.append(subprocess.Popen(command, stderr=subprocess.PIPE, start_new_session=True))
    return STARTED[-1]


def test_killed_at_ten_random_moments(share, tmp_path):
    """The exports are the same to the byte."""
    whole = start(share, tmp_path / "whole.sqlite")
    whole.communicate(timeout=600)
    assert whole.returncode == 0

    base = tmp_path / "killed.sqlite"
    moments = random.Random(20261201)
    counts = []
    for number in range(KILLS):
        run = start(share, base)
        # Between the first import and the middle of the run: never at its end. Every other time
        # something has been done by then, however slow the machine is.
        deadline = time.monotonic() + 60
        goal = (counts[-1] if counts else 0) + moments.randrange(1, 12)
        while run.poll() is None and time.monotonic() < deadline:
            if met(base) >= goal or (number % 2 == 0 and moments.random() < 0.02):
                break
            time.sleep(0.02)
        run.send_signal(signal.SIGKILL)
        run.communicate()
        counts.append(met(base))
    assert counts == sorted(counts), "what was committed stays"
    assert counts[-1] > 0, "something was done between the kills"
    assert Audited(base).query("SELECT value FROM about WHERE name = 'finished'") == [("no",)]

    last = start(share, base)
    said = last.communicate(timeout=600)[1].decode()
    assert last.returncode == 0
    assert "Going on" in said
    assert Audited(base).text("--as", "json") == Audited(tmp_path / "whole.sqlite").text(
        "--as", "json"
    )
    assert Audited(base).text("--as", "csv") == Audited(tmp_path / "whole.sqlite").text(
        "--as", "csv"
    )


def met(base):
    """Return how many files an audit has committed so far."""
    if not base.exists():
        return 0
    try:
        return Audited(base).query("SELECT COUNT(*) FROM file")[0][0]
    except Exception:  # noqa: BLE001 - the file may be in the making
        return 0


def test_two_audits_do_not_write_to_one_file(share, tmp_path):
    """The second is refused, and says why."""
    base = tmp_path / "one.sqlite"
    first = start(share, base)
    try:
        deadline = time.monotonic() + 60
        while not base.exists() and time.monotonic() < deadline:
            time.sleep(0.02)
        second = start(share, base)
        said = second.communicate(timeout=120)[1].decode()
        assert second.returncode == 2
        assert "Another audit is writing" in said
    finally:
        first.kill()
        first.communicate()


def test_another_file_is_not_written_over(tmp_path, share):
    """A database that is no audit's, and a text."""
    import sqlite3

    other = tmp_path / "other.sqlite"
    base = sqlite3.connect(other)
    base.execute("CREATE TABLE mine (a)")
    base.close()
    (tmp_path / "text.txt").write_text("mine\n" * 400)
    for name in ("other.sqlite", "text.txt"):
        before = (tmp_path / name).read_bytes()
        run = start(share, tmp_path / name)
        run.communicate(timeout=120)
        assert run.returncode == 2
        assert (tmp_path / name).read_bytes() == before
