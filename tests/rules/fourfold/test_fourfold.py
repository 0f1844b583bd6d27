"""Every rule with netlists that pass and fail, two at the border, and one without its data."""

import pytest

from railguard.reviewing import review
from railguard.rules.registry import RULES
from tests.rules.fourfold import told
from tests.rules.fourfold.cases import ALL
from tests.rules.fourfold.four import deck


def said(cards):
    """Return the rules that speak of a netlist, each with its findings, and those left open."""
    (design,) = review(deck(cards), plugins=False).designs
    speaking, queue = {}, list(design.findings)
    while queue:
        finding = queue.pop()
        speaking.setdefault(finding.rule, []).append(finding)
        queue += finding.consequences
    return speaking, {note.rule for note in design.not_checked}


def test_every_rule_has_its_four():
    """No rule without its netlists, no netlists without a rule."""
    assert set(ALL) == {rule.name for rule in RULES}


def test_no_netlist_stands_for_two():
    """The border is another netlist than the plain cases, unless it is said to be one."""
    assert all(four.inside != four.outside for four in ALL.values())
    assert all(four.passing != four.failing for four in ALL.values())


@pytest.mark.parametrize("rule", ALL)
@pytest.mark.parametrize("kind", ["passing", "inside"])
def test_within_the_limit_a_rule_is_silent(rule, kind):
    """It is judged, and says nothing."""
    speaking, missing = said(getattr(ALL[rule], kind))
    assert rule not in speaking
    assert rule not in missing


@pytest.mark.parametrize("rule", ALL)
@pytest.mark.parametrize("kind", ["failing", "outside"])
def test_beyond_the_limit_a_rule_speaks(rule, kind):
    """It says so."""
    assert rule in said(getattr(ALL[rule], kind))[0]


@pytest.mark.parametrize("rule", ALL)
def test_without_its_data_a_rule_says_what_is_missing(rule):
    """It lists what is missing; where it is silent, its `silent` says so.

    A device nobody knows is judged by common practice, minor at most.
    """
    four = ALL[rule]
    speaking, missing = said(four.unknown)
    for finding in speaking.get(rule, ()):
        assert finding.severity in ("minor", "remark")
        assert {"practice", "assumed"} & set(finding.basis)
    if four.listed is None:
        assert rule not in speaking
        assert next(r for r in RULES if r.name == rule).silent
    else:
        assert (four.listed or rule) in missing | set(speaking)


@pytest.mark.parametrize("rule", ALL)
def test_what_a_rule_says_is_what_was_read(rule):
    """Subject, sentences, numbers, basis and source stand as somebody read them in `told.txt`.

    Where they were changed on purpose: `python -m tests.rules.fourfold.told`, and read the diff.
    """
    kept = told.FILE.read_text("utf-8").split("\n\n")
    now = "\n".join(paragraph for kind in told.KINDS for paragraph in told.said(rule, kind))
    before = [paragraph for paragraph in kept if paragraph.startswith(f"{rule}, ")]
    assert now.strip() == "\n\n".join(before).strip()
