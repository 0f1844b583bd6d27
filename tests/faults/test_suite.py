"""A slice of the fault suite: sound circuits are quiet, faults are found and named.

tests/bench/recall.py runs the whole suite.
"""

from itertools import islice

import pytest

from railguard.rules.registry import RULES
from tests.faults import classes
from tests.faults.circuits import CIRCUITS, bases
from tests.faults.suite import cases, spellings
from tests.faults.verdict import loud, reviewed, told

LEAST_CIRCUITS = 20
EVERY = 53
"""Slices take every n-th; a prime, so that all circuits, devices and classes come by."""
SPARSE = 13
"""Of the sound circuits one in so many is taken, from five starts."""
RECALL = 0.98


def test_the_suite_is_as_wide_as_promised():
    """Twenty sound circuits or more, and every class of faults has a case."""
    assert len(CIRCUITS) >= LEAST_CIRCUITS
    assert {case.fault for case in cases()} == {made.__name__ for made in classes.ALL}


def test_expected_rules_exist():
    """A case names rules of the house only."""
    names = {rule.name for rule in RULES}
    assert {rule for case in cases() for rule in case.rules} <= names


@pytest.mark.parametrize("number", range(5))
def test_sound_circuits_are_quiet(number):
    """No circuit draws a critical or major finding, however it is written down."""
    heard = {}
    for index, base in enumerate(islice(bases(), number, None, SPARSE)):
        usable = spellings(base.amplifier, ())
        spelling = usable[index % len(usable)]
        found = loud(reviewed(spelling.text(base.cards)))
        if found:
            heard[base.name, base.amplifier.name, spelling.name] = [f.message for f in found]
    assert not heard


@pytest.fixture(scope="module")
def answers():
    """The slice of the suite with what is said of each case."""
    return [(case, told(case)) for case in cases(EVERY)]


def test_faults_are_found_and_named(answers):
    """A rule of the case names the designator or net at fault."""
    missed = [case.name for case, said in answers if not said.found]
    assert len(missed) <= (1 - RECALL) * len(answers), missed


def test_grave_faults_hold_the_design(answers):
    """What no reader would let pass is major at least."""
    soft = [case.name for case, said in answers if case.holds and said.found and not said.held]
    assert len(soft) <= (1 - RECALL) * len(answers), soft


def test_one_fault_is_one_finding(answers):
    """One card changed draws one finding that holds; what follows from it hangs under it."""
    several = {
        case.name: [f.message for f in said.causes]
        for case, said in answers
        if len(said.causes) > 1
    }
    assert not several
