"""What a commit pays for: nothing before a netlist is concerned, no drawing before a fault."""

import sys

import pytest

from tests.gauge import SOUND

CODE = """import sys
sys.argv = ["railguard", "hook", "run", *{options!r}]
from railguard.__main__ import main
try:
    main()
finally:
    print("loaded:", *(name for name in {names!r} if name in sys.modules))
"""
HEAVY = ("click", "msgspec", "numpy", "lark", "rich.console", "railguard.reviewing")


def loaded(repository, *options):
    """Return which modules a run of the hook has imported, of those that cost something."""
    code = CODE.format(options=options, names=HEAVY)
    return repository.run(sys.executable, "-c", code).stdout.split("loaded:")[1].split()


@pytest.mark.parametrize("options", [[], ["--new-only", "--hold-at=minor", "--root=."]])
def test_without_a_netlist_nothing_is_imported(repository, options):
    """Neither the command line's package nor the review's, whatever the options."""
    repository.add("notes.txt", "level\n")
    assert loaded(repository, *options) == []


def test_without_a_fault_nothing_is_drawn(repository):
    """A netlist that passes is one line, which needs no terminal's package."""
    repository.add("gauge.cir", SOUND)
    found = loaded(repository)
    assert "railguard.reviewing" in found
    assert "rich.console" not in found
