"""An audit from beginning to end: from the roots, through the workers, into the store."""

import threading
from collections import deque
from collections.abc import Callable, Iterator
from pathlib import Path, PurePosixPath
from typing import Protocol

import msgspec

from railguard.audit.cluster import Cluster
from railguard.audit.pool import Pool
from railguard.audit.store import Store
from railguard.audit.walk import SettingsSeen, Step, skipped, walk
from railguard.audit.wire import Outcome, Plan, Task


class Watcher(Protocol):
    """Who is told how an audit goes on."""

    def expects(self, files: int, *, final: bool) -> None:
        """Take the number of files found so far; final: there are no more."""
        ...

    def did(self, outcome: Outcome, path: str) -> None:
        """Take one file's outcome."""
        ...


class Results(Protocol):
    """What hands outcomes over: a pool of this machine, or a cluster."""

    def results(self, take: Callable[[], Task | None]) -> Iterator[Outcome | None]:
        """Yield outcomes as they come, and None now and then where none does."""
        ...


def audit(plan: Plan, store: Store, workers: int, skips: tuple[str, ...], watcher: Watcher) -> None:
    """Audit the roots of a plan with workers of this machine.

    Raises UsageError: a root is not there. WorkerError: workers do not start.
    """
    with Pool(plan, workers) as pool:
        collect(plan, store, pool, skips, watcher)


def audit_on(
    plan: Plan, store: Store, address: str, skips: tuple[str, ...], watcher: Watcher
) -> None:
    """Audit the roots of a plan on a cluster.

    Raises UsageError: a root is not there. ClusterError: the cluster cannot be used.
    """
    with Cluster(plan, address) as cluster:
        collect(plan, store, cluster, skips, watcher)


def collect(
    plan: Plan, store: Store, results: Results, skips: tuple[str, ...], watcher: Watcher
) -> None:
    """Send every file through `results` and keep what comes back."""
    source = _Source(plan, store, skips, watcher)
    counter = threading.Thread(target=source.count, daemon=True)
    counter.start()
    for outcome in results.results(source.take):
        if outcome is None:
            store.commit_in_time()
            continue
        source.took(outcome)
    store.tell(others=str(source.others), build=plan.build, trusted="yes" if plan.trust else "no")
    store.finish()


class _Source:
    """Tasks from the walk and from opened archives; notes on the way what needs no worker."""

    def __init__(self, plan: Plan, store: Store, skips: tuple[str, ...], watcher: Watcher) -> None:
        self._plan, self._store, self._skips, self._watcher = plan, store, skips, watcher
        self._inside: deque[Task] = deque()
        self._steps = self._walked()
        self._members = 0
        self._counted = 0
        self._final = False
        self.others = 0

    def _walked(self) -> Iterator[Step]:
        for root, name in enumerate(self._plan.roots):
            yield from walk(root, name, self._skips)

    def count(self) -> None:
        """Count the files below the roots, for the time that remains; runs beside the audit."""
        for step in self._walked():
            self._counted += isinstance(step, Task)
            if self._counted % 1000 == 0:
                self._expect()
        self._final = True
        self._expect()

    def _expect(self) -> None:
        self._watcher.expects(self._counted + self._members, final=self._final)

    def take(self) -> Task | None:
        """Return the next task, or None where there is none at present."""
        if self._inside:
            return self._with_key(self._inside.popleft())
        for step in self._steps:
            if isinstance(step, Task):
                return self._with_key(step)
            if isinstance(step, SettingsSeen):
                self._store.saw_settings(self.listed(step.root, step.path))
            else:
                self._store.take(step, self.listed(step.root, step.path), ())
        return None

    def took(self, outcome: Outcome) -> None:
        """Keep one outcome; the members of an archive are the next tasks."""
        path = self.listed(outcome.root, outcome.path)
        self.others += outcome.state == "other"
        includes = [self.listed(outcome.root, name) for name in outcome.includes]
        circuit = self.listed(outcome.root, outcome.circuit) if outcome.circuit else ""
        self._store.take(msgspec.structs.replace(outcome, circuit=circuit), path, includes)
        for name in outcome.settings:
            self._store.saw_settings(self.listed(outcome.root, name))
        members = [m for m in outcome.members if not self._is_skipped(m.path)]
        self._inside += members
        self._members += len(members)
        if members:
            self._expect()
        self._watcher.did(outcome, path)

    def _is_skipped(self, path: str) -> bool:
        places = [path, *map(str, PurePosixPath(path).parents)]
        return any(skipped(place, self._skips) for place in places if place != ".")

    def listed(self, root: int, path: str) -> str:
        """Return a path as it is listed: behind its root's label."""
        label = self._plan.labels[root]
        return f"{label}/{path}" if label else path

    def _with_key(self, task: Task) -> Task:
        known = self._store.known(self.listed(task.root, task.path))
        return msgspec.structs.replace(task, known=known) if known else task


def labels(roots: tuple[str, ...]) -> tuple[str, ...]:
    """Return what each root's files are listed under: nothing for one, else names of their own."""
    if len(roots) == 1:
        return ("",)
    found: list[str] = []
    for root in roots:
        name = PurePosixPath(root.rstrip("/")).name or Path(root).absolute().name
        number = 2
        label = name
        while label in found:
            label, number = f"{name}-{number}", number + 1
        found.append(label)
    return tuple(found)
