"""Print how many generated sound designs draw a false critical or major finding.

The designs are made up at random, sized as a handbook sizes them (tests/faults/generated.py).
Run: python tests/bench/quiet.py [COUNT [START]], from the top of the tree.
"""

import sys
import time
from collections import Counter
from pathlib import Path

sys.path.insert(0, str(Path(__file__).parents[2]))

from tests.faults.generated import designs
from tests.faults.verdict import flat, loud, reviewed

WANTED = 0.01


def main(count: int, start: int) -> None:
    """Print the share of loud designs, each loud one, and what milder findings there were."""
    began = time.perf_counter()
    stages = judged = left_open = 0
    false = []
    mild: Counter[str] = Counter()
    for design in designs(count, start):
        review = reviewed(design.text)
        stages += len(review.design.stages)
        judged += review.judged
        left_open += review.open
        found = loud(review)
        mild.update(f"{f.severity} {f.rule}" for f in flat(review.findings))
        if found:
            false.append(f"{design.name} ({design.made}): {found[0].severity} {found[0].message}")
    print(f"designs          {count}, {stages} stages, in {time.perf_counter() - began:.0f} s")
    print(f"judged           {judged}, {left_open} left open")
    print(f"false alarms     {len(false) / count:.4f}   (at most {WANTED})")
    for line in false:
        print(f"  {line}")
    for words, times in mild.most_common():
        print(f"  {times:>5}  {words}")


if __name__ == "__main__":
    counts = [int(word) for word in sys.argv[1:3]]
    main(*counts, *(1000, 0)[len(counts) :])
