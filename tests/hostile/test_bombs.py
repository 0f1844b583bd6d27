"""Small decks that ask for endless work: each comes to an end, and the report says what was left.

Nothing is timed: what is not bounded here does not end within a day. `test_bounds` runs them once
more in a process of its own, with bounds on what that may take.
"""

import pytest

from railguard.circuit import expressions
from railguard.circuit.expressions import MOST_STEPS
from railguard.deck.bounds import Bounds
from railguard.reviewing import review
from tests.report import designs

GAUGE = designs.GAUGE.format(peak=0.1, load=10_000)
BOUNDS = Bounds(elements=3_000, includes=50, total_bytes=100_000)


def reviewed(cards, bounds=None):
    """Return the review of a sound gauge with hostile cards before its own."""
    title, rest = GAUGE.split("\n", 1)
    (found,) = review(f"{title}\n{cards}\n{rest}", bounds=bounds).designs
    return found


def rules(found):
    """Return the rules that spoke of the reading."""
    return {f.rule for f in found.findings if f.family == "netlist"}


def ten_in_ten(inside, levels=11):
    """Return subcircuits that each call the one before ten times: 10^levels in all."""
    cards = [f".subckt s0 a b\n{inside}.ends"]
    for level in range(1, levels + 1):
        calls = "\n".join(f"X{n} a b s{level - 1}" for n in range(10))
        cards.append(f".subckt s{level} a b\n{calls}\n.ends")
    return "\n".join([*cards, f"XT 1 0 s{levels}"])


@pytest.mark.parametrize("inside", ["R1 a b 1k\n", ""], ids=["full", "empty"])
def test_subcircuits_of_subcircuits(inside):
    """The bound counts instances as well as elements; a deck that is cut off is not judged."""
    found = reviewed(ten_in_ten(inside), BOUNDS)
    assert "netlist-bound" in rules(found)
    assert found.design.circuit.elements == ()
    assert found.verdict == "hold"
    (bound,) = [f for f in found.findings if f.rule == "netlist-bound"]
    assert "none of it is judged" in bound.message


def test_a_deck_below_the_bound_is_judged():
    """The bound cuts nothing that is allowed."""
    found = reviewed(ten_in_ten("R1 a b 1k\n", levels=3), BOUNDS)
    assert "netlist-bound" not in rules(found)
    assert len(found.design.circuit.elements) > 1000


def test_subcircuits_that_call_themselves():
    """Straight, and by way of each other."""
    cards = (
        ".subckt s a b\nX1 a b s\nX2 a b s\n.ends\nXS 1 0 s\n"
        ".subckt p a b\nX1 a b q\n.ends\n.subckt q a b\nX1 a b p\nX2 a b p\n.ends\nXP 1 0 p"
    )
    found = reviewed(cards)
    assert any("calls itself" in f.message for f in found.findings)


def test_definitions_inside_definitions():
    """Twenty thousand deep, never closed."""
    cards = "".join(f".subckt s{n} a b\n" for n in range(20_000))
    assert "netlist-end" in rules(reviewed(cards))


@pytest.mark.parametrize("order", [1, -1], ids=["downwards", "upwards"])
def test_a_short_chain_of_parameters_has_its_value(order):
    """Fifty parameters, each twice the one before, in either order."""
    cards = [f".param a{n}={{a{n - 1}+a{n - 1}}}" for n in range(1, 51)][::order]
    found = reviewed("\n".join([".param a0=1", *cards, "Rx in 0 {a50}"]))
    (element,) = [e for e in found.design.circuit.elements if e.designator == "Rx"]
    assert element.value == 2.0**50


@pytest.mark.parametrize("order", [1, -1], ids=["downwards", "upwards"])
def test_a_chain_of_parameters_too_long_to_follow(order):
    """It has no value, and the card says so."""
    cards = [f".param a{n}={{a{n - 1}+a{n - 1}}}" for n in range(1, 5_001)][::order]
    found = reviewed("\n".join([".param a0=1", *cards, "Rx in 0 {a5000}"]))
    assert rules(found) & {"netlist-expression", "netlist-parameter"}


def test_functions_that_call_others_twice():
    """2^60 operations are asked for."""
    cards = [f".func f{n}(x)={{f{n - 1}(x)+f{n - 1}(x)}}" for n in range(1, 60)]
    found = reviewed("\n".join([".func f0(x)={x+x}", *cards, "Rx in 0 {f59(1)}"]))
    told = " ".join(f.message for f in found.findings)
    assert f"{MOST_STEPS:,} steps" in told


def test_a_thousand_calls_of_such_functions(monkeypatch):
    """Each stays below its own bound; the deck has one as well."""
    monkeypatch.setattr(expressions, "MOST_STEPS_OF_A_DECK", 3 * MOST_STEPS)
    functions = [f".func f{n}(x)={{f{n - 1}(x)+f{n - 1}(x)}}" for n in range(1, 60)]
    calls = [f"Rx{n} in 0 {{f59({n})}}" for n in range(1_000)]
    found = reviewed("\n".join([".func f0(x)={x+x}", *functions, *calls]))
    told = [f.message for f in found.findings if f.rule == "netlist-expression"]
    assert sum(f"more than {MOST_STEPS:,} steps" in one for one in told) <= 4
    assert any(f"this deck take more than {3 * MOST_STEPS:,} steps" in one for one in told)


def test_a_condition_on_a_chain_of_parameters():
    """Each is asked for twice by the next: 2^60 ways down."""
    cards = [f".param a{n}={{a{n - 1}+a{n - 1}}}" for n in range(1, 61)]
    found = reviewed("\n".join([".param a0=1", *cards, ".if (a60 > 1)", "Rx in 0 1k", ".endif"]))
    assert "Rx" in [e.designator for e in found.design.circuit.elements]


def test_functions_that_call_themselves():
    """They have no end and no value."""
    found = reviewed(".func f(x)={f(x)+f(x)}\nRx in 0 {f(1)}")
    assert "netlist-expression" in rules(found)


def test_powers_of_powers():
    """A number is no longer than a float, however it is asked for."""
    found = reviewed(
        "R7 in 0 {10**10**10**10}\nR8 in 0 {9^9^9^9}\nR9 in 0 {pow(10,pow(10,10))}\n"
        "R6 in 0 {2**99999999999}"
    )
    told = [f.message for f in found.findings if f.rule == "netlist-expression"]
    assert len(told) == 4


def test_an_unknown_name_is_looked_for_once_everywhere():
    """From sixty definitions inside each other there are 2^60 ways outwards."""
    opening = "".join(f".subckt s{n} a b\n" for n in range(60))
    closing = "".join(f"X1 a b s{n}\n.ends\n" for n in range(59, 0, -1))
    found = reviewed(f"{opening}R1 a b {{nowhere}}\n.ends\n{closing}X1 in 0 s0")
    assert any("nowhere" in f.message for f in found.findings)


def laid(folder, files):
    """Lay files into a folder, the first of them the netlist, and review it."""
    for name, text in files.items():
        (folder / name).write_text(text)
    (found,) = review(folder / next(iter(files)), bounds=BOUNDS).designs
    return found


def test_files_that_include_each_other_twice(tmp_path):
    """Thirty files ask for 2^30 readings."""
    files = {"gauge.cir": GAUGE.replace("\n", "\n.include a0.inc\n", 1)}
    for level in range(30):
        files[f"a{level}.inc"] = f".include a{level + 1}.inc\n.include a{level + 1}.inc\n"
    files["a30.inc"] = "* the last\n"
    found = laid(tmp_path, files)
    told = [f.message for f in found.findings if f.rule == "netlist-bound"]
    assert told == ["The deck follows more than 50 include cards; no further file is read."]


def test_a_file_included_over_and_over(tmp_path):
    """What is read counts in all, not file by file."""
    files = {
        "gauge.cir": GAUGE.replace("\n", "\n" + ".include b.inc\n" * 40, 1),
        "b.inc": "* nothing\n" * 3_000,
    }
    told = [f.message for f in laid(tmp_path, files).findings if f.rule == "netlist-bound"]
    assert told == ["The deck includes more than 100,000 bytes; no further file is read."]


def test_a_file_of_many_cards_included_over_and_over(tmp_path):
    """Cards count too, before anything is expanded."""
    files = {
        "gauge.cir": GAUGE.replace("\n", "\n" + ".include c.inc\n" * 40, 1),
        "c.inc": "R1 a b 1\n" * 2_000,
    }
    told = [f.message for f in laid(tmp_path, files).findings if f.rule == "netlist-bound"]
    assert told[0].startswith("The deck holds more than 3,000 cards")


ENDLESS = {
    "continuations of nothing": "R9 in 0 1k\n" + "+\n" * 100_000,
    "continuations": "R9 in 0 1k\n" + "+ m=1\n" * 60_000,
    "one long line": "R9 in 0 " + "x" * 2_000_000,
    "a long name": "R" + "9" * 900_000 + " in 0 1k",
    "many digits": "R9 in 0 " + "1" * 9_000 + "\nR8 in 0 1e" + "9" * 9_000,
    "digits in an expression": "R9 in 0 {" + "1" * 9_000 + "}",
    "digits and a mark, often": ("R9 in 0 {" + "7" * 9_000 + "!}\n") * 100,
    "digits in quotes, often": ("R9 in 0 '" + "7" * 9_000 + "!'\n") * 100,
    "blanks in an expression, often": ("R9 in 0 {1" + " " * 9_000 + "!}\n") * 100,
    "parentheses, often": ("R9 in 0 {" + "(" * 4_000 + "1" + ")" * 4_000 + "}\n") * 100,
    "braces inside braces": "R9 in 0 " + "{" * 9_000 + "1",
    "braces beside braces": "R9 in 0 {" + "{1}" * 3_000,
    "deep parentheses": "R9 in 0 {" + "(" * 4_000 + "1" + ")" * 4_000 + "}",
    "deep calls": "V9 a 0 " + "SIN(" * 100_000,
    "signs": "R9 in 0 {" + "-" * 9_000 + "1}",
    "a long sum": "R9 in 0 {" + "1+" * 4_900 + "1}",
    "a long tower": "R9 in 0 {" + "1**" * 3_000 + "1}",
    "choices": "R9 in 0 {" + "1?" * 2_000 + "1" + ":1" * 2_000 + "}",
    "blanks": "R9 in 0" + " " * 900_000 + "1k",
    "comment marks": ".include x " + "$ " * 300_000,
    "comment marks in quotes": 'R9 in 0 1k "' + "; // $ " * 130_000 + '"',
    "open quotes": ".lib " + "'a\"b " * 150_000,
    "commas": "R9 in,0" + "," * 900_000 + "1k",
    "assignments": "R9 in 0 1k " + "a=1 " * 200_000,
    "a directive without end": "* railguard: " + "x " * 400_000,
    "a dashed comment": ("* " + "-" * 500 + "\n") * 5_000,
    "conditions": ".if (1)\n" * 20_000,
    "a wave of many points": "V9 a 0 PWL(" + " ".join(f"{n}u {n % 7}" for n in range(50_000)) + ")",
    "ports": ".subckt s "
    + " ".join(f"p{n}" for n in range(30_000))
    + "\n.ends\nX9 "
    + " ".join(f"q{n}" for n in range(30_000))
    + " s",
    "marks on marks": "R9 in 0\u0301" + "\u0301" * 9_000 + " 1k",
    "models that stand for each other": ".model a ako:b D\n.model b ako:a D\nD9 in 0 a",
    "NUL bytes": "\0" * 100_000 + "R9 in 0 1k",
}


@pytest.mark.parametrize("cards", ENDLESS.values(), ids=ENDLESS)
def test_a_line_that_asks_for_endless_work_ends(cards):
    """Whatever is made of it, the gauge behind it is still judged."""
    found = reviewed(cards)
    assert [s.designator for s in found.design.stages] == ["XU1"]
    assert found.judged > 50


def test_a_name_longer_than_its_bound_is_no_name():
    """It would stand in every finding on its net, in every report."""
    found = reviewed("R9 in " + "n" * 10_001 + " 1k")
    (told,) = [f for f in found.findings if f.rule == "netlist-bound"]
    assert told.message == "A name or value is longer than 10,000 characters; it is left out."
    assert "netlist-bound" not in rules(reviewed("R9 in " + "n" * 10_000 + " 1k"))
