"""Logical lines to items: the fast path and the grammar say the same."""

import re

import pytest
from hypothesis import given
from hypothesis import strategies as st

from railguard.deck.cards import (
    Assignment,
    Call,
    CardError,
    Group,
    items_of,
    parse_items,
    word_terminal,
)

WORDS = st.from_regex(r"[A-Za-z0-9_.+\-/#:$<>~!*&@%^]{1,12}", fullmatch=True)


@given(st.lists(WORDS, min_size=1, max_size=9))
def test_fast_path_equals_the_grammar(words):
    """Cards of plain words split as the grammar splits them."""
    text = " ".join(words)
    assert items_of(text) == parse_items(text)


@given(WORDS)
def test_fast_path_words_are_the_grammars_words(word):
    """Every word the fast path takes is one word of the grammar's terminal."""
    assert re.fullmatch(word_terminal(), word)


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
