"""Designs every report format is tried on."""

import pytest

from railguard.report.formats import FORMATS, render
from railguard.reviewing import review
from tests.report import designs


@pytest.fixture(scope="session")
def reviewed(tmp_path_factory):
    """Return a function from a design's name to (its review, the run's root)."""
    done = {}

    def of(name):
        if name not in done:
            root = tmp_path_factory.mktemp(name)
            done[name] = (review(designs.paths(name, root), as_of=designs.DAY), root)
        return done[name]

    return of


@pytest.fixture(scope="session")
def report(reviewed):
    """Return a function from format and design to the report's bytes."""
    done = {}

    def of(form, name):
        assert form in FORMATS
        if (form, name) not in done:
            found, root = reviewed(name)
            done[form, name] = render(form, found, root=root)
        return done[form, name]

    return of
