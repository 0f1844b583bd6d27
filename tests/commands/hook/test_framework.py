"""The pre-commit framework itself, against a clone of this repository.

Skipped where the framework is not installed (`pip install pre-commit`), or where this is no clone:
it builds an environment with pip, which takes the better part of a minute.
"""

import re
import shutil
from pathlib import Path

import pytest

from railguard.commands.hook.staged import is_netlist
from railguard.deck.suffixes import NETLISTS
from tests.commands.hook.conftest import ROOT
from tests.gauge import CLIPPED, SOUND

MANIFEST = (ROOT / ".pre-commit-hooks.yaml").read_text(encoding="utf-8")


def test_the_framework_is_told_the_same_names():
    """What it hands over is what the command takes for a netlist."""
    pattern = re.compile(re.search(r"files: (.*)", MANIFEST)[1])
    for suffix in NETLISTS:
        for name in (f"boards/gauge{suffix}", f"GAUGE{suffix.upper()}"):
            assert is_netlist(name)
            assert pattern.search(name)
    assert pattern.search("boards/railguard.toml")
    for name in ("gauge.py", "cir", "notes.cir.txt", "other-railguard.toml"):
        assert not is_netlist(name)
        assert not pattern.search(name)


@pytest.fixture
def framed(new, tmp_path, monkeypatch):
    """A repository that uses the framework with our hook."""
    if shutil.which("pre-commit") is None:
        pytest.skip("the pre-commit framework is not installed")
    if not (ROOT / ".git").exists():
        pytest.skip("this is no clone")
    monkeypatch.setenv("PRE_COMMIT_HOME", str(tmp_path / "framework"))
    monkeypatch.delenv("PYTHONPATH")
    made = new()
    head = made.git("-C", str(ROOT), "rev-parse", "HEAD").strip()
    made.add(
        ".pre-commit-config.yaml",
        f"repos:\n- repo: {ROOT}\n  rev: {head}\n  hooks:\n  - id: railguard\n"
        "    args: [--new-only]\n",
    )
    done = made.run("pre-commit", "install", "--install-hooks", "-t", "pre-commit")
    assert done.returncode == 0, done.stdout
    return made


def test_with_the_real_framework(framed):
    """Installed from the clone, it stops, lets pass, and reads what is staged."""
    framed.add("gauge.cir", CLIPPED)
    made, told = framed.commit()
    assert not made
    assert "headroom-output" in told
    framed.add("gauge.cir", SOUND.replace("RL out 0 10k\n", ".include load.inc\n"))
    framed.add("load.inc", "RL out 0 10k\n")
    framed.write("gauge.cir", CLIPPED)
    made, told = framed.commit()
    assert made, told
    framed.add("load.inc", "RL out 0 20\n")
    made, told = framed.commit()
    assert not made
    assert "drive-current" in told
    framed.git("checkout", "-q", "HEAD", "--", "gauge.cir", "load.inc")
    framed.add("old.cir", CLIPPED)
    framed.keep()
    told = framed.run("pre-commit", "run", "--all-files").stdout
    assert "Passed" in told
    Path(framed.folder, ".pre-commit-config.yaml").write_text(
        Path(framed.folder, ".pre-commit-config.yaml").read_text().replace("--new-only", "")
    )
    framed.git("add", ".")
    done = framed.run("pre-commit", "run", "--all-files")
    assert done.returncode == 1
    assert "old.cir" in done.stdout
