"""Definitions to a flat circuit."""

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from railguard.circuit.flatten import flatten
from railguard.circuit.sources import Piecewise, Pulse, Sine
from railguard.deck.bounds import Bounds
from railguard.deck.files import deck_from_text


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


@pytest.mark.parametrize(
    ("cards", "points", "repeat", "delay"),
    [
        ("PWL(0 0 1m 1 2m 0) r=0 td=1u", ((0, 0), (1e-3, 1), (2e-3, 0)), 0.0, 1e-6),
        ("PWL(0 0 1m 1) r=-1", ((0, 0), (1e-3, 1)), None, 0.0),
        ("PWL(0 0 +1m 1 +1m 0)", ((0, 0), (1e-3, 1), (2e-3, 0)), None, 0.0),
        ("PWL REPEAT FOREVER (0 0 1m 1 2m 0) ENDREPEAT", ((0, 0), (1e-3, 1), (2e-3, 0)), 0.0, 0.0),
        (
            "PWL REPEAT FOR 2 (0 0 1m 1 2m 0) ENDREPEAT",
            ((0, 0), (1e-3, 1), (2e-3, 0), (3e-3, 1), (4e-3, 0)),
            None,
            0.0,
        ),
        (
            "PWL TIME_SCALE_FACTOR=1m VALUE_SCALE_FACTOR=2 (0 0 1 1)",
            ((0, 0), (1e-3, 2)),
            None,
            0.0,
        ),
    ],
)
def test_piecewise_forms(cards, points, repeat, delay):
    """Repeats, delays, relative times, scale factors."""
    wave = element(f"V1 a 0 5\nV2 b 0 {cards}", "V2").source.wave
    assert wave.points == tuple(pytest.approx(point) for point in points)
    assert (wave.repeat, wave.delay) == (repeat, delay)


@pytest.mark.parametrize(
    "cards",
    ['PWL file="level.txt"', "PWL(FILE=level.txt)", 'PWL FILE "level.txt"', "wavefile=x.wav"],
)
def test_points_in_a_file_are_refused(cards):
    """Nothing but netlists is read; the source is known to state something that is not known."""
    found = circuit(f"V1 a 0 5\nV2 b 0 {cards}")
    assert [p.rule for p in found.problems] == ["netlist-source"]
    assert "in a file, which is not read" in found.problems[0].message
    assert not found.elements[1].source.stated


@pytest.mark.parametrize(
    ("card", "gain", "nets"),
    [
        ("E2 b 0 a 0 10", 10.0, ("a", "0")),
        ("E2 b 0 (a,0) 10", 10.0, ("a", "0")),
        ("E2 b 0 a 0 {2*k}", 6.0, ("a", "0")),
        ("E2 b 0 POLY(1) a 0 0 4", 4.0, ("a", "0")),
        ("E2 b 0 POLY(1) (a,0) 4", 4.0, ("a", "0")),
        ("E2 b 0 POLY(1) a 0 1 4", None, ("a", "0")),
        ("E2 b 0 VALUE={V(a)*2}", None, ("a",)),
        ("E2 b 0 VALUE {V(a,c)}", None, ("a", "c")),
        ("E2 b 0 vol='V(a)'", None, ("a",)),
        ("E2 b 0 TABLE {V(a)} = (0,0) (1,5)", None, ("a",)),
        ("E2 b 0 LAPLACE {V(a)} = {1/(1+s)}", None, ("a",)),
        ("E2 b 0 a 0 Laplace=1/(1+s)", None, ("a", "0")),
        ("E2 b 0 FREQ {V(a)} = (0,0,0) (1k,-20,-90)", None, ("a",)),
        ("G2 b 0 a 0 1m m=2", 2e-3, ("a", "0")),
    ],
)
def test_controlled_sources(card, gain, nets):
    """Every form keeps the nets that steer it; a plain factor is a gain."""
    found = circuit(f"V1 a 0 5\n.param k=3\n{card}\nR1 b 0 1k\nR2 c 0 1k")
    made = next(e for e in found.elements if e.designator == card[:2])
    assert made.control.gain == (pytest.approx(gain) if gain is not None else None)
    assert made.control.nets == nets
    assert found.problems == ()


@pytest.mark.parametrize(
    ("card", "gain"), [("F2 b 0 V1 2", 2.0), ("F2 b 0 POLY(1) V1 0 3", 3.0), ("H2 b 0 V1 1k", 1e3)]
)
def test_current_controlled_sources(card, gain):
    """The source whose current steers them, and their factor."""
    made = element(f"V1 a 0 5\nR1 b 0 1k\n{card}", card[:2])
    assert (made.control.element, made.control.gain) == ("V1", gain)


def test_multiplied_current_source():
    """Two in parallel deliver twice the current, waves included."""
    cards = "X1 a s m=2\n.subckt s p\nI1 0 p 1m SIN(1m 2m 1k)\nR1 p 0 1k\n.ends\nV1 b 0 1"
    source = element(cards, "X1.I1").source
    assert source.dc == pytest.approx(2e-3)
    assert (source.wave.offset, source.wave.amplitude) == (pytest.approx(2e-3), pytest.approx(4e-3))


@pytest.mark.parametrize(
    ("card", "words"),
    [
        ("R7 a", "resistor R7 has two nodes and a value; found one node"),
        ("C7 a b", "capacitor C7 has no value"),
        ("V7 a", "voltage source V7 has two nodes; found one node"),
        ("E7 a", "controlled source E7 has two nodes; found one node"),
        ("D7 a dm", "diode D7 has two nodes and a model; found one node"),
        ("Q7 c b", "transistor Q7 has three nodes and a model; found one node"),
        ("X7 a", "a subcircuit call has nodes and a name; found one of them"),
        ("S7 a b", "S7 has four nodes; found two"),
    ],
)
def test_messages_speak_the_trade(card, words):
    """What the card should have, and what it has."""
    (problem,) = circuit(f"V1 a 0 5\n.model dm d\n{card}").problems
    assert words in problem.message


@pytest.mark.parametrize(
    ("cards", "rule", "words"),
    [
        (".if (1)\nR1 a 0 1k", "netlist-end", "not closed by .endif"),
        (".if\nR1 a 0 1k\n.endif", "netlist-expression", "The condition is empty"),
        (".else\nR1 a 0 1k", "netlist-card", ".else without .if"),
        ("R1 a 0 1k\n.ends", "netlist-end", "closes no subcircuit"),
        (".subckt s p q\nR1 p q 1\n.ends t\nX1 a 0 s", "netlist-end", "closes the subcircuit s"),
        (".subckt s p p\nR1 p 0 1\n.ends\nX1 a a s", "netlist-duplicate", "two ports"),
        (".param a=1\n.param a=2\nR1 a 0 {a}", "netlist-parameter", "defined twice"),
        (".control\nrun", "netlist-end", ".control is not closed by .endc"),
        ("R1 a 0 -5k", "netlist-value-sign", "negative"),
        ("R1 a 0 {nope}", "netlist-parameter", "nope is not defined"),
    ],
)
def test_what_is_odd_about_definitions(cards, rule, words):
    """Blocks that are not closed, names that stand twice, values nobody knows."""
    (problem,) = circuit(f"V1 a 0 5\n{cards}").problems
    assert problem.rule == rule
    assert words in problem.message


def test_condition_without_parentheses_and_inside_a_subcircuit():
    """The parameters of the scope count, blanks or brackets do not."""
    body = ".subckt s p q n=2\n.if n==2\nR1 p q 1k\n.elseif(n=3)\nR1 p q 2k\n.endif\n.ends"
    assert element(f"V1 a 0 5\nX1 a 0 s\n{body}", "X1.R1").value == 1000.0


def test_connected_nets_are_one():
    """.connect joins two names."""
    found = circuit("V1 a 0 5\n.connect a b\nR1 b 0 1k").elements
    assert {e.nets for e in found} == {("a", "0")} or {e.nets for e in found} == {("b", "0")}


def test_problem_of_a_card_is_told_once_for_all_its_instances():
    """Not a thousand times."""
    calls = "\n".join(f"X{k} a 0 s" for k in range(50))
    found = circuit(f"V1 a 0 5\n{calls}\n.subckt s p q\nR1 p q 1M\n.ends")
    assert [p.rule for p in found.problems] == ["netlist-value-suffix"]
    assert len(found.elements) == 51


def test_instances_share_nothing_they_should_not():
    """Values that rest on an instance's own parameters are its own."""
    cards = (
        "V1 a 0 5\nX1 a 0 s r=1k\nX2 a 0 s r=2k\nX3 a 0 s r=1k m=2\nX4 a 0 s r=1k\n"
        ".subckt s p q r=9\nR1 p q {r}\nR2 p q 1k\nX9 p q t k={r*2}\n.ends\n"
        ".subckt t p q k=1\nR3 p q {k}\n.ends"
    )
    values = {e.designator: e.value for e in circuit(cards).elements}
    assert [values[f"X{k}.R1"] for k in (1, 2, 3, 4)] == [1000.0, 2000.0, 500.0, 1000.0]
    assert [values[f"X{k}.R2"] for k in (1, 2, 3, 4)] == [1000.0, 1000.0, 500.0, 1000.0]
    assert [values[f"X{k}.X9.R3"] for k in (1, 2, 3, 4)] == [2000.0, 4000.0, 1000.0, 2000.0]


@pytest.mark.parametrize(
    ("card", "name"),
    [("F2 b 0 V9 2", "V9"), ("H2 b 0 V9 1k", "V9"), ("K1 L1 L9 0.9\nL1 b 0 1m", "L9")],
)
def test_card_that_names_what_is_not_there(card, name):
    """A source steered by nothing, an inductor coupled to nothing."""
    (problem,) = circuit(f"V1 a 0 5\nR1 b 0 1k\n{card}").problems
    assert problem.rule == "netlist-card"
    assert f"{name}, which is not in the circuit" in problem.message


def test_references_inside_a_subcircuit():
    """They name what stands beside them."""
    body = "V2 p q 0\nF1 q 0 V2 1\nL1 q 0 1\nL2 q 0 1\nK1 L1 L2 1"
    cards = f"V1 a 0 5\nX1 a s\n.subckt s p\n{body}\n.ends"
    assert circuit(cards).problems == ()


def test_many_alike_problems_are_counted():
    """A deck with a thousand doubled designators does not drown what else is wrong with it."""
    found = circuit("V1 a 0 5\nR2 a 0 1M\n" + "R1 a 0 1k\n" * 1001)
    assert len(found.problems) < 250
    assert any("800 more of these" in p.message for p in found.problems)
    assert "netlist-value-suffix" in [p.rule for p in found.problems]


def test_card_that_cannot_be_split_keeps_its_nets():
    """Nothing on them is taken for unconnected."""
    found = circuit("V1 a 0 5\nX1 a b c s r={1k")
    assert found.elements[1].kind == "opaque"
    assert {"a", "b", "c"} <= set(found.elements[1].nets)
