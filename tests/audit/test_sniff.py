"""What a file is, by its ending and its content."""

import pytest

from railguard.audit.sniff import is_archive, sort_of, worth_opening
from tests.audit.designs import LIBRARY, SOUND

PROSE = """Station log
Rates are given below 5 litres in the dry season.
Levels were read by hand. Change the battery in spring.
Very low water in August, 12 cm at the gauge.
"""

C_HEADER = """/* registers */
#include "io.h"
.section text
int main() { return 0; }
"""

BENCH = '* bench\n.subckt S a b\nR1 a b 1k\n.ends\n.include "board.net"\n.tran 1u 1m\n.end\n'


@pytest.mark.parametrize(
    ("name", "text", "sort"),
    [
        ("a.cir", SOUND, "netlist"),
        ("a.txt", SOUND, "netlist"),
        ("backup.old", SOUND, "netlist"),
        ("noending", SOUND, "netlist"),
        ("a.lib", LIBRARY, "library"),
        ("a.cir", LIBRARY, "library"),
        ("a.txt", PROSE, "other"),
        ("a.inc", C_HEADER, "other"),
        ("a.log", PROSE, "other"),
        ("bench.cir", BENCH, "netlist"),
        ("a.inc", "R1 a b 1k\nC1 b 0 1n\n", "netlist"),
        ("empty.txt", "", "other"),
        ("empty.cir", "", "netlist"),
    ],
)
def test_sort(name, text, sort):
    """An ending counts for a netlist's; elsewhere the content alone does."""
    assert sort_of(name, text.encode()) == sort


def test_a_circuit_behind_many_models_is_a_netlist():
    """However long the models before it are."""
    models = "".join(f".subckt M{k} a b\nR1 a b 1k\nC1 a b 1n\n.ends\n" for k in range(500))
    assert sort_of("a.lib", f"* models\n{models}".encode()) == "library"
    assert sort_of("a.cir", f"* deck\n{models}R1 in out 1k\n".encode()) == "netlist"


def test_binary_files_are_no_netlists():
    """A sure ending is reported on all the same."""
    data = b"\x7fELF\0\0\0\1" * 100
    assert sort_of("a.lib", data) == "other"
    assert sort_of("a.cir", data) == "netlist"


def test_utf_16_is_read():
    """As a Windows editor exports it."""
    assert sort_of("a.txt", SOUND.encode("utf-16")) == "netlist"


def test_endings():
    """Archives are opened; pictures are not."""
    assert is_archive("old/boards.ZIP")
    assert is_archive("a.tar.gz")
    assert not is_archive("a.cir")
    assert worth_opening("a.bak")
    assert not worth_opening("a.PDF")
