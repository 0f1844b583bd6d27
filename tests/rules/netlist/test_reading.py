"""What the reader met becomes findings."""

import pytest

from railguard.location import Location
from railguard.notices import Problem
from railguard.rules import registry
from railguard.rules.netlist.reading import RULES
from tests.rules.stages import design, findings, stage

SUFFIX = Problem(
    rule="netlist-value-suffix",
    message="R4 is written 1M.",
    remedy="Write 1MEG.",
    location=Location("station.cir", 7),
    designators=("R4",),
    spice_value=1e-3,
    likely_value=1e6,
    unit="Ω",
)


def judged(problem, kind="board"):
    """Return the findings of a problem's own rule."""
    whole = design(stage(), problems=(problem,), kind=kind)
    return findings(registry.rule(problem.rule), whole, whole)


@pytest.mark.parametrize(("kind", "severity"), [("bench", "major"), ("board", "minor")])
def test_a_value_trap_shows_both_readings(kind, severity):
    """Major on a bench, minor on a board, with what SPICE reads and what was meant."""
    (found,) = judged(SUFFIX, kind)
    assert found.severity == severity
    assert found.message == (
        "R4 is written 1M. SPICE reads 1 mΩ; 1 MΩ was most likely meant, and the review went on "
        "with that."
    )
    assert (found.demand, found.limit, found.unit) == (1e6, 1e-3, "Ω")
    assert found.location == Location("station.cir", 7)
    assert found.remedy == "Write 1MEG."


def test_readings_the_message_shows_are_not_told_twice():
    """Where the reader wrote both values nothing is added."""
    told = Problem(
        rule="netlist-value-suffix", message="1M: SPICE takes 1 mΩ, not 1 MΩ.",
        spice_value=1e-3, likely_value=1e6, unit="Ω",
    )  # fmt: skip
    assert judged(told)[0].message == told.message


@pytest.mark.parametrize(
    ("likely", "written"),
    [
        (1e6, "1MEG"),
        (4020.0, "4.02k"),
        (1e-6, "1u"),
        (4.7e-12, "4.7p"),
        (0.1, "100m"),
        (10.0, "10"),
    ],
)
def test_a_remedy_spells_the_likely_value(likely, written):
    """Where the reader names no remedy the value is written as SPICE reads it."""
    bare = Problem(rule="netlist-value-suffix", message="x", spice_value=1.0, likely_value=likely)
    assert judged(bare)[0].remedy == f"Write {written}."


def test_the_readers_own_severity_counts():
    """Where the reader knows better than the rule its word stands."""
    alias = Problem(rule="netlist-ground", message="GND is taken as 0.", severity="remark")
    none = Problem(rule="netlist-ground", message="There is no ground.")
    assert [f.severity for f in judged(alias)] == ["remark"]
    assert [f.severity for f in judged(none)] == ["major"]


def test_a_problem_is_told_by_its_own_rule_only():
    """Every other reading rule stays silent."""
    whole = design(stage(), problems=(SUFFIX,))
    speaking = [r.name for r in RULES if findings(r, whole, whole)]
    assert speaking == ["netlist-value-suffix"]


def test_without_problems_nothing_is_said():
    """A netlist read without trouble draws nothing."""
    whole = design(stage())
    assert [f for r in RULES for f in findings(r, whole, whole)] == []


@pytest.mark.parametrize(
    "name",
    [
        "unreadable", "encoding", "title", "continuation", "end", "card", "node-count",
        "value-suffix", "value-second-number", "value-missing", "value-form", "value-sign",
        "duplicate", "model", "include", "parameter", "expression", "source", "ground", "bound",
        "other-dialect",
    ],
)  # fmt: skip
def test_every_reading_problem_has_its_rule(name):
    """What the reader may file is never lost for want of a rule."""
    problem = Problem(rule=f"netlist-{name}", message="Something.")
    assert len(judged(problem)) == 1


def test_a_value_of_which_only_one_reading_is_known():
    """A problem without both values shows its own sentence alone."""
    lone = Problem(rule="netlist-value-missing", message="R9 has no value.", designators=("R9",))
    (found,) = judged(lone)
    assert found.message == "R9 has no value."
    assert found.demand is None
