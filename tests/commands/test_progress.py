"""The bar of long work: on a terminal's error stream only, and only where the work is long."""

import io
import sys

import pytest

from railguard.commands import progress as module
from railguard.commands.progress import progress


class Screen(io.StringIO):
    """A stream that claims to be a terminal."""

    def isatty(self):
        """Claim it."""
        return True


def printed(monkeypatch, stream, count):
    """Return what reaches the error stream while so many things are done."""
    monkeypatch.setattr(sys, "stderr", stream)
    with progress(count, "netlists") as step:
        for _ in range(count):
            step()
    return stream.getvalue()


@pytest.mark.parametrize(("patience", "count"), [(0.7, 200), (-1.0, 1)], ids=["short", "one"])
def test_short_work_shows_nothing(monkeypatch, patience, count):
    """A bar that flashes by tells nobody anything."""
    monkeypatch.setattr(module, "PATIENCE", patience)
    assert printed(monkeypatch, Screen(), count) == ""


def test_long_work_shows_a_bar_on_a_terminal(monkeypatch):
    """It names what is done and how much of it."""
    monkeypatch.setattr(module, "PATIENCE", -1.0)
    monkeypatch.setenv("TERM", "xterm")
    monkeypatch.delenv("NO_COLOR", raising=False)
    shown = printed(monkeypatch, Screen(), 200)
    assert "netlists" in shown
    assert "/200" in shown


def test_a_pipe_gets_nothing(monkeypatch):
    """A log is no place for a bar."""
    monkeypatch.setattr(module, "PATIENCE", -1.0)
    assert printed(monkeypatch, io.StringIO(), 200) == ""
