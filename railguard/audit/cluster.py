"""The same work on a dask.distributed cluster: batches out, outcomes back, so many at once.

Workers read the files for themselves. A worker that is lost has its batches done by others; a
scheduler that goes away is waited for; what is in the store by then stays there.
"""

import time
from collections import deque
from collections.abc import Callable, Iterator
from typing import Any, Protocol

import msgspec

from railguard.audit import remote
from railguard.audit.wire import Outcome, Plan, Task
from railguard.errors import RailguardError, UsageError

BATCH = 32
"""Files in one task of the scheduler: its work a task is some hundred microseconds."""

AHEAD = 2
"""Batches for each thread of the cluster that are under way at once; the rest waits in the walk."""

MOST = 512
"""Batches under way, however large the cluster is."""

TICK = 0.05
IDLE_SECONDS = 0.5
"""Pause between two looks at the batches, and how long `results` may be silent."""

COUNT_SECONDS = 3.0
"""Pause between two counts of the cluster's threads, each of which asks the scheduler."""

CONNECT_SECONDS = 20.0
PATIENCE_SECONDS = 90.0
"""How long a scheduler, or the last worker, may be away."""

OVERDUE_SECONDS = 120.0
"""At the end of a run a batch that has been out this long is sent once more, and so on: whichever
answer comes first counts, the others are dropped."""

LOST = ("cancelled", "lost")


class ClusterError(RailguardError):
    """A cluster that cannot be used, or has gone away."""


class _Future(Protocol):
    """What is used of a dask future."""

    status: str

    def done(self) -> bool: ...
    def result(self, timeout: float) -> bytes: ...
    def exception(self) -> BaseException: ...
    def cancel(self) -> None: ...


class _Client(Protocol):
    """What is used of a dask client."""

    status: str

    def submit(self, function: Callable[..., bytes], *arguments: bytes, pure: bool) -> _Future: ...
    def scheduler_info(self, n_workers: int) -> dict[str, dict[str, dict[str, int]]]: ...
    def run(
        self, function: Callable[..., bytes], *arguments: object, on_error: str
    ) -> dict[str, bytes | Exception]: ...
    def wait_for_workers(self, n_workers: int, timeout: float) -> None: ...
    def close(self, timeout: float = ...) -> None: ...


class _Batch:
    def __init__(self, tasks: list[Task]) -> None:
        self.tasks = tasks
        self.since = time.monotonic()


class Cluster:
    """A connection to a cluster, under one plan."""

    def __init__(self, plan: Plan, address: str, overdue: float = OVERDUE_SECONDS) -> None:
        """Connect, and hold every worker to the plan's build and roots.

        overdue  seconds after which a batch is sent once more, when there is nothing else to send

        Raises ClusterError: no scheduler answers, there is no worker, or one of them is of another
        build or does not see a root.
        """
        self._plan = plan
        self._packed = msgspec.msgpack.encode(plan)
        self._address = address
        self._overdue = overdue
        self._client = self._connected(CONNECT_SECONDS)
        self._out: dict[_Future, _Batch] = {}
        self._most = AHEAD
        self._counted = float("-inf")
        self._again: deque[Task] = deque()
        self._alone: deque[Task] = deque()

    def __enter__(self) -> "Cluster":
        return self

    def __exit__(self, *ending: object) -> None:
        self._client.close(timeout=5)

    def results(self, take: Callable[[], Task | None]) -> Iterator[Outcome | None]:
        """Yield outcomes as they come, and None now and then; as `Pool.results`."""
        silent = time.monotonic()
        while True:
            if self._gone():
                yield from self._reconnected()
            drained = not self._fill(take)
            if not self._out:
                return
            done = [future for future in self._out if future.done()]
            for future in done:
                if future in self._out:  # else its other copy has just been answered
                    yield from self._answered(future)
                silent = time.monotonic()
            if not done:
                if drained:
                    self._hurry()
                time.sleep(TICK)
                if time.monotonic() - silent > IDLE_SECONDS:
                    silent = time.monotonic()
                    yield None

    # ------------------------------------------------------------------ batches

    def _fill(self, take: Callable[[], Task | None]) -> bool:
        """Send batches until enough are out; tell whether more could be sent."""
        if time.monotonic() - self._counted > COUNT_SECONDS:
            self._most = min(AHEAD * max(self._threads(), 1), MOST)
            self._counted = time.monotonic()
        while len(self._out) < self._most:
            tasks = self._next(take)
            if not tasks:
                return False
            self._send(tasks)
        return True

    def _next(self, take: Callable[[], Task | None]) -> list[Task]:
        if self._alone:
            return [self._alone.popleft()]
        tasks: list[Task] = []
        while len(tasks) < BATCH:
            task = self._again.popleft() if self._again else take()
            if task is None:
                break
            tasks.append(task)
        return tasks

    def _send(self, tasks: list[Task]) -> None:
        future = self._client.submit(remote.work, self._packed, remote.pack(tasks), pure=False)
        self._out[future] = _Batch(tasks)

    def _answered(self, future: _Future) -> Iterator[Outcome]:
        batch = self._out.pop(future)
        other = any(copy.tasks is batch.tasks for copy in self._out.values())
        if future.status != "finished" and other:
            return
        if future.status in LOST:
            self._again += batch.tasks
            return
        if future.status == "error":
            yield from self._broken(future, batch)
            return
        try:
            answer = remote.unpack(future.result(timeout=CONNECT_SECONDS))
        except Exception:  # noqa: BLE001 - whatever the way back breaks with, the batch is done again
            self._again += batch.tasks if not other else ()
            return
        if answer.refused:
            raise _other_build(self._plan.build, {answer.refused: "a worker"})
        yield from answer.outcomes
        self._forget(batch)

    def _forget(self, batch: _Batch) -> None:
        """Drop the other copies of a batch that has come back."""
        for future in [f for f, other in self._out.items() if other.tasks is batch.tasks]:
            del self._out[future]
            future.cancel()

    def _broken(self, future: _Future, batch: _Batch) -> Iterator[Outcome]:
        """Do a batch that failed file by file; a file that fails alone is recorded."""
        if len(batch.tasks) > 1:
            self._alone += batch.tasks
            return
        (task,) = batch.tasks
        error = future.exception()
        yield Outcome(
            root=task.root,
            path=task.path,
            state="stopped",
            why=f"Every worker that took it was lost: {type(error).__name__}.",
        )

    def _hurry(self) -> None:
        """Give the batches a slow worker sits on to others too, once there is nothing else."""
        now = time.monotonic()
        for tasks, since in self._newest():
            if now - since > self._overdue:
                self._send(tasks)

    def _newest(self) -> list[tuple[list[Task], float]]:
        """Return each batch that is out once, and when its last copy was sent."""
        found: dict[int, tuple[list[Task], float]] = {}
        for batch in self._out.values():  # in the order they were sent
            found[id(batch.tasks)] = batch.tasks, batch.since
        return list(found.values())

    # ------------------------------------------------------------------ connection

    def _threads(self) -> int:
        return sum(worker["nthreads"] for worker in self._workers().values())

    def _workers(self) -> dict[str, dict[str, int]]:
        return self._client.scheduler_info(n_workers=-1)["workers"]

    def _gone(self) -> bool:
        return self._client.status != "running"

    def _reconnected(self) -> Iterator[None]:
        """Wait for the scheduler to come back, and send again what was out.

        Raises ClusterError: it does not.
        """
        for tasks, _ in self._newest():
            self._again += tasks
        self._out.clear()
        self._client.close(timeout=1)
        deadline = time.monotonic() + PATIENCE_SECONDS
        while True:
            yield None
            try:
                self._client = self._connected(5.0)
            except UnreachableError:
                if time.monotonic() > deadline:
                    raise ClusterError(
                        f"The scheduler at {self._address} has gone away.",
                        remedy="What was done is kept: start it, and run the same command again.",
                    ) from None
                time.sleep(1.0)
            else:
                return

    def _connected(self, seconds: float) -> _Client:
        distributed = _distributed()
        try:
            client: _Client = distributed.Client(
                self._address, timeout=seconds, set_as_default=False, name="railguard-audit"
            )
        except (OSError, TimeoutError) as error:
            raise UnreachableError(
                f"No scheduler answers at {self._address}: {error}.",
                remedy="Start one: dask scheduler.",
            ) from error
        try:
            client.wait_for_workers(1, timeout=seconds)
        except TimeoutError as error:
            client.close()
            raise UnreachableError(
                f"The cluster at {self._address} has no worker.", remedy="Start one: dask worker."
            ) from error
        self._held_to_plan(client)
        return client

    def _held_to_plan(self, client: _Client) -> None:
        """Refuse workers of another build, and workers that do not see a root."""
        found = client.run(remote.introduce, self._plan.roots, on_error="return")
        builds: dict[str, str] = {}
        for worker, said in found.items():
            if not isinstance(said, bytes):
                client.close()
                raise ClusterError(
                    f"The worker {worker} cannot run railguard: {type(said).__name__}: {said}.",
                    remedy="Install railguard[audit] in its environment, and restart it.",
                )
            report = msgspec.msgpack.decode(said, type=remote.Report)
            if report.build != self._plan.build:
                builds[report.build] = worker
            if report.blind:
                client.close()
                raise ClusterError(
                    f"The worker {worker} does not see {report.blind[0]}.",
                    remedy="Mount it there under the same path, or name the root by a URL.",
                )
        if builds:
            client.close()
            raise _other_build(self._plan.build, builds)


class UnreachableError(ClusterError):
    """Nobody answers; it may be worth another try."""


def _other_build(ours: str, theirs: dict[str, str]) -> ClusterError:
    build, worker = next(iter(theirs.items()))
    return ClusterError(
        f"{worker} has railguard {build}, and this is {ours}: their results cannot be mixed.",
        remedy="Install the same railguard in both places, and restart the workers.",
    )


def _distributed() -> Any:  # noqa: ANN401 - a module
    try:
        import distributed
    except ImportError as error:
        raise UsageError(
            "A cluster needs dask.distributed.", remedy="pip install 'railguard[audit]'."
        ) from error
    return distributed
