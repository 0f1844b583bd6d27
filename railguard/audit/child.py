"""A worker: a process of its own that reviews one file after another inside a budget.

Run as `python -m railguard.audit.child FD`; FD is one end of a pipe. Messages in: the plan, then
lists of tasks. Messages out: Ready, then for each file Began (where it is reviewed) and Outcome.
"""

import gc
import os
import sys
from multiprocessing.connection import Connection

import msgspec

from railguard.audit.build import identity
from railguard.audit.examine import Examiner
from railguard.audit.wire import Began, Message, Outcome, Plan, Ready, Task

OUT_OF_MEMORY = 75
"""Exit status of a worker that could get no more memory: it has none left to say more."""

_COLLECTING = (50_000, 20, 100)


def main() -> None:
    """Serve the pipe until it closes."""
    pipe = Connection(int(sys.argv[1]))
    try:
        _serve(pipe)
    except (EOFError, BrokenPipeError, ConnectionResetError):
        # The parent has gone; what it has not got will be asked for again.
        os._exit(0)


def _serve(pipe: Connection) -> None:
    plan = msgspec.msgpack.decode(pipe.recv_bytes(), type=Plan)
    examiner = Examiner(plan)
    encode = msgspec.msgpack.Encoder().encode
    tasks = msgspec.msgpack.Decoder(list[Task])

    def send(message: Message) -> None:
        pipe.send_bytes(encode(message))

    send(Ready(identity()))
    _limit_memory(plan.budget.megabytes)
    # What is loaded by now lives as long as the process; a review makes many values and hardly a
    # circle of them, so looking for circles costs a tenth of the time at Python's own pace.
    gc.freeze()
    gc.set_threshold(*_COLLECTING)
    while True:
        for task in tasks.decode(pipe.recv_bytes()):
            _limit_time(plan.budget.seconds)
            try:
                outcome = examiner.examine(task, lambda key: send(Began(key)))
            except MemoryError:
                os._exit(OUT_OF_MEMORY)
            except Exception as error:  # noqa: BLE001 - one file's review may fail in any way
                outcome = _failed(task, error)
            send(outcome)


def _limit_memory(megabytes: int) -> None:
    """Bound the address space, beyond what is mapped already. Not every system can."""
    import resource  # POSIX; elsewhere the parent starts no worker

    try:
        with open("/proc/self/statm", "rb") as file:  # noqa: PTH123 - no path of the user's
            mapped = int(file.read().split()[0]) * resource.getpagesize()
        resource.setrlimit(resource.RLIMIT_AS, (mapped + megabytes * 1_000_000,) * 2)
    except (OSError, ValueError):
        return


def _limit_time(seconds: int) -> None:
    """Let the system end this process when a file has taken its processor time."""
    import resource

    used = resource.getrusage(resource.RUSAGE_SELF)
    soft = int(used.ru_utime + used.ru_stime) + 1 + seconds
    resource.setrlimit(resource.RLIMIT_CPU, (soft, resource.RLIM_INFINITY))


def _failed(task: Task, error: Exception) -> Outcome:
    return Outcome(
        root=task.root,
        path=task.path,
        state="stopped",
        why=f"Its review ended with {type(error).__name__}: {error}",
    )


if __name__ == "__main__":
    main()
