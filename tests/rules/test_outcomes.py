"""What every finding and every open point of every shipped netlist must hold, whatever its rule."""

import math
from pathlib import Path

import pytest

from railguard.reviewing import review
from railguard.rules.registry import RULES
from railguard.words import SEVERITIES

FIXTURES = Path(__file__).parents[2] / "fixtures"
DECKS = sorted(path for path in FIXTURES.rglob("*.cir") if path.parent.name != "sound")
FAMILIES = {rule.name: rule.family for rule in RULES}
UNITS = {"", "V", "A", "W", "Hz", "Ω", "F", "s", "V/s", "K", "°C", "°"}


@pytest.fixture(scope="module")
def reviews():
    """Review every netlist once."""
    return {path: review(path, plugins=False).designs[0] for path in DECKS}


def flat(findings):
    """Yield findings and what follows from them."""
    for finding in findings:
        yield finding
        yield from flat(finding.consequences)


@pytest.mark.parametrize("path", DECKS, ids=lambda path: path.stem)
def test_a_finding_says_what_where_and_why(reviews, path):
    """Rule, place, subject, numbers that agree with each other, words and source."""
    design = reviews[path]
    circuit = design.design.circuit
    written = {element.designator for element in circuit.elements}
    written |= {stage.designator for stage in design.design.stages}
    written |= {package.designator for package in design.design.packages}
    nets = {net for element in circuit.elements for net in element.nets}
    found = list(flat(design.findings))
    for finding in found:
        assert FAMILIES[finding.rule] == finding.family
        assert finding.severity in SEVERITIES
        assert finding.source.strip()
        assert finding.unit in UNITS, finding.unit
        assert finding.location is not None
        assert finding.location.line >= 1
        assert set(finding.designators) <= written, finding
        assert set(finding.nets) <= nets, finding
        for text in (finding.message, finding.remedy):
            assert "None" not in text
            assert "nan" not in text.split()
            assert not text or text[-1] in ".):", text
        if finding.margin is not None:
            assert math.isfinite(finding.margin)
        if None not in (finding.demand, finding.limit, finding.margin):
            apart = abs(finding.demand - finding.limit)
            assert abs(finding.margin) == pytest.approx(apart, rel=1e-6, abs=1e-12), finding


@pytest.mark.parametrize("path", DECKS, ids=lambda path: path.stem)
def test_an_open_point_says_what_is_missing(reviews, path):
    """A rule there is, a subject there is, a reason, and what to state."""
    design = reviews[path]
    stages = {stage.designator for stage in design.design.stages}
    rails = {rail.net for rail in design.design.rails}
    packages = {package.designator for package in design.design.packages}
    written = {element.designator for element in design.design.circuit.elements}
    for note in design.not_checked:
        assert note.rule in FAMILIES, note
        assert note.subject in stages | rails | packages | written, note
        assert note.why.strip()
        assert note.add.strip()


def test_there_was_something_to_hold(reviews):
    """Findings of many rules, and open points, were among them."""
    rules = {finding.rule for design in reviews.values() for finding in flat(design.findings)}
    assert len(rules) > 12
    assert any(design.not_checked for design in reviews.values())
