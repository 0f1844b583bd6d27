"""A few netlists of each kind through the whole review; tests/bench/fuzzing.py tries many."""

import pytest
from hypothesis import HealthCheck, given, settings

from tests.fuzz.hold import hold
from tests.fuzz.netlists import hostile, nearly_valid, stage

FEW = settings(
    max_examples=50,
    deadline=None,
    suppress_health_check=list(HealthCheck),
    derandomize=True,
)


@pytest.fixture(scope="module")
def folder(tmp_path_factory):
    """One folder for all decks of this file."""
    return tmp_path_factory.mktemp("fuzz")


@FEW
@given(data=nearly_valid())
def test_nearly_valid(data, folder):
    """Cards in any order, damaged in places."""
    hold(data, folder)


@FEW
@given(data=stage())
def test_stages(data, folder):
    """Amplifiers with values over eleven decades."""
    assert hold(data, folder).designs[0].design.stages


@FEW
@given(data=hostile)
def test_hostile(data, folder):
    """Bytes that are no netlist."""
    hold(data, folder)
