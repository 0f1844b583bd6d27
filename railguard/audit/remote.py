"""What a worker of a cluster does: a batch of files, through a bounded process of its own.

The process under it is the same as on one machine, so a file that crashes or overruns costs
itself and leaves the cluster's worker alone.
"""

import threading
import zlib
from collections import deque
from pathlib import Path

import msgspec

from railguard.audit.build import identity
from railguard.audit.pool import Pool
from railguard.audit.trees import is_url
from railguard.audit.wire import Outcome, Plan, Task

_LEVEL = 3
"""Of compression: reports repeat themselves, and the scheduler passes every byte on."""


class Answer(msgspec.Struct, frozen=True, array_like=True):
    """A batch's outcomes; or the build of a worker that must not take part."""

    outcomes: tuple[Outcome, ...] = ()
    refused: str = ""


class Report(msgspec.Struct, frozen=True):
    """What a worker says of itself before the first batch: its build, and roots it cannot see."""

    build: str
    blind: tuple[str, ...] = ()


class _Own(threading.local):
    """What each thread of a worker keeps: one process, under the plan it was last asked for."""

    plan: bytes = b""
    pool: Pool | None = None


_own = _Own()


def pack(tasks: list[Task]) -> bytes:
    """Return a batch as it travels."""
    return msgspec.msgpack.encode(tasks)


def unpack(data: bytes) -> Answer:
    """Return what came back."""
    return msgspec.msgpack.decode(zlib.decompress(data), type=Answer)


def work(plan: bytes, tasks: bytes) -> bytes:
    """Review a batch of files, and return what `unpack` understands."""
    stated = msgspec.msgpack.decode(plan, type=Plan)
    if stated.build != identity():
        return _packed(Answer(refused=identity()))
    waiting = deque(msgspec.msgpack.decode(tasks, type=list[Task]))
    pool = _pool(plan, stated)
    found = pool.results(lambda: waiting.popleft() if waiting else None)
    return _packed(Answer(outcomes=tuple(one for one in found if one is not None)))


def introduce(roots: tuple[str, ...]) -> bytes:
    """Say which railguard this worker has, and which of the roots it does not see."""
    blind = tuple(root for root in roots if not is_url(root) and not Path(root).exists())
    return msgspec.msgpack.encode(Report(identity(), blind))


def _pool(plan: bytes, stated: Plan) -> Pool:
    if _own.pool is not None and _own.plan == plan:
        return _own.pool
    if _own.pool is not None:
        _own.pool.close()
    _own.plan, _own.pool = plan, Pool(stated, 1)
    return _own.pool


def _packed(answer: Answer) -> bytes:
    return zlib.compress(msgspec.msgpack.encode(answer), _LEVEL)
