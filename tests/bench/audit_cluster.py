"""Print what an audit on a cluster costs: serial and parallel part, bytes on the wire, memory.

A scheduler and its workers run on this machine, each in a process of its own, in a network
namespace of their own where that is allowed, so that the loopback's counter holds their traffic
alone. Other work may share the machine: the parts are told in processor time, which that changes
little, and wall time stands beside it.

Run: python tests/bench/audit_cluster.py scale [COUNT]     1, 2 and 4 workers
     python tests/bench/audit_cluster.py memory [COUNT]    one run, memory as it goes
"""

import os
import shutil
import signal
import socket
import subprocess
import sys
import tempfile
import time
from pathlib import Path

from tests.bench.audit_designs import FOLDER_HOLDS, counted, write

PORT = 8795
ADDRESS = f"tcp://127.0.0.1:{PORT}"
TICKS = os.sysconf("SC_CLK_TCK")
INSIDE = "RAILGUARD_BENCH_INSIDE"

SMALL = """Divider {number} of the gauge's supply monitor
V1 in 0 {volts}
R1 in out 10k
R2 out 0 {ohms}k
C1 out 0 100n
.end
"""


class Cluster:
    """A scheduler and so many workers of one thread."""

    def __init__(self, workers: int, folder: Path) -> None:
        self._folder = folder
        self.scheduler = self._start(
            "scheduler", "--host", "127.0.0.1", "--port", str(PORT), "--no-dashboard"
        )
        while socket.socket().connect_ex(("127.0.0.1", PORT)):
            time.sleep(0.1)
        self.workers = [
            self._start(
                "worker", ADDRESS, "--nthreads", "1", "--no-dashboard", "--memory-limit", "0",
                "--no-nanny", "--host", "127.0.0.1",
            )
            for _ in range(workers)
        ]  # fmt: skip
        time.sleep(5)

    def _start(self, *words: str) -> "subprocess.Popen[bytes]":
        return subprocess.Popen(
            [sys.executable, "-m", "dask", *words],
            cwd=self._folder, stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL,
            start_new_session=True,
        )  # fmt: skip

    def end(self) -> None:
        """End every process."""
        for run in (*self.workers, self.scheduler):
            os.killpg(run.pid, signal.SIGKILL)
            run.wait()
        time.sleep(1)

    def busy(self) -> float:
        """Return processor seconds of the workers and the processes under them."""
        return sum(_busy(pid) for run in self.workers for pid in (run.pid, *_children(run.pid)))


def _children(pid: int) -> list[int]:
    found = []
    for task in Path(f"/proc/{pid}/task").iterdir():
        found += [int(child) for child in (task / "children").read_text().split()]
    return found


def _busy(pid: int) -> float:
    fields = Path(f"/proc/{pid}/stat").read_text().rsplit(")", 1)[1].split()
    return (int(fields[11]) + int(fields[12])) / TICKS


def _megabytes(pid: int) -> float:
    lines = Path(f"/proc/{pid}/status").read_text().splitlines()
    return next(int(line.split()[1]) for line in lines if line.startswith("VmRSS")) / 1e3


def _sent() -> int:
    """Return bytes sent over the loopback, in this network namespace."""
    for line in Path("/proc/net/dev").read_text().splitlines():
        if line.strip().startswith("lo:"):
            return int(line.split(":")[1].split()[8])
    return 0


def _audit(share: Path, base: Path) -> "subprocess.Popen[bytes]":
    words = ["audit", str(share), "--to", str(base), "--cluster", ADDRESS]
    return subprocess.Popen([sys.executable, "-m", "railguard", *words], stderr=subprocess.DEVNULL)


def scale(count: int) -> None:
    """Print a row for 1, 2 and 4 workers."""
    print(f"{count} designs of about 80 cards and 4 op-amps; ms of processor time a design")
    print(
        f"{'workers':>8} {'per s':>8} {'client':>8} {'scheduler':>10} {'workers':>8} {'bytes':>8}"
    )
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        write(folder / "share", count)
        for workers in (1, 2, 4):
            cluster = Cluster(workers, folder)
            base = folder / f"{workers}.sqlite"
            run = _audit(share=folder / "share", base=base)
            # Between the first commit and the last: what it takes to start is no part of the work.
            first: tuple[float, ...] = ()
            last: tuple[float, ...] = ()
            while run.poll() is None:
                time.sleep(0.2)
                done = counted(base)
                if done and (not first or done > last[0]):
                    last = _state(done, run.pid, cluster)
                    first = first or last
            files = last[0] - first[0]
            wall, *parts = ((b - a) / files for a, b in zip(first[1:], last[1:], strict=True))
            client, scheduler, worked, sent = (part * 1e3 for part in parts)
            print(
                f"{workers:>8} {1 / wall:>8.1f} {client:>8.2f} {scheduler:>10.2f} {worked:>8.2f}"
                f" {sent / 1e3:>8.0f}   load {os.getloadavg()[0]:.1f}",
                flush=True,
            )
            cluster.end()


def _state(done: int, client: int, cluster: Cluster) -> tuple[float, ...]:
    """Return files done, the time, processor seconds of each part, and bytes sent."""
    own = _busy(client), _busy(cluster.scheduler.pid), cluster.busy()
    return (float(done), time.perf_counter(), *own, float(_sent()))


def memory(count: int) -> None:
    """Print the memory of client and scheduler while one run goes on."""
    print(f"{count} small designs; resident memory, MB")
    print(f"{'files':>8} {'client':>8} {'scheduler':>10} {'workers':>8}", end="")
    print("   since the row before: ms of client and scheduler, bytes, a file")
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        for number in range(count):
            place = folder / "share" / f"lot{number // FOLDER_HOLDS:03}"
            if number % FOLDER_HOLDS == 0:
                place.mkdir(parents=True)
            text = SMALL.format(number=number, volts=5 + number % 9, ohms=1 + number % 50)
            (place / f"{number:06}.cir").write_text(text)
        cluster = Cluster(2, folder)
        base = folder / "audit.sqlite"
        marks = [mark for mark in (1_000, 3_000, 10_000, 30_000, 60_000, 100_000) if mark <= count]
        run = _audit(folder / "share", base)
        before: tuple[float, ...] = ()
        while run.poll() is None:
            time.sleep(0.5)
            done = counted(base)
            if marks and done >= min(marks[0], int(count * 0.97)):
                marks = [mark for mark in marks[1:] if mark > done]
                size = sum(_megabytes(worker.pid) for worker in cluster.workers)
                both = (_megabytes(run.pid), _megabytes(cluster.scheduler.pid))
                print(f"{done:>8} {both[0]:>8.1f} {both[1]:>10.1f} {size:>8.1f}", end="")
                now = (done, _busy(run.pid), _busy(cluster.scheduler.pid), _sent())
                print(_rates(before, now), flush=True)
                before = now
        print(f"results {_size(base):.1f} MB")
        cluster.end()


def _rates(before: tuple[float, ...], now: tuple[float, ...]) -> str:
    """Return what a file cost between two rows."""
    if not before or now[0] == before[0]:
        return ""
    files = now[0] - before[0]
    client, scheduler, sent = ((b - a) / files for a, b in zip(before[1:], now[1:], strict=True))
    return f"   {client * 1e3:.2f} {scheduler * 1e3:.2f} {sent:.0f}"


def _size(base: Path) -> float:
    return base.stat().st_size / 1e6


def _isolated() -> bool:
    """Run this script again in a network namespace of its own; tell whether that was done."""
    if INSIDE in os.environ or os.geteuid() or not shutil.which("unshare"):
        return False
    words = f"ip link set lo up && exec {sys.executable} {' '.join(sys.argv)}"
    return (
        subprocess.run(
            ["unshare", "--net", "sh", "-c", words], env={**os.environ, INSIDE: "1"}
        ).returncode
        == 0
    )


if __name__ == "__main__" and not _isolated():
    what = sys.argv[1] if len(sys.argv) > 1 else "scale"
    number = int(sys.argv[2]) if len(sys.argv) > 2 else {"scale": 1_000, "memory": 100_000}[what]
    {"scale": scale, "memory": memory}[what](number)
