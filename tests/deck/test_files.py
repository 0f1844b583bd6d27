"""Files in: encodings, includes, bounds."""

import pytest

from railguard.deck.bounds import Bounds
from railguard.deck.encoding import decode
from railguard.deck.files import deck_from_text, read_deck
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


@pytest.mark.parametrize(
    ("name", "data", "what"),
    [
        ("symbols.lib", b"EESchema-LIBRARY Version 2.4\n#\n# TL072\n", "symbol library"),
        ("board.net", b"(export (version D)\n (design\n", "another format"),
        ("page.cir", b"<!DOCTYPE html>\n<html>", "web page"),
        ("sheet.cir", b"Version 4\r\nSHEET 1 880 680\r\n", "schematic"),
        ("secret.lib", b"* vendor\n" + b"0123456789abcdef0123456789abcdef0123\n" * 9, "encrypted"),
        ("amp.sub", b"<Binary File>\n" + bytes(200), "binary"),
        ("run.out", b"Circuit: gauge\n\nDoing analysis at TEMP = 27.0\n", "listing"),
    ],
)
def test_what_it_is_instead_is_named(tmp_path, name, data, what):
    """A file of another kind is one sentence, as a deck and as an include."""
    path = tmp_path / name
    path.write_bytes(data)
    deck = read_deck(path)
    assert not deck.readable
    assert what in deck.problems[0].message
    (tmp_path / "main.cir").write_text(f"t\n.include {name}\nR1 a 0 1k\n")
    deck = read_deck(tmp_path / "main.cir")
    assert lines(deck) == ["R1 a 0 1k"]
    assert [p.rule for p in deck.problems] == ["netlist-include"]
    assert what in deck.problems[0].message


def test_file_outside_is_not_told_to_be_there(tmp_path):
    """Whether it exists is no business of a netlist's; the chain of includes is shown."""
    folder = tmp_path / "deck"
    (folder / "lib").mkdir(parents=True)
    (tmp_path / "there.lib").write_text("R9 x 0 1k\n")
    (folder / "lib" / "a.lib").write_text(".include ../../there.lib\n.include ../../not.lib\n")
    (folder / "main.cir").write_text("t\n.include lib/a.lib\nR1 a 0 1k\n")
    there, missing = read_deck(folder / "main.cir").problems
    assert there.message.replace("there.lib", "") == missing.message.replace("not.lib", "")
    assert "a.lib which is included by main.cir" in there.message


@pytest.mark.parametrize(
    ("card", "target"),
    [
        (".include C:\\Program Files (x86)\\models\\standard.dio", "standard.dio"),
        (".lib C:\\Program Files\\lib\\cmp\\standard.bjt", "standard.bjt"),
        (".lib //server/models/x.lib tt", "x.lib"),
        (".include https://example.org/x.lib", "x.lib"),
    ],
)
def test_paths_of_other_computers(tmp_path, card, target):
    """They are named whole, never followed, and cost only what stands in them."""
    (tmp_path / "main.cir").write_text(f"t\n{card}\nR1 a 0 1k\n")
    deck = read_deck(tmp_path / "main.cir")
    assert lines(deck) == ["R1 a 0 1k"]
    (problem,) = deck.problems
    assert "stands on another computer" in problem.message
    assert problem.remedy.startswith(f"Put {target} beside")
    assert problem.severity == "minor"


def test_include_depth_is_bounded(tmp_path):
    """Files that include the next one, further than the bound."""
    for k in range(8):
        (tmp_path / f"a{k}.lib").write_text(f".include a{k + 1}.lib\n")
    (tmp_path / "main.cir").write_text("t\n.include a0.lib\n")
    deck = read_deck(tmp_path / "main.cir", Bounds(include_depth=4))
    assert [p.rule for p in deck.problems] == ["netlist-bound"]
    assert "include-depth" in deck.problems[0].remedy


def test_library_read_whole_leaves_its_sections_out(tmp_path):
    """Nobody asked for one of them."""
    (tmp_path / "p.lib").write_text(
        "R0 a 0 1\n.lib tt\nR1 a 0 1k\n.endl\n.lib ff\nR2 a 0 2k\n.endl\n"
    )
    (tmp_path / "main.cir").write_text("t\n.lib p.lib\n")
    deck = read_deck(tmp_path / "main.cir")
    assert lines(deck) == ["R0 a 0 1"]
    assert [r.message[:28] for r in deck.remarks] == ["No card asks for the section"] * 2


@pytest.mark.parametrize(
    ("title", "told"),
    [
        ("R9 a b 1k", True),
        ("VX x 0 5", True),
        ("RC filter at 1kHz", False),
        ("Low pass filter 1kHz", False),
        ("dc loop with .param change", False),
        ("RING OSCILLATOR - 2UM DEVICES", False),
    ],
)
def test_card_on_the_title_line(title, told):
    """A card is told, a sentence about the circuit is none."""
    deck = deck_from_text(f"{title}\nR1 a 0 1k\n")
    assert [p.rule for p in deck.problems] == ["netlist-title"] * told
