"""Channels that nothing uses."""

import pytest

from railguard.analysis.bound import Range
from railguard.analysis.loop import Loop
from railguard.rules.bias.unused import UNUSED
from tests.rules.stages import findings, inputs, outcomes, pin, single, stage


def idle(dc="negative", **fields):
    """Make an unused channel."""
    usual = {
        "plus": pin("mid", level=2.5),
        "minus": pin("o", level=2.5),
        "available": Range(0.0, 3.5),
    }
    return stage(
        use="unused", loop=Loop(dc=dc), supply=single(), inputs=inputs(**{**usual, **fields})
    )


def test_a_follower_at_mid_supply_is_quiet():
    """That is how an unused channel should be wired; at the end of its range as well."""
    assert outcomes(UNUSED, idle()) == []
    assert outcomes(UNUSED, idle(plus=pin("mid", level=3.5))) == []


def test_a_used_channel_is_not_judged():
    """The rule is about unused ones only."""
    assert outcomes(UNUSED, stage(inputs=inputs(plus=pin("x", state="floating")))) == []


@pytest.mark.parametrize(
    ("dc", "fields", "severity"),
    [
        ("negative", {"plus": pin("nc", state="floating")}, "major"),
        ("open", {"plus": pin("0"), "minus": pin("0")}, "minor"),
        ("open", {"plus": pin("+5V"), "minus": pin("0")}, "remark"),
        ("positive", {}, "minor"),
        ("negative", {"plus": pin("+5V", level=5.0)}, "minor"),
    ],
)
def test_a_badly_tied_channel(dc, fields, severity):
    """Open is major, at a rail minor; where makers disagree it is a remark."""
    (found,) = findings(UNUSED, idle(dc, **fields))
    assert found.severity == severity
    assert "2.5 V, two resistors" in found.remedy


def test_an_unknown_level_is_not_judged():
    """A follower at a level nobody knows draws nothing."""
    assert outcomes(UNUSED, idle(plus=pin("ref", level=None))) == []
