"""Words of cards, and values written in the manner of the word they replace."""

import pytest
from hypothesis import given
from hypothesis import strategies as st

from railguard.deck.lines import scan
from railguard.deck.numbers import read_number
from railguard.redline.cards import Word, aligned, replaced, spelled, words_of
from railguard.redline.source import patch


def card(text):
    """Return a text's first card."""
    return scan(text, "a", titled=False).lines[0]


@pytest.mark.parametrize(
    ("value", "like", "letter", "text"),
    [
        (13e3, "51k", "R", "13k"),
        (13e3, "51K", "R", "13K"),
        (1e6, "10k", "R", "1meg"),
        (4.7e3, "5k1", "R", "4k7"),
        (4.7e3, "51k", "R", "4.7k"),
        (220.0, "10k", "R", "220"),
        (100e-9, "10nF", "C", "100nF"),
        (1.0, "10nF", "C", "1"),
        (2.2e-12, "10p", "C", "2.2p"),
        (100e-6, "100n", "C", "100u"),
        (10e3, "4.7kohm", "R", "10kohm"),
        (4.99e3, "10k", "R", "4.99k"),
    ],
)
def test_a_value_is_written_as_its_card_writes_it(value, like, letter, text):
    """Case, unit and RKM form are kept."""
    assert spelled(value, like, letter) == text


@given(
    st.floats(1e-13, 1e9).map(lambda v: float(f"{v:.3g}")),
    st.sampled_from(["10k", "5K1", "4k7", "100nF", "1Meg", "1e3", ""]),
    st.sampled_from("RCL"),
)
def test_what_is_written_is_read_as_meant(value, like, letter):
    """Every spelling means one thing to SPICE, and that."""
    number = read_number(spelled(value, like, letter), letter)
    assert number is not None
    assert number.value == pytest.approx(value, rel=1e-3)
    assert like == "4k7" or like == "5K1" or not number.trap


@pytest.mark.parametrize(
    ("before", "word", "new", "after"),
    [
        ("R1 a b 10k ; note", "10k", "4.7k", "R1 a b 4.7k ; note"),
        ("R1  a    b    10k    tol=1%", "10k", "4.99k", "R1  a    b    4.99k  tol=1%"),
        ("R1  a    b    4.99k  tol=1%", "4.99k", "10k", "R1  a    b    10k    tol=1%"),
        ("R1 a b\n+ 10k", "10k", "12k", "R1 a b\n+ 12k"),
        ("R1 (a b) 10k", "10k", "12k", "R1 (a b) 12k"),
        ("R1 a b R=10k", "10k", "12k", "R1 a b R=12k"),
    ],
)
def test_one_word_changes_and_the_columns_behind_it_stay(before, word, new, after):
    """Blanks give way where there are some to give."""
    line = card(before)
    found = next(w for w in words_of(line) if w.text == word)
    assert patch(before, [replaced(line, found, new)]) == after


def test_a_new_card_takes_its_neighbours_columns():
    """Only where the neighbour has columns at all."""
    assert aligned(["C12", "vp", "0", "100n"], card("C1     vpp    0      100n")) == (
        "C12    vp     0      100n"
    )
    assert aligned(["C12", "vp", "0", "100n"], card("C1 vpp 0 100n")) == "C12 vp 0 100n"
    assert Word("a", 3).at == 3
