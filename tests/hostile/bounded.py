"""Hostile decks, each reviewed within what a small machine has; run in a process of its own.

`python -m tests.hostile.bounded` prints a line a deck: its name, and its seconds of processor time.
"""

import sys
import tempfile
import time
from pathlib import Path

from railguard.reviewing import review
from tests.hostile.test_bombs import ENDLESS, GAUGE, ten_in_ten

BYTES = 1 << 30
"""Of memory, for all of them; the largest takes 160 MB of it."""

SECONDS = 300
"""Of processor time, for all of them: they take some twenty."""

DOUBLED = "\n".join(f".func f{n}(x)={{f{n - 1}(x)+f{n - 1}(x)}}" for n in range(1, 60))
CHAINED = "\n".join(f".param a{n}={{a{n - 1}+a{n - 1}}}" for n in range(1, 5_001))

DECKS = ENDLESS | {
    "subcircuits of subcircuits": ten_in_ten("R1 a b 1k\n"),
    "subcircuits of nothing": ten_in_ten(""),
    "subcircuits with parameters": ten_in_ten("R1 a b {k}\n").replace(" a b\n", " a b k=1\n"),
    "a chain of parameters": f".param a0=1\n{CHAINED}\nRx in 0 {{a5000}}",
    "a condition on a chain": f".param a0=1\n{CHAINED}\n.if (a60)\nRx in 0 1\n.endif",
    "functions of functions": f".func f0(x)={{x+x}}\n{DOUBLED}\n"
    + "\n".join(f"Rx{n} in 0 {{f59({n})}}" for n in range(2_000)),
    "powers of powers": "\n".join(f"R7{n} in 0 {{10**10**10**10}}" for n in range(1_000)),
    "definitions inside definitions": "".join(f".subckt s{n} a b\n" for n in range(20_000)),
}


def included(folder):
    """Lay thirty files that each include the next one twice, and return the first."""
    for level in range(30):
        text = f".include a{level + 1}.inc\n" * 2
        (folder / f"a{level}.inc").write_text(text)
    (folder / "a30.inc").write_text("* the last\n")
    deck = folder / "gauge.cir"
    deck.write_text(GAUGE.replace("\n", "\n.include a0.inc\n", 1))
    return deck


def limit():
    """Hold this process to its bounds."""
    import resource

    resource.setrlimit(resource.RLIMIT_AS, (BYTES, BYTES))
    resource.setrlimit(resource.RLIMIT_CPU, (SECONDS, SECONDS))


def told(name, begun):
    """Write what a deck took; at once, so that one that ends the process is the next."""
    sys.stdout.write(f"{name}\t{time.process_time() - begun:.2f}\n")
    sys.stdout.flush()


def main():
    """Review each deck, and print what it took."""
    limit()
    title, rest = GAUGE.split("\n", 1)
    for name, cards in DECKS.items():
        begun = time.process_time()
        review(f"{title}\n{cards}\n{rest}", plugins=False)
        told(name, begun)
    with tempfile.TemporaryDirectory() as folder:
        begun = time.process_time()
        review(included(Path(folder)), plugins=False)
        told("files that include files", begun)


if __name__ == "__main__":
    sys.exit(main())
