"""Edits in a deck's files: bytes that are not edited stay, whatever the encoding and line ends."""

import pytest

from railguard.redline.model import Edit
from railguard.redline.source import (
    Source,
    can_be_patched,
    encoded,
    line_end,
    of_review,
    of_text,
    patch,
)
from railguard.reviewing import review

TEXT = "title µ\nR1 a 0 10k\nC1 a 0 100n"


@pytest.mark.parametrize(
    ("mark", "codec"),
    [
        (b"", "utf-8"),
        (b"\xef\xbb\xbf", "utf-8"),
        (b"\xff\xfe", "utf-16-le"),
        (b"\xfe\xff", "utf-16-be"),
        (b"", "utf-16-le"),
        (b"", "cp1252"),
    ],
)
@pytest.mark.parametrize("end", ["\n", "\r\n", "\r"])
def test_encoding_and_line_ends_stay(tmp_path, mark, codec, end):
    """A value replaced and a card added leave every other byte as it was."""
    before = mark + TEXT.replace("\n", end).encode(codec)
    source = Source("a.cir", {"a.cir": before}, tmp_path)
    edits = (Edit("a.cir", 2, 8, 3, "12k"), Edit("a.cir", 3, 12, 0, "\nC2 a 0 1u"))
    after = source.patched(edits).files["a.cir"]
    wanted = TEXT.replace("10k", "12k") + "\nC2 a 0 1u"
    assert after == mark + wanted.replace("\n", end).encode(codec)


def test_bytes_that_windows_1252_lacks_come_back():
    """The five undefined bytes survive an edit."""
    before = b"title\nR1 a 0 10k ; \x81\x8d\xb5\n"
    source = Source("a.cir", {"a.cir": before}, None)
    assert can_be_patched(source, "a.cir")
    after = source.patched((Edit("a.cir", 2, 8, 3, "12k"),)).files["a.cir"]
    assert after == before.replace(b"10k", b"12k")


def test_a_file_with_nul_bytes_is_left_alone():
    """Columns cannot be trusted there, so nothing is patched."""
    assert not can_be_patched(Source("a.cir", {"a.cir": b"t\nR1 a\x00 0 1k\n"}, None), "a.cir")


@pytest.mark.parametrize(
    "edits",
    [
        (Edit("a", 1, 1, 3, "x"), Edit("a", 1, 2, 3, "y")),
        (Edit("a", 1, 4, 30, "x"),),
    ],
)
def test_edits_that_overlap_or_leave_the_line_are_refused(edits):
    """Nothing is patched that was not meant."""
    with pytest.raises(ValueError, match="cannot be made"):
        patch("R1 a 0 10k\nend", edits)


def test_mixed_line_ends_take_the_commonest():
    """A new card ends as most lines do."""
    assert line_end("a\r\nb\r\nc\n") == "\r\n"
    assert line_end("a") == "\n"


def test_encoding_takes_what_it_cannot_hold_as_a_question_mark():
    """An ohm sign put into a Windows-1252 file does not break it."""
    assert encoded("R \u03a9 \xb5", b"R \xb5") == b"R ? \xb5"


def test_a_deck_changed_since_its_review_is_not_read_anew(tmp_path):
    """What was reviewed is what is patched, not what stands there now."""
    deck = tmp_path / "a.cir"
    deck.write_text("title\nR1 a 0 10k\nV1 a 0 5\n.end\n")
    found = review(deck).designs[0]
    assert of_review(found) is not None
    deck.write_text("title\nR1 a 0 11k\nV1 a 0 5\n.end\n")
    assert of_review(found).text(str(deck)).splitlines()[1] == "R1 a 0 10k"


def test_a_text_is_patched_as_it_was_given():
    """A netlist given as text has no file to be read again."""
    source = of_review(review("title\nR1 a 0 10k\n.end\n").designs[0])
    assert source.patched((Edit("<text>", 2, 8, 3, "12k"),)).deck().texts["<text>"].split("\n")[
        1
    ] == ("R1 a 0 12k")


def test_a_deck_has_no_files_but_its_own(tmp_path):
    """A file beside the deck that it did not read is not there for the changed deck."""
    (tmp_path / "other.inc").write_text("R2 a 0 1k\n")
    source = of_text("title\nR1 a 0 10k\n.include other.inc\n", str(tmp_path / "a.cir"))
    assert {p.rule for p in source.deck().problems} == {"netlist-include"}
