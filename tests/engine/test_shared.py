"""The shared library gives what the binary gives; one bad circuit never harms the next."""

import ctypes.util
import os
import shutil

import pytest

from railguard.engine import ngspice, shared
from railguard.engine.process import Bounds
from railguard.engine.requests import OperatingPoint, Transient
from railguard.engine.shared import VARIABLE, Shared
from railguard.errors import EngineError
from railguard.reviewing import review
from railguard.simulated import Ngspiced

LIBRARY = os.environ.get(VARIABLE) or ctypes.util.find_library("ngspice") or ""
TITLE = ".title railguard\n"
DIVIDER = f"{TITLE}V1 n1 0 DC 3\nR1 n1 n2 1000\nR2 n2 0 2000\n"

needs_library = pytest.mark.skipif(not LIBRARY, reason="ngspice's shared library is not installed")


@needs_library
def test_a_divider_gives_its_voltage_and_its_sources_current():
    """Two analyses of one deck, in the order they were asked for."""
    point, waves = Shared(LIBRARY).run(DIVIDER, OperatingPoint(), Transient(1e-5, 1e-3)).plots
    assert point.voltage("n2")[0] == pytest.approx(2.0, rel=1e-9)
    assert point.current("v1")[0] == pytest.approx(-1e-3, rel=1e-9)
    assert waves.real("time")[-1] == pytest.approx(1e-3)


@needs_library
@pytest.mark.parametrize("bad", ["V9 n1 0 5", "X9 n1 n2 absent", "D9 n1 0 absent"])
def test_a_bad_circuit_fails_and_the_next_one_runs(bad):
    """A source loop, an absent subcircuit, an absent model."""
    engine = Shared(LIBRARY)
    with pytest.raises(EngineError):
        engine.run(f"{DIVIDER}{bad}\n", OperatingPoint())
    assert engine.run(DIVIDER, OperatingPoint()).plots[0].voltage("n2")[0] == pytest.approx(2.0)


@needs_library
def test_a_deck_that_could_command_is_refused():
    """The library obeys control blocks as the binary does."""
    with pytest.raises(EngineError, match="is not allowed to run"):
        Shared(LIBRARY).run(f"{DIVIDER}.control\nshell ls\n.endc\n", OperatingPoint())


@needs_library
def test_a_start_file_in_the_working_folder_is_never_read(tmp_path, monkeypatch):
    """The library reads `.spiceinit` of the folder it is started in."""
    (tmp_path / ".spiceinit").write_text(f"shell touch {tmp_path}/ran\n", encoding="ascii")
    monkeypatch.chdir(tmp_path)
    monkeypatch.setenv("HOME", str(tmp_path))
    Shared(LIBRARY).run(DIVIDER, OperatingPoint())
    assert not (tmp_path / "ran").exists()


@needs_library
@pytest.mark.skipif(shutil.which("ngspice") is None, reason="ngspice is not installed")
def test_library_and_binary_confirm_alike():
    """The same review through both: the same sentence, figure included."""
    text = (
        "gauge\nVIN in 0 SIN(0 1 100)\nR1 in n 1k\nR2 n out 50k\nXU1 0 n vp vn out TL072\n"
        "VP vp 0 12\nVN vn 0 -12\nC1 vp 0 100n\nC2 vn 0 100n\n.end\n"
    )
    said = []
    for engine in (ngspice.find(), Shared(LIBRARY)):
        (design,) = review(text, engine=Ngspiced(engine, fill=False, confirm=True)).designs
        said.append([f.message for f in design.findings if "Confirmed: " in f.message])
    assert said[0]
    assert said[0] == said[1]


def test_a_library_that_is_none_is_an_error(tmp_path):
    """A file that cannot be loaded ends the worker, not the review."""
    broken = tmp_path / "libngspice.so"
    broken.write_bytes(b"no library")
    with pytest.raises(EngineError):
        Shared(str(broken), Bounds(seconds=20.0)).run(DIVIDER, OperatingPoint())


def test_the_library_is_taken_where_there_is_no_binary(monkeypatch, tmp_path):
    """The binary first; what the user names is never replaced."""
    monkeypatch.delenv(ngspice.VARIABLE, raising=False)
    monkeypatch.setenv("PATH", str(tmp_path))
    monkeypatch.setenv(VARIABLE, "/somewhere/libngspice.so.0")
    assert shared.find() == Shared("/somewhere/libngspice.so.0")
    with pytest.raises(EngineError, match="not a program that can be run"):
        shared.find(str(tmp_path / "absent"))
    monkeypatch.delenv(VARIABLE)
    monkeypatch.setattr(ctypes.util, "find_library", lambda name: None)
    with pytest.raises(EngineError, match=r"not installed.*Install it"):
        shared.find()
