"""The cards that are bound at once: the same element as by the long way."""

from hypothesis import given, settings
from hypothesis import strategies as st

from railguard.circuit.bind import bind
from railguard.circuit.card import Names, UnboundError
from railguard.circuit.environment import Environment
from railguard.circuit.model import Instance
from railguard.circuit.plain import plain_card
from railguard.circuit.scopes import Scope
from railguard.deck.cards import CardError, items_of
from railguard.deck.lines import Line

NAMES = "R1 r2 C3 cx L4 V5 i6 RV1 R§U1 Q1 X1 x2.3 XFB2 CON1 VR1 LED1 R IC1 D1 1R"
NETS = "a 0 n1 Net-(U1-Pad3) 1k (a b) [0] in+ x=1 é / params params: stage"
VALUES = (
    "1k 4.7k 100n 1M 1F 4k7 2R2 R47 10kOhm 1e-3 1e -5 0 1X 1μ 1µF 1.2.3 dnp NC rm {r} 5% 12V 1D3 "
    "1a inf DC dc 15 AC ac Stage 741 opamp params: SIN am"
)


def some(words: str) -> st.SearchStrategy[str]:
    """Draw one of some words."""
    return st.sampled_from(words.split())


CARDS = st.builds(
    lambda head, nets, rest: " ".join([*head, *nets, *rest]),
    st.tuples(some(NAMES)),
    st.lists(some(NETS), min_size=1, max_size=4),
    st.lists(some(VALUES), min_size=1, max_size=4),
)
SOURCES = st.builds(
    lambda head, nets, rest: " ".join([head, *nets, *rest]),
    some("V1 i2"),
    st.tuples(some("a 0 n1"), some("a 0 n1")),
    st.lists(some("DC dc AC ac 1 5m 0 -3 1k5 1M 90 sin"), min_size=1, max_size=5),
)


def sheet() -> Scope:
    """Return a top level that defines three subcircuits, one of them with a number's name."""
    top = Scope("", None, None)
    top.subcircuits = {name: Scope(name, None, top) for name in ("stage", "opamp", "741")}
    return top


def the_long_way(line: Line, scope: Scope) -> tuple[object, Names]:
    """Bind a card by its items; an element alone, not in a tuple."""
    names = Names(scope, Environment(scope, None, {}), "")
    made = bind(names, items_of(line.text), line)
    return (made if isinstance(made, Instance) else made[0]), names


@settings(max_examples=1200, deadline=None)
@given(CARDS | SOURCES | st.text(max_size=30))
def test_at_once_or_the_long_way(text):
    """Where a card is taken at once, its element is the one that binding its items gives."""
    if not text.strip():
        return
    line, scope = Line("deck.cir", text, 7, 3), sheet()
    made = plain_card(line, scope)
    if made is None:
        return
    try:
        element, names = the_long_way(line, scope)
    except (CardError, UnboundError) as error:
        raise AssertionError(f"{text!r} cannot be bound: {error}") from error
    assert made == element
    assert names.problems == []
    assert not names.asked


def test_it_takes_what_netlists_are_made_of():
    """The property above would hold of a path that takes nothing."""
    for card in (
        "R1 a 0 4.7k", "c2 in+ out- 100nF", "L1 a b 10u", "V1 VCC 0 12", "I3 a 0 1m",
        "V1 a 0 DC 5", "v1 a 0 dc 5 ac 1", "V1 a 0 0 AC 1", "X1 a b c Stage", "x2 a b 741",
    ):  # fmt: skip
        assert plain_card(Line("deck.cir", card, 1), sheet()) is not None, card
    for card in (
        "R1 a 0 1M", "R1 a 0 {r}", "R1 a 0 rm", "R1 (a 0) 1k", "R1 a 0 1k 5%", "X1 a 0 s",
        "V1 a 0 AC 1", "V1 a 0 5 6", "V1 a 0 DC 5 AC 1 90", "X1 a 0 stage params: r=1", "D1 a 0 d",
        "X1 a 0 stage params:", "V1 a 0 DC SIN(0 1 1k)",
    ):  # fmt: skip
        assert plain_card(Line("deck.cir", card, 1), sheet()) is None, card
