"""Try netlists for so many seconds and print how many were tried and what broke.

    python -m tests.bench.fuzzing --seconds 600 [--seed 1]

Each kind gets an equal share. A failing deck is shrunk and written to the folder `--keep`.
"""

import argparse
import tempfile
import time
from pathlib import Path

from hypothesis import HealthCheck, Phase, given, seed, settings
from hypothesis.strategies import SearchStrategy

from tests.fuzz.hold import hold
from tests.fuzz.netlists import hostile, nearly_valid, stage

KINDS: dict[str, SearchStrategy[bytes]] = {
    "nearly valid": nearly_valid(),
    "stages": stage(),
    "hostile": hostile,
}
ROUND = 200
"""Examples between two looks at the clock."""


def tried(
    strategy: SearchStrategy[bytes], seconds: float, first: int, keep: Path
) -> tuple[int, int]:
    """Return how many decks were tried and how many rounds failed."""
    count, failed, number = 0, 0, first
    end = time.monotonic() + seconds
    with tempfile.TemporaryDirectory() as folder:
        while time.monotonic() < end:
            number += 1
            worst = b""

            @seed(number)
            @settings(
                max_examples=ROUND,
                deadline=None,
                database=None,
                suppress_health_check=list(HealthCheck),
                phases=(Phase.generate, Phase.shrink),
            )
            @given(data=strategy)
            def one(data: bytes) -> None:
                nonlocal count, worst
                count += 1
                try:
                    hold(data, Path(folder))
                except BaseException:
                    worst = data
                    raise

            try:
                one()
            except Exception as error:  # noqa: BLE001 - whatever breaks is what this looks for
                failed += 1
                place = keep / f"seed-{number}.cir"
                place.write_bytes(worst)
                print(f"  {place}: {type(error).__name__}: {str(error).splitlines()[0]}")
    return count, failed


def main() -> None:
    """Run every kind and print one row each."""
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("--seconds", type=float, default=60.0)
    parser.add_argument("--seed", type=int, default=0)
    parser.add_argument("--keep", type=Path, default=Path(tempfile.gettempdir()))
    asked = parser.parse_args()
    asked.keep.mkdir(parents=True, exist_ok=True)
    for name, strategy in KINDS.items():
        begun = time.process_time()
        count, failed = tried(
            strategy, asked.seconds / len(KINDS), asked.seed * 1_000_000, asked.keep
        )
        spent = time.process_time() - begun
        print(f"{name:14} {count:8} tried  {failed:3} rounds failed  {spent:7.0f} s of CPU")


if __name__ == "__main__":
    main()
