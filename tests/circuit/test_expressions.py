"""Parameter expressions."""

import contextlib

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from railguard.circuit.expressions import (
    ExpressionError,
    Function,
    evaluate,
    parse,
    parse_whole,
    probes,
)

VALUES = {"a": 2.0, "b": 1000.0}


def look(name):
    """Return a parameter."""
    if name not in VALUES:
        raise ExpressionError(f"{name} is not defined")
    return VALUES[name]


@pytest.mark.parametrize(
    ("text", "value"),
    [
        ("1k", 1000.0), ("a", 2.0), ("a*b", 2000.0), ("-2**2 + 5", 1.0), ("2^3^2", 64.0),
        ("{1k} + 1", 1001.0), ("if(a>1,3,4)", 3.0), ("a==2 ? 2k : 3k", 2000.0),
        ("max(1,2,3)", 3.0), ("limit(5,0,3)", 3.0), ("table(1.5,1,10,2,20)", 15.0),
        ("ln(e)", 1.0), ("1||0&&0", 1.0), ("!a", 0.0), ("sqrt(b/10)", 10.0), ("int(-1.5)", -1.0),
        ("(1+2)*3", 9.0), ("1meg/b", 1000.0), ("agauss(5,1,3)", 5.0), ("double(a)+1", 5.0),
    ],
)  # fmt: skip
def test_value(text, value):
    """Operators, functions, conditionals, parameters."""
    assert evaluate(text, look, {"double": Function(("x",), "2*x")}) == pytest.approx(value)


@pytest.mark.parametrize(
    ("text", "words"),
    [
        ("1/0", "divides by zero"), ("sqrt(-4)", "no value"), ("nope", "not defined"),
        ("1+", "no expression"), ("", "empty"), ("f(1)", "no known function"),
        ("exp(10000)", "no value"), ("2k2*1", "expression"), ("__import__('os')", "expression"),
        ("(" * 200 + "1" + ")" * 200, "bound"), ("a.__class__", "not defined"),
    ],
)  # fmt: skip
def test_what_has_no_value_says_why(text, words):
    """In one sentence, and nothing is executed."""
    with pytest.raises(ExpressionError, match=words):
        evaluate(text, look)


def test_run_time_values_are_told_apart():
    """A voltage is known only to a simulation."""
    with pytest.raises(ExpressionError) as error:
        evaluate("v(out)*2", look)
    assert error.value.behavioural
    assert probes("v(in+)*2 + V(a,b)") == ("in+", "a", "b")


@settings(deadline=None)
@given(st.text(alphabet="0123456789abkm+-*/^().,?:<>=&|!{} ", max_size=40))
def test_any_text_has_a_value_or_a_reason(text):
    """No input raises anything else."""
    outcome = None
    with contextlib.suppress(ExpressionError):
        outcome = evaluate(text, look)
    assert outcome is None or isinstance(outcome, float)


def outcome(read, text):
    """Return an expression's tree, or why it has none."""
    try:
        return read(text)
    except ExpressionError as error:
        return error.reason


@settings(deadline=None)
@given(
    st.text(alphabet="12.eab_kM+-*/^ ()", max_size=10)
    | st.builds(
        " ".join, st.lists(st.sampled_from(("a", "1k", "-", "+", "*", "2k2", ".5", "v(a)", "!")))
    )
)
def test_short_expressions_equal_the_grammar(text):
    """One or two operands give the same tree by the short path and by the grammar."""
    assert outcome(parse, text) == outcome(parse_whole, text)


@pytest.mark.parametrize(
    "text",
    ["+".join(["1"] * 4000), "f0(1)", "g(1)", "(" * 60 + "1" + ")" * 60 + "^2" * 60],
)
def test_expression_that_goes_on_for_ever_ends(text):
    """Long sums, functions that call each other twice at every step, and themselves."""
    functions = {f"f{k}": Function(("x",), f"f{k + 1}(x)+f{k + 1}(x)") for k in range(60)}
    functions["f60"] = Function(("x",), "x")
    functions["g"] = Function(("x",), "g(x)+1")
    with contextlib.suppress(ExpressionError):
        assert isinstance(evaluate(text, look, functions), float)
