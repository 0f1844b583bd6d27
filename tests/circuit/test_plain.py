"""The cards that are bound at once: the same element as by the long way."""

from hypothesis import given, settings
from hypothesis import strategies as st

from railguard.circuit.bind import bind
from railguard.circuit.card import Names, UnboundError
from railguard.circuit.environment import Environment
from railguard.circuit.plain import plain_element
from railguard.circuit.scopes import Scope
from railguard.deck.cards import CardError, items_of
from railguard.deck.lines import Line

NAMES = "R1 r2 C3 cx L4 V5 i6 RV1 R§U1 Q1 X1 CON1 VR1 LED1 R IC1 D1 1R"
NETS = "a 0 n1 Net-(U1-Pad3) 1k (a b) [0] in+ x=1 é"
VALUES = (
    "1k 4.7k 100n 1M 1F 4k7 2R2 R47 10kOhm 1e-3 1e -5 0 1X 1μ 1µF 1.2.3 dnp NC rm {r} 5% 12V 1D3 "
    "1a inf DC 15 AC"
)
CARDS = st.builds(
    lambda *words: " ".join(words),
    *(st.sampled_from(words.split()) for words in (NAMES, NETS, NETS, VALUES)),
)


@settings(max_examples=600, deadline=None)
@given(CARDS | st.text(max_size=30))
def test_at_once_or_the_long_way(text):
    """Where a card is taken at once, its element is the one that binding its items gives."""
    if not text.strip():
        return
    line = Line("deck.cir", text, 7, 3)
    made = plain_element(line)
    if made is None:
        return
    scope = Scope("", None, None)
    names = Names(scope, Environment(scope, None, {}), "")
    try:
        (element,) = bind(names, items_of(text), line)
    except (CardError, UnboundError) as error:
        raise AssertionError(f"{text!r} cannot be bound: {error}") from error
    assert made == element
    assert names.problems == []
    assert not names.asked


def test_it_takes_what_netlists_are_made_of():
    """The property above would hold of a path that takes nothing."""
    for card in ("R1 a 0 4.7k", "c2 in+ out- 100nF", "L1 a b 10u", "V1 VCC 0 12", "I3 a 0 1m"):
        assert plain_element(Line("deck.cir", card, 1)) is not None
    for card in ("R1 a 0 1M", "R1 a 0 {r}", "R1 a 0 rm", "R1 (a 0) 1k", "R1 a 0 1k 5%", "X1 a 0 s"):
        assert plain_element(Line("deck.cir", card, 1)) is None
