"""Files in: encodings, includes, bounds."""

import pytest

from railguard.deck.encoding import decode
from railguard.deck.files import Bounds, deck_from_text, read_deck
from railguard.deck.lines import physical_lines

TEXT = "station\nC1 a 0 1µ\nR1 a 0 1k\n.end\n"


@pytest.mark.parametrize(
    "data",
    [
        TEXT.encode("utf-8"),
        b"\xef\xbb\xbf" + TEXT.encode("utf-8"),
        TEXT.encode("cp1252"),
        b"\xff\xfe" + TEXT.encode("utf-16-le"),
        b"\xfe\xff" + TEXT.encode("utf-16-be"),
        TEXT.encode("utf-16-le"),
        TEXT.encode("utf-16-be"),
    ],
)
def test_every_encoding_gives_the_same_text(data):
    """With and without a byte order mark."""
    assert decode(data)[0] == TEXT


def lines(deck):
    """Return the logical lines of a deck."""
    return [line.text for line in deck.lines]


def test_include_is_relative_to_the_including_file(tmp_path):
    """A library in a folder includes its neighbour."""
    (tmp_path / "lib").mkdir()
    (tmp_path / "lib" / "a.lib").write_text(".include b.lib\n")
    (tmp_path / "lib" / "b.lib").write_text("R9 x 0 1k\n")
    (tmp_path / "main.cir").write_text("t\n.include lib/a.lib\nR1 a 0 1k\n")
    deck = read_deck(tmp_path / "main.cir")
    assert lines(deck) == ["R9 x 0 1k", "R1 a 0 1k"]
    assert deck.problems == ()
    assert len(deck.files) == 3


@pytest.mark.parametrize("written", ['"My Lib\\Amp.LIB"', "'my lib/amp.lib'", '"MY LIB/amp.lib"'])
def test_include_takes_windows_separators_quotes_and_other_case(tmp_path, written):
    """As written on another system."""
    (tmp_path / "my lib").mkdir()
    (tmp_path / "my lib" / "amp.lib").write_text("R9 x 0 1k\n")
    (tmp_path / "main.cir").write_text(f"t\n.include {written}\n")
    assert lines(read_deck(tmp_path / "main.cir")) == ["R9 x 0 1k"]


def test_missing_include_is_told_with_its_chain(tmp_path):
    """The rest of the deck is read."""
    (tmp_path / "a.lib").write_text(".include nowhere.lib\n")
    (tmp_path / "main.cir").write_text("t\n.include a.lib\nR1 a 0 1k\n")
    deck = read_deck(tmp_path / "main.cir")
    assert lines(deck) == ["R1 a 0 1k"]
    (problem,) = deck.problems
    assert problem.rule == "netlist-include"
    assert "a.lib" in problem.message
    assert "main.cir" in problem.message


def test_include_cycle_ends(tmp_path):
    """A file that includes itself is read once."""
    (tmp_path / "a.lib").write_text("R9 x 0 1k\n.include a.lib\n")
    (tmp_path / "main.cir").write_text("t\n.include a.lib\n")
    deck = read_deck(tmp_path / "main.cir")
    assert lines(deck) == ["R9 x 0 1k"]
    assert "includes itself" in deck.problems[0].message


@pytest.mark.parametrize("written", ["../secret.lib", "/etc/passwd", "link.lib"])
def test_nothing_outside_the_folder_is_read(tmp_path, written):
    """Neither by dots, nor by an absolute path, nor through a link."""
    (tmp_path / "secret.lib").write_text("R9 x 0 1k\n")
    folder = tmp_path / "deck"
    folder.mkdir()
    (folder / "link.lib").symlink_to(tmp_path / "secret.lib")
    (folder / "main.cir").write_text(f"t\n.include {written}\n")
    deck = read_deck(folder / "main.cir")
    assert lines(deck) == []
    assert deck.problems[0].rule == "netlist-include"


def test_user_can_open_a_wider_root(tmp_path):
    """With a root above, the neighbour's library is read."""
    (tmp_path / "shared.lib").write_text("R9 x 0 1k\n")
    (tmp_path / "deck").mkdir()
    (tmp_path / "deck" / "main.cir").write_text("t\n.include ../shared.lib\n")
    assert lines(read_deck(tmp_path / "deck" / "main.cir", root=tmp_path)) == ["R9 x 0 1k"]


def test_library_section(tmp_path):
    """Only the named section of a .lib is taken."""
    (tmp_path / "p.lib").write_text(".lib tt\nR1 a 0 1k\n.endl\n.lib ff\nR2 a 0 2k\n.endl ff\n")
    (tmp_path / "main.cir").write_text("t\n.lib 'p.lib' FF\n")
    assert lines(read_deck(tmp_path / "main.cir")) == ["R2 a 0 2k"]


def test_control_block_is_skipped_and_never_run():
    """What stands between .control and .endc is no card."""
    assert lines(deck_from_text("t\n.control\nR7 a 0 1\nshell rm x\n.endc\nR1 a 0 1k\n")) == [
        "R1 a 0 1k"
    ]


def test_cards_behind_the_end_are_told():
    """They are not read."""
    deck = deck_from_text("t\nR1 a 0 1k\n.end\nR2 a 0 2k\n")
    assert lines(deck) == ["R1 a 0 1k"]
    assert deck.problems[0].rule == "netlist-end"


@pytest.mark.parametrize(
    "data",
    [
        b"PK\x03\x04" + bytes(50),
        b"<?xml version='1.0'?>",
        b"",
        bytes(range(256)) * 9,
        b"(kicad_sch",
    ],
)
def test_what_is_no_netlist_is_one_problem(tmp_path, data):
    """One sentence, no card errors."""
    path = tmp_path / "x.lib"
    path.write_bytes(data)
    deck = read_deck(path)
    assert not deck.readable
    assert [p.rule for p in deck.problems] == ["netlist-unreadable"]


def test_size_bound_is_a_problem(tmp_path):
    """A file beyond the bound is named, not read."""
    path = tmp_path / "big.cir"
    path.write_text("t\n" + "R1 a 0 1k\n" * 100)
    deck = read_deck(path, Bounds(file_bytes=100))
    assert not deck.readable
    assert "100" in deck.problems[0].message


def test_texts_are_kept_as_they_were_read(tmp_path):
    """A report shows the lines that locations speak of, of the deck and of what it includes."""
    (tmp_path / "low.inc").write_bytes(b"C1 out 0 100n ; \xb5\r\n")
    (tmp_path / "gauge.cir").write_text("gauge\nR1 in out 1k\n.include low.inc\n.end\n")
    deck = read_deck(tmp_path / "gauge.cir")
    assert tuple(deck.texts) == deck.files
    for line in deck.lines:
        shown = physical_lines(deck.texts[line.file])
        assert shown[line.location.line - 1].startswith(line.text.split()[0])
