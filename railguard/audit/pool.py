"""Workers in processes of their own: kept busy, watched, replaced when one dies.

A worker that crashes or overruns costs the one file it was at, which is recorded with the reason;
what was waiting behind it goes to others.
"""

import os
import signal
import subprocess
import sys
import tempfile
import time
from collections import deque
from collections.abc import Callable, Iterator
from multiprocessing.connection import Pipe, wait
from types import TracebackType
from typing import IO

import msgspec

from railguard.audit.child import OUT_OF_MEMORY
from railguard.audit.wire import Began, Message, Outcome, Plan, Ready, Task
from railguard.errors import RailguardError
from railguard.threads import ONE_THREAD

AHEAD = 6
"""Files handed to a worker before it has answered: enough that it never waits for the parent."""

PATIENCE = 20
"""Wall time a file may take, in budgets of processor time: other work may share the machine."""

LEAST_WALL_SECONDS = 300.0
"""A file may always take so long by the clock: a share over a network may hang for a while."""

TICK = 0.25
"""Seconds after which `results` hands over None where nothing came."""

START_SECONDS = 120.0

BOUNDED = os.name == "posix"
"""Whether this system can bound what a process takes; a worker without bounds is not started."""

_KEPT_MEMORY = {"MALLOC_MMAP_THRESHOLD_": "67108864", "MALLOC_TRIM_THRESHOLD_": "134217728"}
"""glibc: keep what a review has used for the next one, instead of asking for fresh pages."""


class WorkerError(RailguardError):
    """Workers cannot be started at all."""


class _Worker:
    def __init__(self, plan: Plan) -> None:
        self.pipe, theirs = Pipe()
        self.waiting: deque[Task] = deque()
        self.since = time.monotonic()
        self.ready = False
        self.key = ""
        self.errors: IO[bytes] = tempfile.TemporaryFile()  # noqa: SIM115 - closed in `end`
        self.process = subprocess.Popen(
            [sys.executable, "-m", "railguard.audit.child", str(theirs.fileno())],
            stdin=subprocess.DEVNULL,
            stdout=subprocess.DEVNULL,
            stderr=self.errors,
            pass_fds=(theirs.fileno(),),
            env=_environment(),
        )
        theirs.close()
        self.pipe.send_bytes(msgspec.msgpack.encode(plan))

    def give(self, tasks: list[Task]) -> None:
        """Hand tasks over; a worker that has died is noticed when its pipe is read."""
        if not self.waiting:
            self.since = time.monotonic()
        self.waiting += tasks
        try:
            self.pipe.send_bytes(msgspec.msgpack.encode(tasks))
        except (BrokenPipeError, ConnectionResetError):
            return

    def last_words(self) -> str:
        self.errors.seek(0)
        return self.errors.read().decode(errors="replace").strip().rsplit("\n", 1)[-1]

    def end(self) -> None:
        self.process.kill()
        self.process.wait()
        self.pipe.close()
        self.errors.close()


class Pool:
    """A number of workers under one plan."""

    def __init__(self, plan: Plan, workers: int) -> None:
        """Start the workers.

        Raises WorkerError: this system cannot bound them.
        """
        if not BOUNDED:
            raise WorkerError(
                "This system cannot bound what a worker takes.",
                remedy="Run the audit on Linux or macOS (WSL too), or on a --cluster of such.",
            )
        self._plan = plan
        self._decode = msgspec.msgpack.Decoder(Message).decode
        self._again: deque[Task] = deque()
        self._workers = [_Worker(plan) for _ in range(workers)]

    @property
    def pids(self) -> tuple[int, ...]:
        """Return the process ids of the workers that have started."""
        return tuple(worker.process.pid for worker in self._workers if worker.ready)

    def __enter__(self) -> "Pool":
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None,
        trace: TracebackType | None,
    ) -> None:  # fmt: skip
        self.close()

    def close(self) -> None:
        """End every worker."""
        for worker in self._workers:
            worker.end()

    def results(self, take: Callable[[], Task | None]) -> Iterator[Outcome | None]:
        """Yield outcomes as they come, and None now and then where none does.

        take  gives the next task, or None where there is none at present. Only when it gives none
              and every worker has answered does this end: an outcome may lead to more tasks.

        Raises WorkerError: workers do not even start.
        """
        while True:
            self._fill(take)
            if not any(worker.waiting for worker in self._workers):
                return
            heard = wait([worker.pipe for worker in self._workers], TICK)
            if not heard:
                yield None
            for worker in [worker for worker in self._workers if worker.pipe in heard]:
                yield from self._listen(worker)
            self._watch()

    def _fill(self, take: Callable[[], Task | None]) -> None:
        for worker in self._workers:
            tasks: list[Task] = []
            # Refilled when half empty: one message then carries several tasks.
            while len(worker.waiting) <= AHEAD // 2 and len(tasks) + len(worker.waiting) < AHEAD:
                task = self._again.popleft() if self._again else take()
                if task is None:
                    break
                tasks.append(task)
            if tasks:
                worker.give(tasks)

    def _listen(self, worker: _Worker) -> Iterator[Outcome]:
        try:
            while worker.pipe.poll():
                message = self._decode(worker.pipe.recv_bytes())
                if isinstance(message, Outcome):
                    worker.waiting.popleft()
                    worker.since, worker.key = time.monotonic(), ""
                    yield message
                elif isinstance(message, Began):
                    worker.key = message.key
                elif isinstance(message, Ready):
                    worker.ready, worker.since = True, time.monotonic()
        except (EOFError, ConnectionResetError):
            yield from self._buried(worker)

    def _buried(self, worker: _Worker) -> Iterator[Outcome]:
        """Record the file a dead worker was at, and put another worker in its place."""
        status = worker.process.wait()
        if not worker.ready:
            words = worker.last_words()
            raise WorkerError(f"A worker does not start: {words or f'status {status}'}.")
        if worker.waiting:
            task = worker.waiting.popleft()
            why = self._why(status)
            yield Outcome(root=task.root, path=task.path, state="stopped", key=worker.key, why=why)
        self._again += worker.waiting
        worker.end()
        self._workers[self._workers.index(worker)] = _Worker(self._plan)

    def _why(self, status: int) -> str:
        seconds = self._plan.budget.seconds
        if status == OUT_OF_MEMORY:
            return f"Its review needs more than the {self._plan.budget.megabytes} MB it may take."
        if -status == signal.SIGXCPU:
            return f"Its review takes more than the {seconds} s of processor time a file may take."
        if -status == signal.SIGKILL:
            return "Its worker was killed from outside, by lack of memory or by hand."
        if -status == signal.SIGALRM:
            return f"Its review did not end within {self._wall_seconds:.0f} s."
        name = signal.Signals(-status).name if status < 0 else f"status {status}"
        return f"Its worker crashed ({name})."

    @property
    def _wall_seconds(self) -> float:
        return max(self._plan.budget.seconds * PATIENCE, LEAST_WALL_SECONDS)

    def _watch(self) -> None:
        """End a worker that has been at one file for too long; its pipe then tells."""
        now = time.monotonic()
        for worker in self._workers:
            if not worker.ready and now - worker.since > START_SECONDS:
                raise WorkerError(f"A worker has not started within {START_SECONDS:.0f} s.")
            limit = self._wall_seconds
            if worker.ready and worker.waiting and now - worker.since > limit:
                worker.process.send_signal(signal.SIGALRM)


def _environment() -> dict[str, str]:
    return {**os.environ, **ONE_THREAD, **_KEPT_MEMORY}
