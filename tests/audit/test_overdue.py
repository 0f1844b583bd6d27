"""A worker that never answers: its batch is sent to another one, and counts once.

The client is a stand-in that answers when it is told to; `test_cluster` has the real thing.
"""

import zlib
from types import SimpleNamespace

import msgspec
import pytest

from railguard.audit import cluster, remote
from railguard.audit.build import identity
from railguard.audit.cluster import Cluster
from railguard.audit.wire import Outcome, Plan, Task

TASKS = [Task(0, f"gauge_{n}.cir") for n in range(3)]


class Future:
    """What a batch was sent under."""

    def __init__(self, tasks):
        self.tasks = tasks
        self.status = "pending"
        self.cancelled = False

    def answer(self, status="finished"):
        """Let it come back."""
        self.status = status

    def done(self):
        """Tell whether it has."""
        return self.status != "pending"

    def result(self, timeout):
        """Return an outcome for each file."""
        outcomes = tuple(Outcome(root=0, path=t.path, state="other") for t in self.tasks)
        return zlib.compress(msgspec.msgpack.encode(remote.Answer(outcomes=outcomes)))

    def exception(self):
        """Say what it failed with."""
        return RuntimeError("lost")

    def cancel(self):
        """Note that nobody waits any more."""
        self.cancelled = True


class Client:
    """A scheduler with two threads; `sent` is what it was given, in order."""

    status = "running"

    def __init__(self, *given, **named):
        self.sent = []

    def submit(self, function, plan, tasks, pure):
        """Take a batch."""
        self.sent.append(Future(msgspec.msgpack.decode(tasks, type=list[Task])))
        return self.sent[-1]

    def scheduler_info(self, n_workers):
        """Return the threads."""
        return {"workers": {"one": {"nthreads": 2}}}

    def run(self, function, *given, on_error):
        """Introduce the workers."""
        return {"one": remote.introduce(())}

    def wait_for_workers(self, n_workers, timeout):
        """Have them already."""

    def close(self, timeout=0.0):
        """Go."""


@pytest.fixture
def client(monkeypatch):
    """The client of a cluster whose clock stands still until a test moves it."""
    made = Client()
    clock = [0.0]
    monkeypatch.setattr(
        cluster, "_distributed", lambda: SimpleNamespace(Client=lambda *a, **n: made)
    )
    ticking = SimpleNamespace(monotonic=lambda: clock[0], sleep=lambda s: moved(s))

    def moved(seconds):
        clock[0] += seconds
        made.moved(clock[0])

    monkeypatch.setattr(cluster, "time", ticking)
    return made


def outcomes(client, moved):
    """Run the batch through a cluster; return the paths that were counted."""
    plan = Plan(roots=("",), labels=("",), settings="", hold_at=None, trust=False,
                day="2027-01-31", build=identity())  # fmt: skip
    client.moved = moved
    waiting = list(TASKS)
    running = Cluster(plan, "tcp://gauge.example:8786", overdue=60.0)
    found = running.results(lambda: waiting.pop(0) if waiting else None)
    return [one.path for one in found if one is not None]


ONCE = [task.path for task in TASKS]


def test_a_batch_in_time_is_sent_once(client):
    """Below the limit nothing is sent twice."""

    def moved(now):
        if now > 55.0:
            client.sent[0].answer()

    assert outcomes(client, moved) == ONCE
    assert len(client.sent) == 1


def test_a_batch_nobody_answers_is_sent_once_more_and_counts_once(client):
    """The second worker answers, and the first is told that nobody waits."""

    def moved(now):
        assert now < 500.0
        if len(client.sent) > 1:
            client.sent[1].answer()

    assert outcomes(client, moved) == ONCE
    assert [future.tasks for future in client.sent] == [TASKS, TASKS]
    assert client.sent[0].cancelled


def test_both_may_answer_at_once(client):
    """The slow worker wakes up in the very moment the other one is done."""

    def moved(now):
        assert now < 500.0
        if len(client.sent) > 1:
            for future in client.sent:
                future.answer()

    assert outcomes(client, moved) == ONCE
    assert len(client.sent) == 2


def test_a_second_worker_that_hangs_too_is_not_the_last(client):
    """It is sent again each time the limit has passed, no sooner."""
    sent = []

    def moved(now):
        assert now < 500.0
        if len(client.sent) > len(sent):
            sent.append(now)
        if len(client.sent) == 3:
            client.sent[2].answer()

    assert outcomes(client, moved) == ONCE
    assert sent[1] - sent[0] > 59.0
    assert sent[2] - sent[1] > 59.0


@pytest.mark.parametrize("how", ["lost", "cancelled", "error"])
def test_a_copy_that_is_lost_leaves_the_other_one(client, how):
    """Nothing is sent a third time for it, and no file is recorded as failed."""

    def moved(now):
        assert now < 500.0
        if len(client.sent) > 1 and not client.sent[0].done():
            client.sent[0].answer(how)
        elif len(client.sent) > 1 and now > 80.0:
            client.sent[1].answer()

    assert outcomes(client, moved) == ONCE
    assert len(client.sent) == 2
