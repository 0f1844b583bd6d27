"""The registry runs every rule and counts what it judged."""

from collections.abc import Iterator

import pytest

from railguard.errors import PluginError, UsageError
from railguard.notices import NotChecked
from railguard.rules import registry
from railguard.rules.protocol import Rule
from railguard.settings.model import Settings
from tests.rules.stages import design, rail, stage, unknown_device

FIRST = {
    "supply-missing",
    "supply-reversed",
    "supply-range",
    "decoupling-absent",
    "headroom-output",
    "headroom-input",
    "drive-current",
    "bias-no-dc-path",
    "feedback-reversed",
    "feedback-open",
    "feedback-low",
    "feedback-high",
    "netlist-value-suffix",
}


def test_the_first_rules_are_there():
    """The rules every review rests on are registered."""
    assert {r.name for r in registry.RULES} >= FIRST


def test_every_rule_says_what_it_judges_and_why():
    """Each rule has its sentences, a source, and limits with a source, ending as sentences do."""
    for one in registry.RULES:
        assert one.name.startswith(f"{one.family}-")
        assert one.judges.endswith(".")
        assert one.reason.endswith(".")
        assert one.source
        for limit in one.limits:
            assert limit.meaning
            assert limit.source


def test_names_are_unique():
    """No two rules share a name."""
    names = [r.name for r in registry.RULES]
    assert len(set(names)) == len(names)


def test_a_sound_design_is_quiet():
    """A stage inside all its limits draws nothing above a remark."""
    result = registry.judge(design(stage()))
    assert [f.message for f in result.findings if f.severity != "remark"] == []


def test_every_pair_is_counted_once():
    """Judged and open pairs together are the rules times their subjects."""
    whole = design(stage("XU1"), unknown_device("XU2"))
    result = registry.judge(whole)
    sizes = {"stage": 2, "rail": 2, "package": 2, "design": 1}
    assert result.judged + result.open == sum(sizes[r.looks_at] for r in registry.RULES)
    assert result.open >= 4


def test_a_rule_switched_off_does_not_run():
    """A rule named in rules_off yields nothing and is not counted among those that ran."""
    whole = design(stage(), rails=(rail(decoupling=()),))
    assert "decoupling-absent" in {f.rule for f in registry.judge(whole).findings}
    off = design(
        stage(),
        rails=(rail(decoupling=()),),
        settings=Settings(rules_off=("decoupling-absent",)),
    )
    result = registry.judge(off)
    assert "decoupling-absent" not in {f.rule for f in result.findings}
    assert "decoupling-absent" not in result.rules


def test_a_stated_severity_replaces_the_worked_out_one():
    """The user's severity for a rule is what its findings carry."""
    settings = Settings(severities={"decoupling-absent": "remark"})
    result = registry.judge(design(stage(), rails=(rail(decoupling=()),), settings=settings))
    assert [f.severity for f in result.findings if f.rule == "decoupling-absent"] == ["remark"]


def test_a_stated_limit_replaces_the_default():
    """The user's limit reaches the rule."""
    settings = Settings(limits={"headroom-output": {"reserve-share": 0.5}})
    result = registry.judge(design(stage(), settings=settings))
    assert "headroom-output" in {f.rule for f in result.findings}


def test_an_unknown_rule_name_gets_the_nearest():
    """Asking for a rule that is not there names the nearest one."""
    with pytest.raises(UsageError, match="headroom-output"):
        registry.rule("headroom-outputs")


def test_a_third_partys_rule_that_stops_leaves_its_subject_open():
    """An error in a third party's rule is an open point, and the review goes on."""

    def stops(subject, limits, design) -> Iterator[NotChecked]:
        raise ZeroDivisionError("no turns")
        yield

    extra = Rule(
        name="supply-own", family="supply", looks_at="stage", judges="x.", reason="x.",
        source="x", judge=stops,
    )  # fmt: skip
    result = registry.judge(design(stage()), (extra,))
    assert [p.why for p in result.not_checked if p.rule == "supply-own"] == [
        "the rule stopped with ZeroDivisionError: no turns"
    ]


def test_two_rules_of_one_name_are_refused():
    """A third party's rule must not stand in for a rule of the house."""
    with pytest.raises(PluginError, match="headroom-output"):
        registry.judge(design(stage()), (registry.rule("headroom-output"),))
