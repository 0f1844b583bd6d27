"""What a stage lacks and which rules it leaves open, over all rules of stages at once."""

from typing import get_args

import pytest

from railguard.analysis.bound import Range
from railguard.analysis.loop import Loop
from railguard.analysis.stage import Current, Output, Part, Unknown
from railguard.notices import NotChecked
from railguard.rules.registry import RULES
from railguard.words import SEVERITIES
from tests.rules.stages import amps, bound, inputs, outcomes, pin, single, stage, unknown_device

OF_STAGES = tuple(rule for rule in RULES if rule.looks_at == "stage")

LEFT_OPEN: dict[Part, set[str]] = {
    "device": {
        "headroom-output", "headroom-input", "drive-current", "feedback-low", "feedback-high",
        "dynamics-loop-gain", "dynamics-slew", "stability-noise-gain", "stability-phase-margin",
    },
    "supply": {"headroom-output", "headroom-input", "drive-current"},
    "output": {"headroom-output", "dynamics-slew"},
    "current": {"drive-current"},
    "input": {"headroom-input"},
    "bias": {"bias-no-dc-path"},
    "loop": {
        "feedback-reversed", "feedback-open", "feedback-low", "feedback-high",
        "dynamics-loop-gain", "stability-noise-gain", "stability-phase-margin",
    },
    "dissipation": set(),  # of a package: drive-power
}  # fmt: skip
"""Which rules need which part of the usual stage; others speak of loads, filters and clamps."""

STAGES = {
    "sound": stage(),
    "of a device nobody knows": unknown_device(),
    "without a type": unknown_device(generic=True),
    "without a loop": stage(loop=Loop(dc=None)),
    "with an open loop": stage(loop=Loop(dc="open")),
    "with a positive loop": stage(loop=Loop(dc="positive", beta_plus=0.5)),
    "without a supply": stage(supply=single(0.0)),
    "with a floating input": stage(inputs=inputs(plus=pin("in", state="floating"))),
    "with an open input": stage(inputs=inputs(plus=pin("in", state="open"))),
    "without a signal": stage(
        output=Output(net="out", level=None, high=bound(True), low=bound(False)),
        current=Current(source=amps(None), sink=amps(None)),
        inputs=inputs(demand=Range(None, None), high=bound(True), low=bound(False)),
    ),
    "that is a comparator": stage(use="comparator", loop=Loop(dc="open")),
    "that is not used": stage(use="unused"),
    **{f"without {part}": stage(unknown={part: Unknown("why", "add")}) for part in get_args(Part)},
}
"""One stage for each way in which something may be missing."""


@pytest.mark.parametrize("part", get_args(Part))
def test_a_part_nobody_worked_out_leaves_its_rules_open(part):
    """They repeat why, and what to add; the others are judged."""
    reason = Unknown("it hangs on a diode", "run with --engine ngspice")
    one = stage(unknown={part: reason})
    said = {
        point.rule
        for rule in OF_STAGES
        for point in outcomes(rule, one)
        if isinstance(point, NotChecked) and (point.why, point.add) == (reason.why, reason.add)
    }
    assert said == LEFT_OPEN[part]


@pytest.mark.parametrize("rule", OF_STAGES, ids=lambda rule: rule.name)
@pytest.mark.parametrize("lacking", STAGES)
def test_whatever_is_missing_a_rule_speaks_of_the_stage_in_its_own_name(rule, lacking):
    """Findings and open points name rule and stage, and say something in every field of words."""
    for outcome in outcomes(rule, STAGES[lacking]):
        assert outcome.rule == rule.name
        if isinstance(outcome, NotChecked):
            assert outcome.subject == "XU1"
            assert all(text.strip() for text in (outcome.why, outcome.add))
        else:
            assert outcome.family == rule.family
            assert outcome.severity in SEVERITIES
            assert "XU1" in outcome.designators
            assert all(text.strip() for text in (outcome.message, outcome.source))
            assert set(outcome.nets) <= {"in", "n", "out"}
            assert outcome.nets
