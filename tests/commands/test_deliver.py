"""Files written whole or not at all."""

import os
import stat
import sys
from pathlib import Path

import pytest

from railguard.commands.deliver import check_places, write_whole
from railguard.errors import UsageError

POSIX = pytest.mark.skipif(os.name == "nt", reason="links, modes and pipes are those of POSIX")


def test_a_new_file_is_written(tmp_path):
    """Its bytes and nothing else beside it."""
    write_whole(tmp_path / "review.json", b"new")
    assert [(p.name, p.read_bytes()) for p in tmp_path.iterdir()] == [("review.json", b"new")]


def test_an_old_file_is_replaced(tmp_path):
    """Whoever reads it sees the old one or the new one."""
    (tmp_path / "review.json").write_bytes(b"old and longer")
    write_whole(tmp_path / "review.json", b"new")
    assert (tmp_path / "review.json").read_bytes() == b"new"


@POSIX
def test_an_old_file_keeps_its_mode(tmp_path):
    """What was its owner's alone stays so."""
    place = tmp_path / "review.json"
    place.write_bytes(b"old")
    place.chmod(0o600)
    write_whole(place, b"new")
    assert stat.S_IMODE(place.stat().st_mode) == 0o600


@POSIX
def test_a_link_stays_and_leads_to_the_new_report(tmp_path):
    """The file it leads to is replaced, not the link."""
    (tmp_path / "real.json").write_bytes(b"old")
    (tmp_path / "link.json").symlink_to("real.json")
    write_whole(tmp_path / "link.json", b"new")
    assert (tmp_path / "link.json").is_symlink()
    assert (tmp_path / "real.json").read_bytes() == b"new"


@POSIX
def test_a_device_is_written_to_and_not_replaced():
    """`json=/dev/null` must leave the machine its null device."""
    before = Path("/dev/null").stat()
    write_whole(Path("/dev/null"), b"new")
    after = Path("/dev/null").stat()
    assert stat.S_ISCHR(after.st_mode)
    assert (before.st_ino, before.st_mode) == (after.st_ino, after.st_mode)


@POSIX
def test_a_ring_of_links_is_told(tmp_path):
    """It leads to no file that could be written."""
    (tmp_path / "a.json").symlink_to("b.json")
    (tmp_path / "b.json").symlink_to("a.json")
    check_places([tmp_path / "a.json"], [])
    with pytest.raises(UsageError, match="cannot be written"):
        write_whole(tmp_path / "a.json", b"new")


@pytest.mark.parametrize("failing", ["write_bytes", "replace", "chmod"])
def test_a_failure_leaves_the_old_file_and_no_half(tmp_path, monkeypatch, failing):
    """Whatever step fails: the old report is whole, nothing lies beside it."""
    place = tmp_path / "review.json"
    place.write_bytes(b"old")

    def fail(*given, **named):
        raise OSError(28, "No space left on device")

    if failing == "write_bytes":
        monkeypatch.setattr(os, "fdopen", fail)
    else:
        monkeypatch.setattr(Path, failing, fail)
    with pytest.raises(UsageError, match="cannot be written: No space left on device"):
        write_whole(place, b"new")
    monkeypatch.undo()
    assert [(p.name, p.read_bytes()) for p in tmp_path.iterdir()] == [("review.json", b"old")]


def test_an_interrupt_leaves_no_half_either(tmp_path, monkeypatch):
    """Control-C while the file is moved takes the half with it."""

    def stop(*given):
        raise KeyboardInterrupt

    monkeypatch.setattr(Path, "replace", stop)
    with pytest.raises(KeyboardInterrupt):
        write_whole(tmp_path / "review.json", b"new")
    assert list(tmp_path.iterdir()) == []


def test_places_are_checked_before_the_work(tmp_path):
    """A folder, a folder that is not there, and a file that is to be read are refused."""
    deck = tmp_path / "gauge.cir"
    deck.touch()
    for place, why in (
        (tmp_path, "it is a folder"),
        (tmp_path / "none" / "a.json", "its folder does not exist"),
        (tmp_path / "." / "gauge.cir", "would replace"),
    ):
        with pytest.raises(UsageError, match=why):
            check_places([place], [deck])
    check_places([tmp_path / "review.json"], [deck])


@pytest.mark.skipif(sys.platform != "linux" or os.geteuid() == 0, reason="root may write anywhere")
def test_a_folder_that_may_not_be_written_to_is_told(tmp_path):
    """One sentence, and the folder stays empty."""
    tmp_path.chmod(0o500)
    with pytest.raises(UsageError, match="Permission denied"):
        write_whole(tmp_path / "review.json", b"new")
    tmp_path.chmod(0o700)
    assert list(tmp_path.iterdir()) == []
