"""Commands run in environments that differ in everything a report must not hang on.

Each environment is a process with a hash seed, a locale and a time zone of its own; the locale is
set as a program that uses railguard may have set it. The locales are made here, from the sources
of the C library, so that they are real: German and Turkish write a decimal comma, and a Turkish
capital of `i` has a dot.
"""

import json
import os
import shutil
import subprocess
import sys
from pathlib import Path

import pytest

HOUSE = Path(__file__).parents[1]

ENVIRONMENTS = {
    "C": ("0", "C", "UTC", "."),
    "German": ("1", "de_DE.UTF-8", "Pacific/Kiritimati", ","),
    "Turkish": ("random", "tr_TR.UTF-8", "America/Anchorage", ","),
}
"""Hash seed, locale, time zone, and the decimal sign that shows the locale is there."""

_CHILD = """
import contextlib, io, json, locale, sys, time
from pathlib import Path
locale.setlocale(locale.LC_ALL, "")
time.tzset()
from railguard.commands.main import railguard
assert locale.localeconv()["decimal_point"] == sys.argv[1]
for name, words in json.loads(sys.stdin.read()).items():
    out = io.TextIOWrapper(io.BytesIO(), "utf-8", write_through=True)
    with contextlib.redirect_stdout(out), contextlib.suppress(SystemExit):
        railguard.main(words, standalone_mode=False)
    Path(sys.argv[2], name).write_bytes(out.buffer.getvalue())
"""


def locales(folder):
    """Make the locales below a folder; the test is skipped where the system cannot."""
    if shutil.which("localedef") is None:
        pytest.skip("locales cannot be made here")
    for name in ("de_DE", "tr_TR"):
        words = ["localedef", "-i", name, "-f", "UTF-8", str(folder / f"{name}.UTF-8")]
        done = subprocess.run(words, capture_output=True, check=False)
        if not (folder / f"{name}.UTF-8" / "LC_NUMERIC").exists():
            pytest.skip(f"locales cannot be made here: {done.stderr.decode()[:200]}")
    return folder


def run(environment, commands, root, out, locales):
    """Run commands in a folder, one after the other in one process; return what each printed.

    commands  their words by a name
    out       a folder for what they print
    locales   where `locales` made them
    """
    seed, locale, zone, sign = ENVIRONMENTS[environment]
    done = subprocess.run(
        [sys.executable, "-c", _CHILD, sign, str(out)],
        input=json.dumps(commands).encode(),
        cwd=root,
        env={
            **os.environ,
            "PYTHONPATH": str(HOUSE),
            "PYTHONHASHSEED": seed,
            "LC_ALL": locale,
            "LANG": locale,
            "LOCPATH": str(locales),
            "TZ": zone,
            "COLUMNS": "80",
        },
        capture_output=True,
        check=False,
    )
    assert done.returncode == 0, done.stderr.decode()[-2000:]
    return {name: (out / name).read_bytes() for name in commands}
