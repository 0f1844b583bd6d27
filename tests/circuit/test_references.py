"""Cards that name what is not there: a source that steers, an inductor, a parameter."""

import pytest

from railguard.circuit.flatten import flatten
from railguard.deck.files import deck_from_text

SHEET = """river gauge, loop supply
V1 in 0 5
Vs s 0 0
L1 in a 1m
.subckt stage a b gain=2
R1 a b {gain*1k}
.model d1 D is={leak}
.ends
.model relay csw
"""


def told(card):
    """Return what is said of one card more."""
    circuit = flatten(deck_from_text(f"{SHEET}{card}\n.end\n"))
    return [p.message for p in circuit.problems if "netlist-value" not in p.rule]


@pytest.mark.parametrize(
    ("card", "what"),
    [
        ("F1 a 0 Vgone 2", "F1 names the voltage source Vgone"),
        ("H1 a 0 Vgone 2", "H1 names the voltage source Vgone"),
        ("W1 a 0 Vgone relay", "W1 names the voltage source Vgone"),
        ("K1 L1 L2 0.9", "K1 names the inductor L2"),
        ("X1 in s stage gian=4", "X1 gives the parameter gian, which the subcircuit stage"),
    ],
)
def test_what_is_named_and_is_not_there(card, what):
    """Each is a slip of the pen that a simulator stops at, or passes over in silence."""
    assert any(what in message for message in told(card))


@pytest.mark.parametrize(
    "card",
    ["F1 a 0 Vs 2", "W1 a 0 Vs relay", "X1 in s stage gain=4", "X1 in s stage leak=1p m=2"],
)
def test_what_is_named_and_is_there(card):
    """A parameter of the body counts, whether the header has it or not."""
    assert told(card) == []


def test_a_parameter_is_told_once():
    """A hundred calls with the same slip are one slip."""
    calls = "\n".join(f"X{k} in s stage gian={k}" for k in range(100))
    assert sum("gian" in message for message in told(calls)) == 1


def test_a_switch_is_no_jumper():
    """W is a jumper on a board; with a source or a switch's model it is what SPICE says."""
    circuit = flatten(deck_from_text(f"{SHEET}W1 a 0 Vs relay\nW2 in a\n.end\n"))
    kinds = {e.designator: (e.kind, e.nets, e.model) for e in circuit.elements}
    assert kinds["W1"] == ("W", ("a", "0"), "relay")
    assert kinds["W2"][0] == "link"
