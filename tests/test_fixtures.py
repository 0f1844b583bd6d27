"""Every shipped netlist that says what it expects draws exactly that.

A header `* expect: RULE WHO` wants a finding of that rule naming that designator or net; `* expect:
nothing` wants no finding of `critical` or `major`.
"""

import re
from pathlib import Path

import pytest

from railguard.reviewing import review
from railguard.words import at_or_above
from tests.rules.test_registry import FIRST

FIXTURES = Path(__file__).resolve().parent.parent / "fixtures"
EXPECT = re.compile(r"^\* expect: +(?P<rule>\S+)(?: +(?P<who>\S+))?\s*$", re.MULTILINE)


def expectations():
    """Yield path, rule and subject for every header of every fixture."""
    for path in sorted(FIXTURES.rglob("*.cir")):
        for match in EXPECT.finditer(path.read_text(encoding="utf-8", errors="replace")):
            name = f"{path.relative_to(FIXTURES)}-{match['rule']}"
            yield pytest.param(path, match["rule"], match["who"], id=name)


ALL = list(expectations())
SOUND = [case for case in ALL if case.values[1] == "nothing"]
FAULTY = [case for case in ALL if case.values[1] != "nothing"]


def flat(findings):
    """Yield findings and their consequences."""
    for finding in findings:
        yield finding
        yield from flat(finding.consequences)


@pytest.mark.parametrize(("path", "rule", "who"), SOUND)
def test_a_sound_netlist_is_quiet(path, rule, who):
    """Nothing of `critical` or `major`, and stages were judged."""
    (design,) = review(path).designs
    assert design.judged > 0
    loud = [f for f in flat(design.findings) if at_or_above(f.severity, "major")]
    assert not loud, [f"{f.rule} {f.designators}: {f.message}" for f in loud]


@pytest.mark.parametrize(("path", "rule", "who"), FAULTY)
def test_a_fault_is_found_where_it_is(path, rule, who):
    """The rule speaks, and names the designator or the net at fault."""
    (design,) = review(path).designs
    found = [(f.rule, *f.designators, *f.nets) for f in flat(design.findings)]
    assert any(names[0] == rule and who in names[1:] for names in found), found


def test_every_rule_of_the_first_house_has_its_faulty_variant():
    """One variant of the station for each rule, and the rule is what it is named after."""
    rules = {case.values[0].stem: case.values[1] for case in FAULTY}
    assert set(rules) >= FIRST
    assert all(stem == rule for stem, rule in rules.items() if stem in FIRST)
