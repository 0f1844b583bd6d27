"""An audit of a folder, as the command runs it."""

import contextlib
import json
import os
import signal
import sqlite3
from pathlib import Path

import pytest
from click.testing import CliRunner

from railguard.commands.audit import audit


class Audited:
    """What an audit left."""

    def __init__(self, base):
        self.base = base

    def export(self, *more):
        """Return the JSON report."""
        result = CliRunner().invoke(
            audit, ["report", str(self.base), "--as", "json", *map(str, more)]
        )
        assert result.exception is None, result.output
        return json.loads(result.stdout)

    def text(self, *more):
        """Return a report as text."""
        result = CliRunner().invoke(audit, ["report", str(self.base), *map(str, more)])
        assert result.exception is None, result.output
        return result.stdout

    def query(self, text):
        """Return the rows of a query."""
        base = sqlite3.connect(self.base)
        try:
            return base.execute(text).fetchall()
        finally:
            base.close()

    @property
    def states(self):
        """Return what became of each file."""
        return dict(self.query("SELECT path, state FROM file"))

    @property
    def reasons(self):
        """Return why files were not read."""
        return dict(self.query("SELECT path, why FROM file WHERE why <> ''"))


@pytest.fixture
def run_audit(tmp_path):
    """Return a function that audits roots into one file."""

    def run(*roots, base="audit.sqlite", options=()):
        place = Path(tmp_path) / base
        result = CliRunner().invoke(
            audit, [*map(str, roots), "--to", str(place), "--workers", "1", *map(str, options)]
        )
        assert result.exception is None, (result.output, result.exception)
        return Audited(place)

    return run


STARTED = []
"""Processes a test has started, each the first of a group of its own."""


@pytest.fixture(autouse=True)
def nothing_left_running():
    """End what a test leaves running, however it ended."""
    yield
    while STARTED:
        run = STARTED.pop()
        with contextlib.suppress(ProcessLookupError):
            if run.poll() is None:
                os.killpg(run.pid, signal.SIGKILL)
        run.wait()
        run.stderr.close()
