"""Print how many faults of the fault suite are found, and how they are told.

Every class of faults in every circuit on every amplifier (tests/faults), each in one spelling in
turn. Run: python tests/bench/recall.py [EVERY], from the top of the tree; EVERY takes each n-th.
"""

import sys
import time
from collections import Counter
from pathlib import Path

sys.path.insert(0, str(Path(__file__).parents[2]))

from tests.faults.circuits import CIRCUITS, bases
from tests.faults.suite import cases
from tests.faults.verdict import told

WANTED = 0.98


def main(every: int) -> None:
    """Print recall, and every case that was missed, told too mildly, or told more than once."""
    start = time.perf_counter()
    made: Counter[str] = Counter()
    found: Counter[str] = Counter()
    grave = held = 0
    trouble = []
    for case in cases(every):
        said = told(case)
        made[case.family] += 1
        found[case.family] += said.found
        if case.holds:
            grave += 1
            held += said.held
        for word, bad in (
            ("missed", not said.found),
            ("mild", case.holds and said.found and not said.held),
            ("twice", len(said.causes) > 1),
        ):
            if bad:
                rules = ", ".join(f"{f.severity} {f.rule}" for f in said.causes or said.every)
                trouble.append((word, f"{case.name}: {rules or 'nothing'}"))
    total = sum(made.values())
    if not total:
        print("no cases")
        return
    sound = sum(1 for _ in bases())
    print(f"sound circuits   {len(CIRCUITS)}, {sound} with their devices")
    print(f"faults           {total} in {time.perf_counter() - start:.0f} s")
    for family in made:
        print(f"  {family:<12} {found[family]:>5} of {made[family]:>5}")
    print(f"found            {sum(found.values()) / total:.4f}   (at least {WANTED})")
    print(f"held             {held / max(grave, 1):.4f}   of {grave} that must be major at least")
    twice = sum(word == "twice" for word, _ in trouble)
    print(f"told once        {1 - twice / total:.4f}")
    for word, line in trouble:
        print(f"  {word:<7} {line}")


if __name__ == "__main__":
    main(int(sys.argv[1]) if len(sys.argv) > 1 else 1)
