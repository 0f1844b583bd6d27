"""Every hostile deck is reviewed within a gigabyte and minutes, with the bounds as delivered."""

import os
import subprocess
import sys
from pathlib import Path

import pytest

from tests.hostile.bounded import DECKS

HOUSE = Path(__file__).parents[2]
EACH = 60.0
"""Seconds of processor time: the slowest takes ten, what is not bounded takes days."""


@pytest.mark.skipif(os.name == "nt", reason="a process is bounded by POSIX limits")
def test_no_deck_exhausts_a_small_machine():
    """The process that reviews them is ended by the system where it passes a bound."""
    done = subprocess.run(
        [sys.executable, "-m", "tests.hostile.bounded"],
        cwd=HOUSE,
        env={**os.environ, "PYTHONPATH": str(HOUSE), "OPENBLAS_NUM_THREADS": "1"},
        capture_output=True,
        text=True,
        timeout=900,
        check=False,
    )
    took = dict(line.split("\t") for line in done.stdout.splitlines())
    assert done.returncode == 0, (list(took)[-1:], done.stderr[-2000:])
    assert set(took) == {*DECKS, "files that include files"}
    assert all(float(seconds) < EACH for seconds in took.values()), took
