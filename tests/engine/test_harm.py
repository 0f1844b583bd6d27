"""What a run of ngspice can do to the machine, whatever the netlist or the program: nothing."""

import os
import shutil
import sys
from pathlib import Path

import pytest

from railguard.engine import process
from railguard.engine.guard import check_deck
from railguard.engine.ngspice import Ngspice, find
from railguard.engine.requests import OperatingPoint
from railguard.errors import EngineError
from railguard.reviewing import review
from railguard.simulated import Ngspiced

DIVIDER = ".title railguard\nV1 n1 0 DC 3\nR1 n1 n2 1000\nR2 n2 0 2000\n"

pytestmark = pytest.mark.skipif(os.name != "posix", reason="the stand-in programs are scripts")
needs_ngspice = pytest.mark.skipif(
    shutil.which("ngspice") is None, reason="ngspice is not installed"
)


def stand_in(folder: Path, body: str, **bounds) -> Ngspice:
    """Return a program that takes ngspice's place."""
    path = folder / "ngspice"
    path.write_text(f"#!/bin/sh\n{body}\n", encoding="ascii")
    path.chmod(0o755)
    return Ngspice(str(path), **bounds)


def test_the_working_folder_holds_nothing_of_the_users(tmp_path, monkeypatch):
    """It is home, script folder and working folder at once, and is gone afterwards."""
    monkeypatch.setenv("GAUGE_TOKEN", "not to be handed on")
    monkeypatch.setenv("SPICE_SCRIPTS", str(tmp_path))
    monkeypatch.chdir(tmp_path)
    for name in (".spiceinit", "spice.rc", "spinit"):
        (tmp_path / name).write_text(f"shell touch {tmp_path}/ran\n", encoding="ascii")
    told = tmp_path / "told"
    engine = stand_in(tmp_path, f"pwd -P > {told}; ls -A > {told}.files; env > {told}.env")
    with pytest.raises(EngineError):
        engine.run(DIVIDER, OperatingPoint())
    place = Path(told.read_text().strip())
    assert set((tmp_path / "told.files").read_text().split()) == {"deck.cir", "log", "spinit"}
    env = dict(line.split("=", 1) for line in (tmp_path / "told.env").read_text().splitlines())
    assert "GAUGE_TOKEN" not in env
    for name in ("HOME", "SPICE_SCRIPTS", "TMPDIR"):
        assert Path(env[name]).resolve() == place
    assert tmp_path not in place.parents
    assert not place.exists()


@needs_ngspice
@pytest.mark.parametrize("name", [".spiceinit", "spinit", "spice.rc"])
@pytest.mark.parametrize("variable", ["HOME", "SPICE_SCRIPTS", "SPICE_LIB_DIR", "PWD"])
def test_no_start_file_of_a_user_is_read(tmp_path, monkeypatch, name, variable):
    """Wherever it lies, in what a program like this looks through."""
    (tmp_path / name).write_text(f"shell touch {tmp_path}/ran\n", encoding="ascii")
    (tmp_path / "scripts").mkdir()
    shutil.copy(tmp_path / name, tmp_path / "scripts" / name)
    monkeypatch.chdir(tmp_path)
    monkeypatch.setenv(variable, str(tmp_path))
    assert find().run(DIVIDER, OperatingPoint()).plots
    assert not (tmp_path / "ran").exists()


def limits_of(folder, **bounds):
    """Return the limits a stand-in finds itself under: processor time, memory, file size."""
    script = folder / "limits.py"
    script.write_text(
        "import resource, time\n"
        "time.sleep(0.5)\n"  # set from outside, just behind the start
        "kinds = resource.RLIMIT_CPU, resource.RLIMIT_AS, resource.RLIMIT_FSIZE\n"
        f"open({str(folder / 'limits')!r}, 'w').write(' '.join(\n"
        "    str(n) for kind in kinds for n in resource.getrlimit(kind)))\n"
    )
    engine = stand_in(folder, f"exec {sys.executable} -I -S {script}", **bounds)
    with pytest.raises(EngineError):
        engine.run(DIVIDER, OperatingPoint())
    found = [int(n) for n in (folder / "limits").read_text().split()]
    return found[::2], found[1::2]


@pytest.mark.parametrize("from_outside", [True, False])
def test_time_memory_and_files_are_bounded(tmp_path, monkeypatch, from_outside):
    """By the system, so that the program cannot raise them; without prlimit as well."""
    if from_outside and not process._has_prlimit():
        pytest.skip("only Linux has prlimit")
    monkeypatch.setattr(process, "_has_prlimit", lambda: from_outside)
    soft, hard = limits_of(tmp_path, seconds=30.0, memory=1 << 30, file_size=1 << 20)
    assert soft == hard == [31, 1 << 30, 1 << 20]


def test_a_program_that_takes_all_memory_is_refused_it(tmp_path):
    """It ends, and the review goes on."""
    hungry = f"exec {sys.executable} -I -S -c 'import time; time.sleep(0.5); bytearray(8 << 30)'"
    engine = stand_in(tmp_path, hungry, memory=1 << 30)
    with pytest.raises(EngineError, match="could not solve"):
        engine.run(DIVIDER, OperatingPoint())


def test_a_program_that_fills_the_disk_is_ended(tmp_path):
    """One file is as long as its bound at most."""
    engine = stand_in(
        tmp_path,
        f"sleep 0.5; exec head -c 200000000 /dev/zero > {tmp_path}/filled",
        file_size=1 << 20,
    )
    with pytest.raises(EngineError):
        engine.run(DIVIDER, OperatingPoint())
    assert (tmp_path / "filled").stat().st_size <= 1 << 20


HOSTILE = """zzgauge `touch {mark}`
VIN zzin;shell 0 SIN(0 1 1k)
R1 zzin;shell zz`touch 10k
R2 zz`touch zzout$HOME 200k
XU1zz 0 zz`touch vp vn zzout$HOME TL072
BZZ zzb 0 V=V(zzin;shell)*2
RB zzb 0 zzmodel 1k
.model zzmodel R(tc1=0 file="/etc/hostname")
.model zzs filesource (file="/etc/hostname")
AZZ zzb zzs
VP vp 0 12
VN vn 0 -12
CP vp 0 100n
CN vn 0 100n
*# shell touch {mark}
* railguard: load zzout$HOME 10k
.control
shell touch {mark}
.endc
  .CONTROL
  set x = `touch {mark}`
  .endc
.include /etc/hostname
.lib /etc/hostname zz
.csparam zz=1
.end
.control
shell touch {mark}
.endc
"""


class Recording:
    """An engine that keeps what it is given and hands it on."""

    def __init__(self, engine):
        self.engine = engine
        self.decks = []

    def run(self, deck, *requests):
        """Keep the deck; run it."""
        self.decks.append(deck)
        return self.engine.run(deck, *requests)


@needs_ngspice
def test_nothing_of_a_netlists_text_reaches_ngspice(tmp_path, monkeypatch):
    """Cards are written from values: no name, no comment, no command of the author's is in them."""
    mark = tmp_path / "ran"
    monkeypatch.chdir(tmp_path)
    deck = tmp_path / "gauge.cir"
    deck.write_text(HOSTILE.format(mark=mark))
    engine = Recording(find())
    (found,) = review(deck, engine=Ngspiced(engine, fill=True, confirm=True)).designs
    assert [stage.designator for stage in found.design.stages] == ["XU1zz"]
    assert engine.decks
    for text in engine.decks:
        check_deck(text)
        assert not [word for word in ("zz", "shell", "touch", "hostname") if word in text.lower()]
    assert not mark.exists()
    assert {path.name for path in tmp_path.iterdir()} == {"gauge.cir"}


CLIPPED = """gauge
VIN in 0 SIN(0 1 1k)
R1 in n 1k
R2 n out {feedback}
RL out 0 10k
XU1 0 n vp vn out TL072
VP vp 0 12
VN vn 0 -12
CP vp 0 100n
CN vn 0 100n
.end
"""


def test_a_crash_costs_only_its_own_confirmation(tmp_path):
    """Every run ends by a segmentation fault; the review says so and holds what it held."""
    decks = []
    for number, feedback in enumerate(("50k", "2k")):
        decks.append(tmp_path / f"gauge_{number}.cir")
        decks[-1].write_text(CLIPPED.format(feedback=feedback))
    engine = stand_in(tmp_path, f"echo x >> {tmp_path}/starts; kill -11 $$")
    simulated = review(decks, engine=Ngspiced(engine, fill=True, confirm=True))
    plain = review(decks)
    assert [d.verdict for d in simulated.designs] == [d.verdict for d in plain.designs]
    assert [len(d.findings) for d in simulated.designs] == [len(d.findings) for d in plain.designs]
    assert len((tmp_path / "starts").read_text().split()) >= 2  # the second deck was tried too
    told = [remark.message for d in simulated.designs for remark in d.design.remarks]
    assert sum("ended by signal 11" in one for one in told) == 2
