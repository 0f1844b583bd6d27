"""Logical lines to items: the fast path and the grammar say the same."""

import re

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from railguard.deck.cards import (
    Assignment,
    Call,
    CardError,
    Group,
    items_of,
    parse_items,
)
from railguard.deck.language import terminals

WORDS = st.from_regex(r"[A-Za-z0-9_.+\-/#:$<>~!*&@%^]{1,12}", fullmatch=True)


@settings(deadline=None)
@given(st.lists(WORDS, min_size=1, max_size=9))
def test_fast_path_equals_the_grammar(words):
    """Cards of plain words split as the grammar splits them."""
    text = " ".join(words)
    assert items_of(text) == parse_items(text)


CARDS = st.text(alphabet="RXab1k.-_/ \t,=(){}[]'\"*+$:;é", max_size=40)
SPLIT = (
    "R1 a 0 1k Net-(U1-Pad3) net_(a) sin( ( ) {a*b} {x{y} {{a}} [0] a[1] r=1k tc=1m,2u , == a=b=c "
    "table=(0,0,10,20) § /s/(a)b -( x(y=1) % é"
)
WHOLE = ("SIN (", "'v(a) * 2'", '"a b"', "[a b]", "r =", "= 2k", "ic = {1}")
PIECES = st.lists(st.sampled_from([*SPLIT.split(), *WHOLE]), max_size=10)


def outcome(read, text):
    """Return the items of a card, or that the card is refused, and where."""
    try:
        return read(text)
    except CardError as error:
        return error.reason, error.at


@settings(max_examples=500, deadline=None)
@given(CARDS | st.builds(" ".join, PIECES) | st.builds("".join, PIECES))
def test_tokens_equal_the_grammar(text):
    """Any card, sound or broken, is the same by tokens and by the grammar."""
    assert outcome(items_of, text) == outcome(parse_items, text)


@settings(deadline=None)
@given(WORDS)
def test_fast_path_words_are_the_grammars_words(word):
    """Every word the fast path takes is one word of the grammar's terminal."""
    assert re.fullmatch(terminals("spice.lark")["WORD"], word)


@pytest.mark.parametrize(
    ("text", "items"),
    [
        ("R1 (a,0) 1k", ("R1", Group(("a", "0")), "1k")),
        ("R1,a,0,1k", ("R1", "a", "0", "1k")),
        ("R1 a Net-(U1-Pad3) 1k", ("R1", "a", "Net-(U1-Pad3)", "1k")),
        ("R1 a 0 R = 2k", ("R1", "a", "0", Assignment("r", "2k"))),
        ("V1 a 0 SIN(0 1 1k) AC 1", ("V1", "a", "0", Call("sin", ("0", "1", "1k")), "AC", "1")),
        ("X1 a s r={1==1 ? 2k : 3k}", ("X1", "a", "s", Assignment("r", "{1==1 ? 2k : 3k}"))),
        ("Q1 c b e [0] qm", ("Q1", "c", "b", "e", "[0]", "qm")),
    ],
)
def test_items_of_a_card(text, items):
    """Separators, groups, calls, assignments, expressions."""
    assert items_of(text) == items


@pytest.mark.parametrize(
    ("text", "reason"),
    [("R1 a 0 {1k", "brace"), ("V1 a 0 SIN(0 1", "parenthesis"), ("X1 a 0 s r='2k", "quote")],
)
def test_unbalanced_card_says_what_is_missing(text, reason):
    """In plain words."""
    with pytest.raises(CardError, match=reason):
        items_of(text)
