"""The runner: what it refuses to run, what it survives, and when a result counts."""

import os
import shutil
import time
from pathlib import Path

import pytest

from railguard.engine.ngspice import VARIABLE, Ngspice, find
from railguard.engine.requests import OperatingPoint, Sweep, Transient
from railguard.errors import EngineError

TITLE = ".title railguard\n"
DIVIDER = f"{TITLE}V1 n1 0 DC 3\nR1 n1 n2 1000\nR2 n2 0 2000\n"

needs_ngspice = pytest.mark.skipif(
    shutil.which("ngspice") is None, reason="ngspice is not installed"
)
needs_posix = pytest.mark.skipif(os.name != "posix", reason="the stand-in programs are scripts")


def _script(folder: Path, body: str) -> Ngspice:
    path = folder / "ngspice"
    path.write_text(f"#!/bin/sh\n{body}\n", encoding="ascii")
    path.chmod(0o755)
    return Ngspice(str(path), seconds=1.0)


@needs_ngspice
def test_a_divider_gives_its_voltage_and_its_sources_current():
    """Two resistors share three volts."""
    run = find().run(DIVIDER, OperatingPoint())
    assert run.plots[0].voltage("n2")[0] == pytest.approx(2.0, rel=1e-9)
    assert run.plots[0].current("v1")[0] == pytest.approx(-1e-3, rel=1e-9)
    assert not run.fallback


@needs_ngspice
def test_several_analyses_come_back_in_the_order_they_were_asked_for():
    """The program writes its plots in an order of its own."""
    requests = (Transient(1e-5, 1e-3), Sweep("V1", 0.0, 3.0, 1.0), OperatingPoint())
    names = [plot.name for plot in find().run(DIVIDER, *requests).plots]
    assert names == ["Transient Analysis", "DC transfer characteristic", "Operating Point"]


@pytest.mark.parametrize(
    "line",
    [
        ".control",
        " .CONTROL",
        "*# shell touch {file}",
        ".include /etc/hostname",
        ".lib /etc/hostname x",
        ".csparam a=1",
        "A1 n1 n2 filesrc",
        ".model m1 filesource (a=1)",
        "R9 n1 0 `touch x`",
        "R9 n1 0 1k ; shell",
        "R9 n1 0 $HOME",
        "R9 n1 0 '1k'",
        "R9 n1 0 {1k}",
        "+ 5",
        "!touch x",
    ],
)
def test_a_line_that_could_command_or_read_is_refused_before_anything_starts(tmp_path, line):
    """The stand-in program leaves a mark if it is ever started."""
    engine = _script(tmp_path, f"touch {tmp_path}/started")
    with pytest.raises(EngineError, match="is not allowed to run"):
        engine.run(f"{DIVIDER}{line}\n", OperatingPoint())
    assert not (tmp_path / "started").exists()


@needs_ngspice
def test_a_start_file_in_the_working_folder_or_at_home_is_never_read(tmp_path, monkeypatch):
    """An untrusted repository may carry a `.spiceinit` with shell commands."""
    (tmp_path / ".spiceinit").write_text(f"shell touch {tmp_path}/ran\n", encoding="ascii")
    monkeypatch.chdir(tmp_path)
    monkeypatch.setenv("HOME", str(tmp_path))
    find().run(DIVIDER, OperatingPoint())
    assert not (tmp_path / "ran").exists()


@needs_posix
def test_a_run_that_hangs_is_ended_with_everything_it_started(tmp_path):
    """The child of the stand-in would leave its mark after the limit."""
    engine = _script(tmp_path, f"(sleep 2; touch {tmp_path}/late) & sleep 30")
    begun = time.monotonic()
    with pytest.raises(EngineError, match="was ended after 1 s"):
        engine.run(DIVIDER, OperatingPoint())
    # The stand-in would have slept thirty seconds.
    assert time.monotonic() - begun < 20.0
    time.sleep(2.0)
    assert not (tmp_path / "late").exists()


@needs_posix
def test_a_crash_is_an_error_that_names_the_signal(tmp_path):
    """Signal 11 is a segmentation fault."""
    with pytest.raises(EngineError, match="ended by signal 11"):
        _script(tmp_path, "kill -11 $$").run(DIVIDER, OperatingPoint())


@needs_posix
def test_ending_well_without_a_result_is_no_success(tmp_path):
    """A deck without analysis makes ngspice end with status 0 too."""
    with pytest.raises(EngineError, match="without the result"):
        _script(tmp_path, "exit 0").run(DIVIDER, OperatingPoint())


@needs_ngspice
@pytest.mark.parametrize("bad", ["V9 n1 0 5", "X9 n1 n2 absent", "D9 n1 0 absent"])
def test_a_bad_circuit_fails_and_the_next_one_runs(bad):
    """A source loop, an absent subcircuit, an absent model."""
    engine = find()
    with pytest.raises(EngineError):
        engine.run(f"{DIVIDER}{bad}\n", OperatingPoint())
    assert engine.run(DIVIDER, OperatingPoint()).plots[0].voltage("n2")[0] == pytest.approx(2.0)


def test_a_missing_ngspice_says_how_to_install_it(monkeypatch, tmp_path):
    """Relative folders of the search path do not count."""
    monkeypatch.delenv(VARIABLE, raising=False)
    monkeypatch.setenv("PATH", os.pathsep.join((".", str(tmp_path))))
    monkeypatch.chdir(tmp_path)
    with pytest.raises(EngineError, match=r"not installed.*Install it"):
        find()


@needs_posix
def test_a_program_in_the_current_folder_is_not_taken_for_ngspice(monkeypatch, tmp_path):
    """A search path with a dot in it is common enough."""
    _script(tmp_path, "exit 0")
    monkeypatch.delenv(VARIABLE, raising=False)
    monkeypatch.setenv("PATH", ".")
    monkeypatch.chdir(tmp_path)
    with pytest.raises(EngineError, match="not installed"):
        find()
