"""Print what a commit costs with the hook, git's own work included: median of whole commits.

In a repository of its own, byte code and grammar cache warm: a commit without netlists, one with a
netlist of 100 cards, and the same in a repository of 1000 netlists that each include a library;
beside each the same commit without the hook. The processor's time is printed as well, because the
wall's says little on a machine that is busy. Run: python tests/bench/hook_time.py
"""

import os
import resource
import statistics
import subprocess
import sys
import tempfile
import time
from pathlib import Path

ROOT = Path(__file__).parents[2]
STATION = ROOT / "fixtures" / "station"
ROUNDS = 11
MANY = 1000
CARDS = 100


def git(folder: Path, *arguments: str) -> tuple[float, float]:
    """Run git in a folder; return its wall time and its processor time in seconds."""
    used = resource.getrusage(resource.RUSAGE_CHILDREN)
    start = time.perf_counter()
    subprocess.run(
        ("git", "-c", "user.name=n", "-c", "user.email=e@example.org", *arguments),
        cwd=folder,
        env={**os.environ, "PYTHONPATH": str(ROOT)},
        stdout=subprocess.DEVNULL,
        stderr=subprocess.DEVNULL,
        check=True,
    )
    wall = time.perf_counter() - start
    now = resource.getrusage(resource.RUSAGE_CHILDREN)
    return wall, now.ru_utime + now.ru_stime - used.ru_utime - used.ru_stime


def row(folder: Path, name: str, path: str, text: str, aim: str) -> None:
    """Commit a file again and again, each time changed, with and without the hook; print both."""
    with_hook, without = [], []
    for number in range(2 * ROUNDS + 2):
        (folder / path).write_text(f"{text}* round {number}\n")
        git(folder, "add", path)
        took = git(folder, "commit", "-m", "x", *(["--no-verify"] if number % 2 else []))
        if number > 1:
            (without if number % 2 else with_hook).append(took)
    wall, processor = (statistics.median(column) * 1000 for column in zip(*with_hook, strict=True))
    bare = statistics.median(wall for wall, _ in without) * 1000
    print(
        f"{name:<40}{wall:6.0f} ms   processor {processor:5.0f} ms   without hook {bare:4.0f} ms"
        f"   {aim}"
    )


def main() -> None:
    """Print the table."""
    deck = (STATION / "station.cir").read_text()
    cards = sum(1 for line in deck.splitlines() if line[:1].isalpha())
    more = "".join(f"C9{number:02} vlog 0 100n\n" for number in range(CARDS - cards))
    deck = deck.replace("\n.end\n", f"\n{more}.end\n")
    with tempfile.TemporaryDirectory() as place:
        folder = Path(place)
        git(folder, "init", "-q")
        subprocess.run(
            (sys.executable, "-m", "railguard", "hook", "install"),
            cwd=folder,
            env={**os.environ, "PYTHONPATH": str(ROOT)},
            stdout=subprocess.DEVNULL,
            check=True,
        )
        (folder / "railguard.toml").write_bytes((STATION / "railguard.toml").read_bytes())
        git(folder, "add", "railguard.toml")
        row(folder, "no netlist staged", "notes.txt", "notes\n", "aim 150 ms")
        row(folder, f"one netlist of {CARDS} cards staged", "gauge.cir", deck, "aim 600 ms")
        (folder / "boards").mkdir()
        for number in range(MANY):
            text = deck.replace("\n.end\n", f"\n* {number}\n.include models.lib\n.end\n")
            (folder / "boards" / f"gauge{number}.cir").write_text(text)
        git(folder, "add", "boards")
        git(folder, "commit", "-q", "--no-verify", "-m", "many")
        row(folder, f"no netlist staged, {MANY} there", "notes.txt", "notes\n", "")
        row(folder, f"one netlist staged, {MANY} there", "gauge.cir", deck, "")


if __name__ == "__main__":
    main()
