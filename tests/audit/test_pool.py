"""Workers: a file that runs out of its budget, or takes its worker with it, costs itself alone."""

import os
import signal
from collections import deque

import pytest

from railguard.audit.build import identity
from railguard.audit.pool import Pool, WorkerError
from railguard.audit.wire import Budget, Plan, Task
from tests.audit.designs import SOUND, put


def long_deck(cards):
    """Return a deck that takes a worker some seconds: a ladder of so many cards."""
    ladder = "".join(f"R{k} a{k} a{k + 1} 1k\nC{k} a{k} 0 1n\n" for k in range(10, cards // 2))
    return SOUND.replace(".end\n", f"{ladder}RX a10 in 1k\n.end\n")


@pytest.fixture
def share(tmp_path):
    """Six sound designs round one that takes long."""
    return put(
        tmp_path, **{f"{k}.cir": SOUND for k in range(6)}, **{"2-long.cir": long_deck(100_000)}
    )


def plan_of(folder, **budget):
    """Return a plan for a folder."""
    return Plan(
        roots=(str(folder),), labels=("",), day="2027-01-01", build=identity(),
        budget=Budget(**budget),
    )  # fmt: skip


def run(pool, folder, on_tick=lambda: None):
    """Return outcomes by path; `on_tick` is called while nothing comes."""
    tasks = deque(Task(0, path.name) for path in sorted(folder.glob("*.cir")))
    found = {}
    for outcome in pool.results(lambda: tasks.popleft() if tasks else None):
        if outcome is None:
            on_tick()
        else:
            assert outcome.path not in found, "answered twice"
            found[outcome.path] = outcome
    return found


def states(found):
    """Return each file's state."""
    return {path: outcome.state for path, outcome in found.items()}


def the_rest(share, but):
    """Return what every other file should come to."""
    return {path.name: "design" for path in share.glob("*.cir") if path.name != but}


def test_processor_time_is_bounded(share):
    """The system ends the worker; the reason names the budget."""
    with Pool(plan_of(share, seconds=1), 1) as pool:
        found = run(pool, share)
    assert states(found) == {**the_rest(share, "2-long.cir"), "2-long.cir": "stopped"}
    assert "more than the 1 s of processor time" in found["2-long.cir"].why


def test_memory_is_bounded(share):
    """A worker that cannot get more says so, and is replaced."""
    with Pool(plan_of(share, megabytes=100), 1) as pool:
        found = run(pool, share)
    assert states(found) == {**the_rest(share, "2-long.cir"), "2-long.cir": "stopped"}
    assert "needs more than the 100 MB" in found["2-long.cir"].why


@pytest.mark.parametrize(
    ("number", "words"), [(signal.SIGSEGV, "crashed (SIGSEGV)"), (signal.SIGKILL, "was killed")]
)
def test_a_dead_worker_costs_one_file(share, number, words):
    """Whatever ended it; what waited behind the file is reviewed by the next worker."""
    killed = []

    def kill():
        if not killed and pool.pids:
            killed.append(pool.pids[0])
            os.kill(killed[0], number)

    (share / "0.cir").write_text(long_deck(100_000))
    (share / "2-long.cir").unlink()
    with Pool(plan_of(share), 1) as pool:
        found = run(pool, share, kill)
    assert killed
    lost = [path for path, state in states(found).items() if state == "stopped"]
    assert lost == ["0.cir"]
    assert words in found["0.cir"].why
    assert {**states(found), "0.cir": ""} == {**the_rest(share, "0.cir"), "0.cir": ""}


def test_workers_that_do_not_start_are_told(tmp_path, monkeypatch):
    """With what they last said."""
    monkeypatch.setenv("PYTHONHOME", str(tmp_path))
    put(tmp_path, **{"a.cir": SOUND})
    with Pool(plan_of(tmp_path), 1) as pool, pytest.raises(WorkerError, match="does not start"):
        run(pool, tmp_path)
