"""Print the time of one review beside the time of importing what it rests on, in pairs.

A whole process each, in turn: the review of a netlist of about 100 cards, and a bare import of
click, lark, rich.console, msgspec and numpy. Run: python tests/bench/review_time.py
"""

import statistics
import subprocess
import sys
import time
from pathlib import Path

ROOT = Path(__file__).parents[2]
DECK = ROOT / "fixtures" / "station" / "station.cir"
PAIRS = 15
IMPORTS = "import click, lark, rich.console, msgspec, numpy"


def seconds(*command: str) -> float:
    """Return the wall time of one process."""
    start = time.perf_counter()
    subprocess.run(command, cwd=ROOT, stdout=subprocess.DEVNULL, check=True)
    return time.perf_counter() - start


def main() -> None:
    """Print medians and the median of the pairwise ratio."""
    review = (sys.executable, "-m", "railguard", "review", str(DECK))
    imports = (sys.executable, "-c", IMPORTS)
    seconds(*review)  # the first run writes byte code and the grammar's cache
    pairs = [(seconds(*review), seconds(*imports)) for _ in range(PAIRS)]
    ratio = statistics.median(a / b for a, b in pairs)
    cards = sum(1 for line in DECK.read_text().splitlines() if line[:1].isalpha())
    print(f"review of {cards} cards   {statistics.median(a for a, _ in pairs):.3f} s")
    print(f"imports alone        {statistics.median(b for _, b in pairs):.3f} s")
    print(f"ratio, pairwise      {ratio:.2f}   (at most 2)")


if __name__ == "__main__":
    main()
