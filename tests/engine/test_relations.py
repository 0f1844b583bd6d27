"""Expressions and polynomials become subcircuits of our own, or are refused."""

import pytest

from railguard.circuit.flatten import flatten
from railguard.deck.files import deck_from_text
from railguard.engine.relations import linear_currents, relation


def element(card, *more):
    """Return the first element of a deck made of some cards."""
    text = "\n".join(("relations", card, *more, "R1 a 0 1k", ".end", ""))
    return flatten(deck_from_text(text)).elements[0]


@pytest.mark.parametrize(
    ("card", "body"),
    [
        ("B1 out 0 v=2*v(a)", "v=2*v(q1)"),
        ("B1 out 0 i=1m*max(v(a,b),0)", "i=0.001*max(v(q1,q2),0)"),
        ("B1 out 0 v=TANH(v(a)) ** 2 - 1.5e-3", "v=tanh(v(q1))**2-0.0015"),
        ("E1 out 0 value={v(a)*3}", "v=v(q1)*3"),
        ("G1 out 0 VALUE = { sqrt(v(b)) }", "i=sqrt(v(q1))"),
        ("B1 out 0 v=v(a)+v(0)", "v=v(q1)+v(0)"),
        ("E1 out 0 poly(2) (a,0) (b,0) 0 .5 .5", "v=0+(0.5)*v(q1,0)+(0.5)*v(q2,0)"),
        ("E1 out 0 poly(1) a b 1 2 3", "v=1+(2)*v(q1,q2)+(3)*v(q1,q2)*v(q1,q2)"),
    ],
)
def test_a_relation_is_written_anew(card, body):
    """Numbers, voltages and known functions only."""
    made = relation(element(card), "rel1")
    lines = made.body.splitlines()
    assert lines[0].startswith(".subckt rel1 p m")
    assert lines[1] == f"B1 p m {body}"
    assert lines[2] == ".ends"
    assert made.placed.nets[:2] == ("out", "0")


@pytest.mark.parametrize(
    "card",
    [
        "B1 out 0 v=limit(v(a),0,1)",
        "B1 out 0 v=v(a)*k",
        "B1 out 0 v=i(V1)",
        "B1 out 0 v=v(a)?1:0",
        "B1 out 0 v=`ls`",
        "B1 out 0 v=",
        "E1 out 0 poly(2) (a,0) (b,0) 0 1 1 1",
        "E1 out 0 poly(1) a b x",
    ],
)
def test_anything_else_is_refused(card):
    """No word of the netlist passes that is not known."""
    assert relation(element(card), "rel1") is None


def test_a_linear_polynomial_of_currents_is_a_row_of_plain_sources():
    """Terms of zero are left out; the sensed sources keep their scope."""
    text = (
        "t\nX1 a m\n.subckt m p\nF1 p 0 poly(3) va vb vc 0 2 0 -4\nva p 0 1\nvb p 0 1\nvc p 0 1\n"
        ".ends\nR1 a 0 1\n.end\n"
    )
    found = next(e for e in flatten(deck_from_text(text)).elements if e.kind == "F")
    terms = linear_currents(found)
    assert [(t.control.element, t.control.gain) for t in terms] == [("X1.va", 2.0), ("X1.vc", -4.0)]
    assert len({t.designator for t in terms}) == 2


@pytest.mark.parametrize(
    "card",
    [
        "F1 a 0 poly(2) va vb 1 2 3",
        "F1 a 0 poly(2) va vb 0 1 1 1",
        "H1 a 0 poly(2) va vb 0 1 1",
        "F1 a 0 poly(1) va 0 x",
    ],
)
def test_a_polynomial_that_is_not_linear_in_currents_is_refused(card):
    """A constant, a product, or sources that would have to stand in series."""
    assert linear_currents(element(card)) is None
