"""No regular expression takes more than a scan, whatever it is given."""

import os
import re
import subprocess
import sys
from pathlib import Path

from tests.hostile import patterns

HOUSE = Path(__file__).parents[2]


def test_every_pattern_is_a_scan():
    """In a process that is ended where one is worse than slow."""
    done = subprocess.run(
        [sys.executable, "-m", "tests.hostile.patterns"],
        cwd=HOUSE,
        env={**os.environ, "PYTHONPATH": str(HOUSE)},
        capture_output=True,
        text=True,
        timeout=600,
        check=False,
    )
    assert done.returncode == 0, done.stdout[-2000:] + done.stderr[-2000:]
    assert int(done.stdout.split()[0]) > 100  # patterns were found at all


def test_a_bad_pattern_is_found():
    """Two runs of the same characters, one behind the other; and a search that starts anew."""
    pairs = ("pair", re.compile(r"\d+\.?\d*x"), {"match"}), ("anew", re.compile(r"a+b"), {"search"})
    good = ("good", re.compile(r"\d+(?:\.\d*)?x"), {"match"})
    found = patterns.slow([*pairs, good])
    assert [where for where, *_ in found] == ["pair", "anew"]
