"""Print how fast netlists are read: cards a second by size, beside PySpice's parser and ngspice.

Run: python tests/bench/reading.py
"""

import gc
import resource
import shutil
import subprocess
import sys
import tempfile
import time
import tracemalloc
from pathlib import Path

from railguard.circuit.flatten import flatten
from railguard.deck.files import deck_from_text

SIZES = (1_000, 10_000, 100_000)
REPEATS = 5


def deck(cards: int) -> str:
    """Return a deck of resistors, capacitors, sources and calls, a fifth with expressions."""
    lines = ["reading bench", "V1 n0 0 5", ".param r=1k", ".subckt s p q", "R1 p q {r}", ".ends"]
    for k in range(cards):
        a, b = f"n{k % 997}", f"n{(k + 1) % 997}"
        match k % 10:
            case 0 | 1 | 2 | 3:
                lines.append(f"R{k} {a} {b} 4.7k")
            case 4 | 5 | 6:
                lines.append(f"C{k} {a} 0 100n")
            case 7:
                lines.append(f"R{k} {a} {b} {{r*2}}")
            case 8:
                lines.append(f"X{k} {a} {b} s")
            case _:
                lines.append(f"V{k} x{k} 0 DC 1 AC 1")
    return "\n".join([*lines, ".end", ""])


def ours(text: str) -> float:
    """Return the processor's seconds of reading and flattening."""
    start = time.process_time()
    flatten(deck_from_text(text))
    return time.process_time() - start


def memory(text: str) -> float:
    """Return bytes an element."""
    read = deck_from_text(text)
    tracemalloc.start()
    elements = flatten(read).elements
    size, _ = tracemalloc.get_traced_memory()
    tracemalloc.stop()
    return size / len(elements)


def pyspice(text: str) -> float:
    """Return the processor's seconds PySpice's parser takes."""
    import logging

    logging.getLogger("PySpice").setLevel(logging.CRITICAL)
    from PySpice.Spice.Parser import SpiceParser

    start = time.process_time()
    SpiceParser(source=text)
    return time.process_time() - start


def ngspice(text: str) -> float | None:
    """Return the processor's seconds of an ngspice process that loads the deck, no more."""
    if shutil.which("ngspice") is None:
        return None
    with tempfile.TemporaryDirectory() as folder:
        (Path(folder) / "d.cir").write_text(text)
        before = resource.getrusage(resource.RUSAGE_CHILDREN)
        subprocess.run(["ngspice", "-n", "-b", "d.cir"], cwd=folder, capture_output=True)
        after = resource.getrusage(resource.RUSAGE_CHILDREN)
        return after.ru_utime + after.ru_stime - before.ru_utime - before.ru_stime


def side_by_side(text: str) -> tuple[float, float]:
    """Return the least of some measurements of each, taken in turns: other work only adds."""
    own, their = [], []
    for _ in range(REPEATS):
        for found, reader in ((own, ours), (their, pyspice)):
            gc.collect()  # what the one before left is not this one's work
            found.append(reader(text))
    return min(own), min(their)


def main() -> None:
    """Print one row a size: the least of some repeats, in seconds of the processor."""
    ours(deck(1_000))
    print(f"{'cards':>8} {'seconds':>9} {'us a card':>10} {'PySpice s':>10} {'ngspice s':>10}")
    for size in SIZES:
        text = deck(size)
        took, theirs = side_by_side(text)
        simulator = ngspice(text) if size <= 10_000 else None
        last = f"{simulator:>10.3f}" if simulator is not None else f"{'':>10}"
        print(f"{size:>8} {took:>9.3f} {took / size * 1e6:>10.1f} {theirs:>10.3f} {last}")
    print(f"{memory(deck(10_000)):.0f} bytes an element")
    print(f"{grammar() * 1e3:.1f} ms to make the card grammar's parser from its cache")


def grammar() -> float:
    """Return the processor's seconds of making a parser in a process of its own, lark imported."""
    code = (
        "import lark, time; from railguard.deck.language import parser; a = time.process_time();"
        "parser('spice.lark'); print(time.process_time() - a)"
    )
    runs = [subprocess.run([sys.executable, "-c", code], capture_output=True, text=True)
            for _ in range(REPEATS)]  # fmt: skip
    return min(float(run.stdout) for run in runs)


if __name__ == "__main__":
    main()
