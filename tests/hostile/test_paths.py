"""Paths that lead elsewhere: nothing outside the folder is read, and nothing is waited for."""

import os
import socket
import sys
import threading
from pathlib import Path

import pytest

from railguard.deck import source
from railguard.deck.files import read_deck
from railguard.reviewing import review
from tests.report import designs

GAUGE = designs.GAUGE.format(peak=0.1, load=10_000)
SECRET = "RSECRET in 0 12345\n"
POSIX = pytest.mark.skipif(os.name == "nt", reason="links, pipes and devices are those of POSIX")


@pytest.fixture
def laid(tmp_path):
    """Lay a secret outside the deck's folder, and return (deck folder, secret)."""
    folder = tmp_path / "boards"
    folder.mkdir()
    secret = tmp_path / "secret.inc"
    secret.write_text(SECRET)
    return folder, secret


def including(folder, target, card=".include"):
    """Return the review of a gauge in a folder that includes a file."""
    deck = folder / "gauge.cir"
    deck.write_bytes(
        GAUGE.replace("\n", f"\n{card} {target}\n", 1).encode("utf-8", "surrogateescape")
    )
    (found,) = review(deck).designs
    return found


def read_nothing(found, target=""):
    """Check that the secret was not read, that its loss is told, and that the rest is judged."""
    circuit = found.design.circuit
    assert "RSECRET" not in [e.designator for e in circuit.elements]
    assert len(circuit.files) == 1
    assert "netlist-include" in {f.rule for f in found.findings}
    assert [s.designator for s in found.design.stages] == ["XU1"]
    shown = " ".join(f"{f.message} {f.remedy}" for f in found.findings)
    assert "12345" not in shown


@pytest.mark.parametrize("card", [".include", ".inc", ".lib"])
@pytest.mark.parametrize(
    "spelling",
    [
        "../secret.inc",
        "..\\secret.inc",
        "./../secret.inc",
        "none/../../secret.inc",
        "../boards/../secret.inc",
        '"../secret.inc"',
        "'../secret.inc'",
        "../SECRET.INC",
        "..//secret.inc",
        "{outside}/secret.inc",
        '"{outside}/secret.inc"',
        "file://{outside}/secret.inc",
        "{outside}/boards/../secret.inc",
    ],
)
def test_a_path_out_of_the_folder_is_not_followed(laid, card, spelling):
    """However it is spelled."""
    folder, secret = laid
    read_nothing(including(folder, spelling.format(outside=secret.parent), card))


@pytest.mark.parametrize(
    "target",
    [
        "\\\\station\\share\\secret.inc",
        "//station/share/secret.inc",
        "C:\\secret.inc",
        "c:/secret.inc",
        "C:secret.inc",
        "http://gauge.example/secret.inc",
        "https://gauge.example/secret.inc",
        "ftp://gauge.example/secret.inc",
        "\\\\?\\C:\\secret.inc",
        "\\\\.\\COM1",
        "~/secret.inc",
        "~root/secret.inc",
        "$HOME/secret.inc",
        "${HOME}/secret.inc",
        "%USERPROFILE%\\secret.inc",
        "`cat secret.inc`",
        "|cat secret.inc",
    ],
)
def test_other_computers_drives_and_shells_are_not_asked(laid, monkeypatch, target):
    """No name is looked up, no connection made, no variable filled in."""

    def refuse(*given, **named):
        raise AssertionError("the network was asked")

    monkeypatch.setattr(socket, "socket", refuse)
    monkeypatch.setattr(socket, "getaddrinfo", refuse)
    folder, secret = laid
    monkeypatch.setenv("HOME", str(secret.parent))
    read_nothing(including(folder, target))


@POSIX
def test_a_link_out_of_the_folder_is_not_followed(laid):
    """Neither a link to a file nor one to a folder."""
    folder, secret = laid
    (folder / "near.inc").symlink_to(secret)
    (folder / "deep").symlink_to(secret.parent)
    read_nothing(including(folder, "near.inc"))
    read_nothing(including(folder, "deep/secret.inc"))
    read_nothing(including(folder, "DEEP/Secret.inc"))


@POSIX
def test_a_link_within_the_folder_is_followed(laid):
    """Libraries are often links."""
    folder, _ = laid
    (folder / "real.inc").write_text("RLINK in 0 10k\n")
    (folder / "link.inc").symlink_to("real.inc")
    found = including(folder, "link.inc")
    assert "RLINK" in [e.designator for e in found.design.circuit.elements]


@POSIX
def test_a_ring_of_links_ends(laid):
    """It leads nowhere."""
    folder, _ = laid
    (folder / "a.inc").symlink_to("b.inc")
    (folder / "b.inc").symlink_to("a.inc")
    read_nothing(including(folder, "a.inc"))
    (found,) = review(folder / "a.inc").designs
    assert [f.rule for f in found.findings] == ["netlist-unreadable"]


@POSIX
@pytest.mark.parametrize("device", ["/dev/zero", "/dev/stdin", "/dev/tty", "/proc/self/environ"])
def test_devices_are_not_read(laid, device):
    """A device has no end, and a terminal waits for somebody."""
    folder, _ = laid
    read_nothing(including(folder, device))
    (folder / "dev.inc").symlink_to(device)
    read_nothing(including(folder, "dev.inc"))


@POSIX
def test_a_pipe_is_not_waited_for(laid):
    """Neither as an include nor as the netlist itself."""
    folder, _ = laid
    os.mkfifo(folder / "pipe.inc")
    read_nothing(including(folder, "pipe.inc"))
    done = []
    reader = threading.Thread(
        target=lambda: done.append(review(folder / "pipe.inc").designs[0]), daemon=True
    )
    reader.start()
    reader.join(60)
    assert [d.findings[0].rule for d in done] == ["netlist-unreadable"]


@POSIX
@pytest.mark.parametrize("device", ["/dev/zero", "/dev/null", "/dev"])
def test_a_device_is_no_netlist(device):
    """It is told in one finding."""
    (found,) = review(Path(device)).designs
    assert [f.rule for f in found.findings] == ["netlist-unreadable"]


@pytest.mark.parametrize(
    "target",
    [
        "a" * 300 + ".inc",
        "a/" * 3_000 + "b.inc",
        "x" * 100_000,
        "nul\0byte.inc",
        "\udcff.inc",
        ".",
        "..",
        "/",
        "./",
        '""',
        "",
        "boards",
        "con",
        "*.inc",
        "?.inc",
    ],
)
def test_names_no_file_can_have_are_told(laid, target):
    """Too long, empty, a folder, a pattern, a character no system takes."""
    folder, _ = laid
    read_nothing(including(folder, target))


def test_where_nothing_is_read_nothing_is_looked_at(laid, monkeypatch):
    """Outside the folder not even a file's presence or a folder's list is asked for."""
    folder, secret = laid
    asked = []

    class Watching(source.Disk):
        def is_file(self, path):
            asked.append(path)
            return super().is_file(path)

        def names(self, at):
            asked.append(at)
            return super().names(at)

        def read(self, path, most):
            asked.append(path)
            return super().read(path, most)

    deck = folder / "gauge.cir"
    cards = f".include ../secret.inc\n.include {secret}\n.include ../SECRET.inc\n.lib /etc/passwd x"
    deck.write_text(GAUGE.replace("\n", f"\n{cards}\n", 1))
    read_deck(deck, files=Watching())
    assert asked
    assert all(path.resolve().is_relative_to(folder) for path in asked)


def test_whether_a_file_outside_is_there_is_not_told(laid):
    """The sentence is the same for a file that is there and for one that is not."""
    folder, _ = laid

    def told(name):
        found = including(folder, f"../{name}.inc")
        return [f.message.replace(name, "") for f in found.findings if f.rule == "netlist-include"]

    assert told("secret") == told("nothing")


@pytest.mark.skipif(sys.platform != "linux", reason="other systems refuse such names")
def test_a_netlist_of_any_name_is_reviewed(tmp_path):
    """Line breaks, escapes and bytes that are no text in a file's name."""
    for name in (b"a\nb.cir", b"\x1b[31m.cir", b"\xff\xfe.cir", "\u202e.cir".encode(), b"-rf.cir"):
        deck = tmp_path / os.fsdecode(name)
        deck.write_text(GAUGE)
        (found,) = review(deck).designs
        assert [s.designator for s in found.design.stages] == ["XU1"]
