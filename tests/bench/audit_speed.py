"""Print the speed and memory of an audit, beside ngspice working out one operating point each.

Designs are those of `audit_designs.py`. Other work may share the machine, so processor time stands
beside wall time: so many designs a second is what the cores give when nothing else runs.

Run: python tests/bench/audit_speed.py [COUNT [WORKERS]]
"""

import os
import resource
import shutil
import sqlite3
import subprocess
import sys
import tempfile
import time
from concurrent.futures import ThreadPoolExecutor
from pathlib import Path

from tests.bench.audit_designs import counted, design, write


def main() -> None:
    """Print the audit's rows, its memory as it goes, then ngspice's row."""
    count = int(sys.argv[1]) if len(sys.argv) > 1 else 10_000
    workers = int(sys.argv[2]) if len(sys.argv) > 2 else 2
    with tempfile.TemporaryDirectory() as folder:
        share = Path(folder) / "share"
        broken = write(share, count)
        cards = sorted(len(_cards(design(k)[0])) for k in range(0, count, max(count // 500, 1)))
        calls = sorted(design(k)[0].count("\nXU") for k in range(0, count, max(count // 500, 1)))
        print(
            f"{count} designs, {len(broken)} with a fault; medians: {cards[len(cards) // 2]} cards,"
            f" {calls[len(calls) // 2]} op-amps; {workers} processes each"
        )
        base = Path(folder) / "audit.sqlite"
        wall, busy, memory = _audited(share, base, workers, count)
        print(
            f"{'':>22} {'wall s':>8} {'cpu s':>8} {'per wall s':>10} {'per cpu s':>10} {'load':>6}"
        )
        _row("railguard audit", count, wall, busy)
        wall_again, busy_again, _ = _audited(share, base, workers, count)
        _row("the same once more", count, wall_again, busy_again)
        if shutil.which("ngspice"):
            _row("ngspice -b, .op", count, *_simulated(share, workers))
        print("memory of the audit and its workers, MB:")
        print("  " + ", ".join(f"{files}: {size:.0f}" for files, size in memory))
        print(f"results: {base.stat().st_size / 1e6:.1f} MB")
        print(f"verdicts: {_verdicts(base)}")
        print(f"of {len(broken)} broken designs {_held(base, broken)} are on hold")


def _cards(text: str) -> list[str]:
    return [line for line in text.splitlines()[1:] if line[:1].isalpha()]


def _row(name: str, count: int, wall: float, busy: float) -> None:
    load = os.getloadavg()[0]
    print(
        f"{name:>22} {wall:>8.1f} {busy:>8.1f} {count / wall:>10.1f} {count / busy:>10.1f}"
        f" {load:>6.1f}",
        flush=True,
    )


def _busy() -> float:
    used = resource.getrusage(resource.RUSAGE_CHILDREN)
    return used.ru_utime + used.ru_stime


def _audited(
    share: Path, base: Path, workers: int, count: int
) -> tuple[float, float, list[tuple[int, float]]]:
    """Return wall and processor time, and (files, MB) as the audit goes on."""
    start, before = time.perf_counter(), _busy()
    run = subprocess.Popen(
        [
            sys.executable,
            "-m",
            "railguard",
            "audit",
            share,
            "--to",
            base,
            "--workers",
            str(workers),
        ],
        stderr=subprocess.DEVNULL,
    )
    memory: list[tuple[int, float]] = []
    marks = [count * k // 10 for k in range(1, 10)]
    while run.poll() is None:
        time.sleep(0.2)
        done = counted(base)
        if marks and done >= marks[0]:
            memory.append((done, _megabytes(run.pid)))
            marks = [mark for mark in marks if mark > done]
    assert run.returncode == 0
    return time.perf_counter() - start, _busy() - before, memory


def _megabytes(pid: int) -> float:
    """Return the memory of a process and its children, shared pages counted once."""
    children = Path(f"/proc/{pid}/task/{pid}/children").read_text().split()
    size = 0
    for one in (str(pid), *children):
        try:
            text = Path(f"/proc/{one}/smaps_rollup").read_text()
        except OSError:
            continue
        size += next(int(line.split()[1]) for line in text.splitlines() if line.startswith("Pss:"))
    return size / 1e3


def _simulated(share: Path, workers: int) -> tuple[float, float]:
    start, before = time.perf_counter(), _busy()
    with ThreadPoolExecutor(workers) as pool:
        list(pool.map(_operating_point, sorted(share.rglob("*.cir"))))
    return time.perf_counter() - start, _busy() - before


def _operating_point(deck: Path) -> None:
    subprocess.run(
        ["ngspice", "-n", "-b", deck.name], cwd=deck.parent, capture_output=True, check=True
    )


def _verdicts(base: Path) -> dict[str, int]:
    with sqlite3.connect(base) as reading:
        return dict(
            reading.execute("SELECT verdict, COUNT(*) FROM file WHERE state = 'design' GROUP BY 1")
        )


def _held(base: Path, broken: dict[str, str]) -> int:
    with sqlite3.connect(base) as reading:
        held = {row[0] for row in reading.execute("SELECT path FROM file WHERE verdict = 'hold'")}
    return len(held & set(broken))


if __name__ == "__main__":
    main()
