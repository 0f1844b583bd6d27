"""Definitions to a flat circuit."""

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from railguard.circuit.flatten import flatten
from railguard.circuit.sources import Piecewise, Pulse, Sine
from railguard.deck.files import Bounds, deck_from_text


def circuit(cards, bounds=None):
    """Flatten cards behind a title."""
    return flatten(deck_from_text(f"title\n{cards}\n", bounds=bounds))


def element(cards, name):
    """Return one element."""
    return next(e for e in circuit(cards).elements if e.designator == name)


def rules(cards, bounds=None):
    """Return the rules of the problems."""
    return [p.rule for p in circuit(cards, bounds).problems]


def test_instance_is_expanded_with_hierarchical_names():
    """Nets and designators inside carry the instance's name; ports are the caller's nets."""
    cards = "X1 a 0 s\n.subckt s p q\nR1 p m 1k\nR2 m q {2*r}\n.param r=1k\n.ends\nV1 a 0 5"
    found = {e.designator: e for e in circuit(cards).elements}
    assert found["X1.R1"].nets == ("a", "X1.m")
    assert found["X1.R2"].nets == ("X1.m", "0")
    assert found["X1.R2"].value == pytest.approx(2000.0)


def test_nested_definitions_are_local():
    """An inner subcircuit is seen inside only."""
    cards = "V1 a 0 5\nX1 a 0 o\n.subckt o p q\n.subckt i p q\nR1 p q 1k\n.ends\nX2 p q i\n.ends"
    assert element(cards, "X1.X2.R1").nets == ("a", "0")


def test_instance_parameter_beats_body_and_header():
    """Instance, then body, then header's default."""
    text = "V1 a 0 5\nX1 a 0 s r=3k\n.subckt s p q r=1k\n.param r=2k\nR1 p q {r}\n.ends"
    assert element(text, "X1.R1").value == pytest.approx(3000.0)


def test_parameters_need_no_order():
    """Use before definition is legal."""
    assert element("V1 a 0 5\n.param b={a*2}\n.param a=1k\nR1 a 0 {b}", "R1").value == 2000.0


def test_parameter_cycle_is_told():
    """A parameter that rests on itself has no value, whether or not a card uses it."""
    assert set(rules("V1 a 0 5\n.param b={c} c={b}\nR1 a 0 {b}")) == {"netlist-parameter"}
    (problem,) = circuit("V1 a 0 5\nR1 a 0 1k\n.param b={c} c={b}").problems
    assert problem.rule == "netlist-parameter"
    assert "b -> c -> b" in problem.message


def test_multiplier_counts():
    """M=2 halves a resistor and doubles a capacitor."""
    cards = "V1 a 0 5\nR1 a 0 1k m=2\nC1 a 0 1u m=2\nX1 a 0 s m=4\n.subckt s p q\nR2 p q 1k\n.ends"
    assert element(cards, "R1").value == pytest.approx(500.0)
    assert element(cards, "C1").value == pytest.approx(2e-6)
    assert element(cards, "X1.R2").value == pytest.approx(250.0)


def test_nets_of_one_name_are_one_whatever_the_case():
    """The first spelling counts in reports; ground has aliases."""
    found = circuit("V1 VBat 0 5\nR1 vbat GND 1k\nR2 VBAT gnd 1k").elements
    assert {e.nets for e in found} == {("VBat", "0")}


def test_unconnected_pins_are_nets_of_their_own():
    """Two question marks are two nets."""
    nets = element("V1 a 0 5\nXU1 a ? ? 0 b ZZ9", "XU1").nets
    assert len(set(nets)) == 5


def test_global_net_is_one_everywhere():
    """.global makes a name the same inside."""
    cards = ".global vdd\nV1 vdd 0 5\nX1 a s\nR0 a 0 1k\n.subckt s p\nR1 vdd p 1k\n.ends"
    assert element(cards, "X1.R1").nets == ("vdd", "a")


@pytest.mark.parametrize(
    ("card", "wave"),
    [
        ("V2 b 0 SINE(2,1,1k)", Sine(2.0, 1.0, 1000.0)),
        ("V2 b 0 SIN 0 1 1k", Sine(0.0, 1.0, 1000.0)),
        ("V2 b 0 PULSE(0 5 1u 1n 1n 1u 2u)", Pulse(0.0, 5.0, 1e-6, 1e-9, 1e-9, 1e-6, 2e-6)),
        ("V2 b 0 PWL((0,1) (1u,2))", Piecewise(((0.0, 1.0), (1e-6, 2.0)))),
    ],
)
def test_time_functions(card, wave):
    """With and without parentheses, with commas."""
    assert element(f"V1 a 0 5\nR1 b 0 1k\n{card}", "V2").source.wave == wave


def test_source_with_everything():
    """DC, AC and a wave in any order."""
    source = element("V1 a 0 5\nR1 b 0 1k\nV2 b 0 AC 1 DC 5 SIN(0 1 1k)", "V2").source
    assert (source.dc, source.ac, source.wave) == (5.0, (1.0, 0.0), Sine(0.0, 1.0, 1000.0))


def test_if_blocks_follow_their_parameter():
    """The first true branch is taken."""
    branches = ".if (p==1)\nR1 a 0 1k\n.elseif (p==2)\nR1 a 0 2k\n.else\nR1 a 0 3k\n.endif"
    cards = f"V1 a 0 5\n.param p=2\n{branches}"
    assert element(cards, "R1").value == 2000.0


@pytest.mark.parametrize(
    ("cards", "rule"),
    [
        ("R1 a 0 1k\nr1 a 0 2k", "netlist-duplicate"),
        ("R1 a 1k", "netlist-node-count"),
        ("R1 a 0", "netlist-value-missing"),
        ("%1 a 0 1k", "netlist-card"),
        ("R1 a 0 10k 0603", "netlist-value-second-number"),
        ("C1 a 0 10u 16V", "netlist-value-second-number"),
        ("R1 a 0 4,7k", "netlist-value-form"),
        ("R1 a 0 1.2.3", "netlist-value-form"),
        ("R1 a 0 1M", "netlist-value-suffix"),
        ("X1 a s\n.subckt s p q\nR1 p q 1\n.ends", "netlist-node-count"),
        ("X1 a 0 s\n.subckt s p q\nX2 p q s\n.ends", "netlist-card"),
        ("X1 a 0 s\n.subckt s p q\nR1 p q 1k", "netlist-end"),
        ("V2 b 0 PWL(0 1 1u)", "netlist-source"),
        ("M1 d g s mm\n.model mm nmos", "netlist-node-count"),
    ],
)
def test_bad_card_is_told_by_its_rule(cards, rule):
    """And costs only itself."""
    found = circuit(f"V1 a 0 5\n{cards}")
    assert rule in [p.rule for p in found.problems]
    assert all(p.location is not None for p in found.problems)
    assert found.elements[0].designator == "V1"


def test_node_count_message_speaks_the_trade():
    """What the card should have, and what it has."""
    (problem,) = circuit("V1 a 0 5\nR7 a 1k").problems
    assert "resistor R7 has two nodes and a value; found one node" in problem.message


def test_expansion_is_bounded():
    """A bomb of nested instances stops at the bound."""
    levels = "\n".join(
        f".subckt s{k} p q\n" + "\n".join(f"X{j} p q s{k + 1}" for j in range(10)) + "\n.ends"
        for k in range(8)
    )
    cards = f"V1 a 0 5\nX0 a 0 s0\n{levels}\n.subckt s8 p q\nR1 p q 1k\n.ends"
    found = circuit(cards, Bounds(elements=2000))
    assert len(found.elements) <= 2100
    assert "netlist-bound" in [p.rule for p in found.problems]


@settings(max_examples=150, deadline=None)
@given(st.lists(st.text(alphabet="RCVXEQ10 a.{}()=',+*;$_%k\t", max_size=30), max_size=8))
def test_no_text_crashes_the_reader(lines):
    """Whatever stands in a netlist becomes elements or problems."""
    found = circuit("\n".join(lines))
    assert found.elements or found.problems or found.readable


def test_any_number_of_bad_cards_costs_only_those():
    """Good cards between bad ones are all read."""
    good = [f"R{k} n{k} 0 1k" for k in range(20)]
    bad = [f"%{k} bad" for k in range(20)]
    cards = "V1 n0 0 5\n" + "\n".join(line for pair in zip(good, bad, strict=True) for line in pair)
    names = [e.designator for e in circuit(cards).elements if e.kind == "R"]
    assert names == [f"R{k}" for k in range(20)]
