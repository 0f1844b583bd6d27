"""Physical lines to logical lines."""

import pytest

from railguard.deck.lines import scan, strip_comment


def texts(text, titled=True):
    """Return the logical lines of a file's text."""
    return [line.text for line in scan(text, "deck.cir", titled).lines]


def test_first_line_is_the_title():
    """Whatever it looks like, a main deck's first line is no card."""
    assert texts("R9 a 0 1k\nV1 a 0 5") == ["V1 a 0 5"]
    assert scan("R9 a 0 1k\nV1 a 0 5", "d", True).title == "R9 a 0 1k"


def test_included_file_has_no_title():
    """The first line of a library is a card."""
    assert texts("R9 a 0 1k\nV1 a 0 5", titled=False) == ["R9 a 0 1k", "V1 a 0 5"]


def test_continuation_crosses_comments_and_blank_lines():
    """A + belongs to the last card."""
    assert texts("t\nR1 a 0\n* remark\n\n+ 1k") == ["R1 a 0 1k"]


def test_pieces_are_never_one_word():
    """`1` and `+5` are two words."""
    assert texts("t\nR1 a 0 1\n+5") == ["R1 a 0 1 5"]


def test_continuation_without_a_card_is_told():
    """A + behind the title continues nothing."""
    found = scan("t\n+ R9 a 0 1k\nV1 a 0 5", "d", True)
    assert [p.rule for p in found.problems] == ["netlist-continuation"]
    assert found.problems[0].location.line == 2


@pytest.mark.parametrize(
    ("text", "kept"),
    [
        ("R1 a 0 10k;note 5%", "R1 a 0 10k"),
        ("R1 a 0 1k $ note", "R1 a 0 1k "),
        ("R1 a$b 0 1k", "R1 a$b 0 1k"),
        ("R1 $N_0001 0 1k", "R1 $N_0001 0 1k"),
        ("R1 a 0 1k // note", "R1 a 0 1k "),
        ("R1 a//b 0 1k", "R1 a//b 0 1k"),
        (".include 'a;b.inc'", ".include 'a;b.inc'"),
        (".include models//x.lib", ".include models//x.lib"),
    ],
)
def test_trailing_comments(text, kept):
    """Comments end cards; the same marks inside names do not."""
    assert strip_comment(text) == kept


@pytest.mark.parametrize("end", ["\n", "\r\n", "\r"])
def test_line_ends_of_every_system(end):
    """CR, LF and CRLF all end lines."""
    assert texts(end.join(["t", "R1 a 0 1k", "R2 a 0 2k"])) == ["R1 a 0 1k", "R2 a 0 2k"]


def test_place_of_a_word_in_a_continued_card():
    """A location points into the file, not into the joined text."""
    line = scan("t\nR1 a 0\n+   1k", "deck.cir", True).lines[0]
    place = line.at(line.text.index("1k"), 2)
    assert (place.line, place.column) == (3, 5)


def test_directives_are_collected_with_their_place():
    """Comment cards that speak to railguard."""
    found = scan("t\n* railguard: rail VBAT 12\nR1 a 0 1k", "deck.cir", True).directives
    assert [(text, place.line) for text, place in found] == [("rail VBAT 12", 2)]
