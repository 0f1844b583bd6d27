"""An audit of a folder: what is found, what is reviewed, what is passed by."""

import gzip
import io
import os
import zipfile

import pytest

from tests.audit.designs import BARE, CLIPPED, LIBRARY, SOUND, UNKNOWN, put
from tests.audit.test_archives import tarred, zipped

BOARD = CLIPPED.replace(".end\n", "")
IDS = "SELECT path, id FROM file"

BENCH = 'bench of the board\n.include "board.net"\n.tran 1u 10m\n.end\n'


def test_designs_libraries_and_other_files(tmp_path, run_audit):
    """Found by ending and by content, ranked worst first."""
    put(
        tmp_path / "share",
        **{
            "a/sound.cir": SOUND,
            "a/clipped.txt": CLIPPED,
            "b/bare.old": BARE,
            "b/models.lib": LIBRARY,
            "b/notes.txt": "nothing of use\n",
        },
    )
    found = run_audit(tmp_path / "share").export()
    assert [d["path"] for d in found["designs"]] == ["a/clipped.txt", "b/bare.old", "a/sound.cir"]
    assert [d["verdict"] for d in found["designs"]] == ["hold", "hold", "pass"]
    assert found["designs"][0]["findings"][0]["rule"] == "headroom-output"
    assert found["designs"][0]["findings"][0]["device"] == "TL07x"
    assert (found["libraries"], found["other_files"], found["complete"]) == (1, 1, True)


def test_a_deck_of_analyses_is_paired_with_its_netlist(tmp_path, run_audit):
    """The included board is no design of its own; the deck that runs it stands for it."""
    put(tmp_path / "share", **{"bench.cir": BENCH, "board.net": BOARD, "alone.cir": SOUND})
    audited = run_audit(tmp_path / "share")
    ranked = {d["path"]: d["circuit"] for d in audited.export()["designs"]}
    assert ranked == {"bench.cir": "board.net", "alone.cir": ""}
    assert audited.export()["included"] == 1


def test_two_decks_that_include_each_other_leave_one(tmp_path, run_audit):
    """A circle does not make both vanish."""
    put(
        tmp_path / "share",
        **{
            "a.cir": SOUND.replace(".end\n", ".include b.cir\n"),
            "b.cir": SOUND.replace(".end\n", ".include a.cir\n"),
        },
    )
    assert [d["path"] for d in run_audit(tmp_path / "share").export()["designs"]] == ["a.cir"]


def test_archives_are_folders(tmp_path, run_audit):
    """Zip, tar and gz, with includes inside them."""
    share = put(tmp_path / "share", **{"plain.cir": SOUND})
    inside = {"bench.cir": BENCH.encode(), "board.net": BOARD.encode()}
    (share / "old.zip").write_bytes(zipped(inside))
    (share / "older.tar.gz").write_bytes(tarred({"x/sound.cir": SOUND.encode()}, "w:gz"))
    (share / "one.cir.gz").write_bytes(gzip.compress(CLIPPED.encode()))
    (share / "nested.zip").write_bytes(zipped({"in.zip": zipped({"d.cir": SOUND.encode()})}))
    found = run_audit(share).export()
    assert {d["path"]: d["verdict"] for d in found["designs"]} == {
        "old.zip/bench.cir": "hold",
        "one.cir.gz/one.cir": "hold",
        "older.tar.gz/x/sound.cir": "pass",
        "nested.zip/in.zip/d.cir": "pass",
        "plain.cir": "pass",
    }
    assert found["designs"][0]["circuit"] or found["designs"][1]["circuit"] == "old.zip/board.net"


def test_includes_stay_below_the_root(tmp_path, run_audit):
    """A library beside the deck's folder is read; one above the root, or linked to, is not."""
    put(tmp_path, **{"secret.lib": "R99 a 0 1k\n", "share/lib/models.lib": "R98 a 0 1k\n"})
    share = tmp_path / "share"
    for name, target in (
        ("inside", "../lib/models.lib"),
        ("above", "../../secret.lib"),
        ("link", "link.lib"),
    ):
        put(share, **{f"d/{name}.cir": SOUND.replace(".end", f".include {target}\n.end")})
    (share / "d" / "link.lib").symlink_to(tmp_path / "secret.lib")
    audited = run_audit(share)
    rules = {d["path"]: {f["rule"] for f in d["findings"]} for d in audited.export()["designs"]}
    assert "netlist-include" not in rules["d/inside.cir"]
    assert "netlist-include" in rules["d/above.cir"]
    assert "netlist-include" in rules["d/link.cir"]


def test_what_cannot_be_read_is_recorded_and_passed_by(tmp_path, run_audit):
    """A long netlist, a bomb, a pipe, a loop of folders, damage: each with its reason."""
    share = put(tmp_path / "share", **{"sound.cir": SOUND})
    with (share / "long.cir").open("w") as file:
        file.write("a netlist of 50 MB\n")
        line = "R{0} a{0} b{0} 1k\n" * 100
        while file.tell() < 50_000_000:
            file.write(line)
    bomb = io.BytesIO()
    with zipfile.ZipFile(bomb, "w", zipfile.ZIP_DEFLATED) as archive:
        for k in range(12):
            with archive.open(f"{k}.cir", "w") as member:
                for _ in range(100):
                    member.write(b"\0" * 1_000_000)
    (share / "bomb.zip").write_bytes(bomb.getvalue())
    assert len(bomb.getvalue()) < 2_000_000
    os.mkfifo(share / "pipe.cir")
    (share / "loop").mkdir()
    (share / "loop" / "again").symlink_to(share, target_is_directory=True)
    (share / "damaged.zip").write_bytes(b"PK\3\4 and nothing")
    (share / "picture.cir").write_bytes(b"\x89PNG\r\n\x1a\n" + bytes(range(256)) * 40)
    audited = run_audit(share)
    reasons = audited.reasons
    assert "larger than the 32,000,000 bytes" in reasons["long.cir"]
    assert "would unpack to 1,200,000,000 bytes" in reasons["bomb.zip"]
    assert "pipe" in reasons["pipe.cir"]
    assert "no link is followed" in reasons["loop/again"]
    assert "damaged" in reasons["damaged.zip"]
    assert "binary" in reasons["picture.cir"]
    assert audited.states["sound.cir"] == "design"
    listed = {entry["path"] for entry in audited.export()["not_read"]}
    assert listed == set(reasons)


def test_patterns_are_skipped(tmp_path, run_audit):
    """By name or by path, inside archives too."""
    share = put(
        tmp_path / "share",
        **{"a/x.cir": SOUND, "b/x.cir": SOUND, "b/trial.cir": SOUND, ".git/x.cir": SOUND},
    )
    (share / "old.zip").write_bytes(zipped({"trial.cir": SOUND.encode(), "y.cir": SOUND.encode()}))
    audited = run_audit(share, options=("--skip", "a", "--skip", "trial*"))
    designs = {path for path, state in audited.states.items() if state == "design"}
    assert designs == {"b/x.cir", "old.zip/y.cir"}


def test_settings_below_the_root_are_seen_and_not_obeyed(tmp_path, run_audit):
    """Unless they are trusted."""
    share = put(
        tmp_path / "share",
        **{"d/clipped.cir": CLIPPED, "d/railguard.toml": '[review]\nhold-at = "critical"\n'},
    )
    bare = put(share, **{"d/bare.cir": BARE}) and run_audit(share)
    assert {d["path"]: d["verdict"] for d in bare.export()["designs"]}["d/bare.cir"] == "hold"
    assert bare.export()["settings_files"] == ["d/railguard.toml"]
    assert not bare.export()["settings_obeyed"]
    assert "not obeyed" in bare.text()
    trusted = run_audit(share, options=("--trust-settings",))
    assert {d["path"]: d["verdict"] for d in trusted.export()["designs"]}["d/bare.cir"] != "hold"
    assert trusted.export()["settings_obeyed"]


def test_settings_that_cannot_be_obeyed_cost_their_designs_only(tmp_path, run_audit):
    """A trusted file with a mistake in it is the reason its designs were not reviewed."""
    share = put(
        tmp_path / "share",
        **{"d/a.cir": SOUND, "d/railguard.toml": "[review\n", "e/b.cir": SOUND},
    )
    audited = run_audit(share, options=("--trust-settings",))
    assert audited.states == {"d/a.cir": "unreadable", "e/b.cir": "design"}
    assert "no valid TOML" in audited.reasons["d/a.cir"]


def test_unknown_devices_are_counted(tmp_path, run_audit):
    """The one most designs name comes first."""
    other = UNKNOWN.replace("ZZ9101", "ZZ7000")
    share = put(tmp_path / "share", **{"a.cir": UNKNOWN, "b.cir": UNKNOWN, "c.cir": other})
    found = run_audit(share).export()["unknown_devices"]
    assert [(d["name"], d["designs"]) for d in found] == [("ZZ9101", 2), ("ZZ7000", 1)]


def test_unchanged_files_are_not_reviewed_again(tmp_path, run_audit):
    """Content of deck and includes decides, whatever the clock says."""
    share = put(
        tmp_path / "share",
        **{
            "a.cir": SOUND.replace(".end", ".include x.inc\n.end"),
            "b.cir": SOUND,
            "x.inc": "R50 a 0 1k\nR51 a 0 1k\n",
        },
    )
    audited = run_audit(share)
    before = dict(audited.query(IDS))
    os.utime(share / "b.cir", (1, 1))
    again = dict(run_audit(share).query(IDS))
    assert again == before
    (share / "x.inc").write_text("R50 a 0 2k\nR51 a 0 1k\n")
    after = dict(run_audit(share).query(IDS))
    assert after["b.cir"] == before["b.cir"]
    assert after["a.cir"] != before["a.cir"]
    settings = tmp_path / "mine.toml"
    settings.write_text('[review]\nhold-at = "minor"\n')
    last = dict(
        run_audit(share, options=("--settings", settings)).query("SELECT path,id FROM file")
    )
    assert last["b.cir"] != before["b.cir"]


def test_a_file_that_is_gone_is_forgotten(tmp_path, run_audit):
    """With everything that hung on it."""
    share = put(tmp_path / "share", **{"a.cir": CLIPPED, "b.cir": SOUND})
    run_audit(share)
    (share / "a.cir").unlink()
    audited = run_audit(share)
    assert list(audited.states) == ["b.cir"]
    assert audited.query("SELECT COUNT(*) FROM finding WHERE rule = 'headroom-output'") == [(0,)]


def test_several_roots_have_names_of_their_own(tmp_path, run_audit):
    """Two folders of one name are told apart; a root may be a file."""
    put(tmp_path, **{"x/boards/a.cir": SOUND, "y/boards/a.cir": CLIPPED, "z/one.cir": SOUND})
    audited = run_audit(tmp_path / "x/boards", tmp_path / "y/boards", tmp_path / "z/one.cir")
    assert set(audited.states) == {"boards/a.cir", "boards-2/a.cir", "one.cir/one.cir"}


@pytest.mark.skipif(not hasattr(os, "geteuid"), reason="needs users")
def test_an_unreadable_file_is_recorded(tmp_path):
    """As another user would meet it."""
    from railguard.audit.examine import Examiner
    from railguard.audit.wire import Plan, Task

    (tmp_path / "locked.cir").write_text(SOUND)
    (tmp_path / "locked.cir").chmod(0)
    plan = Plan(roots=(str(tmp_path),), labels=("",), day="2027-01-01", build="x")
    examiner = Examiner(plan)
    examiner.examine(Task(0, "locked.cir"))  # whoever this is, everything is loaded by now
    user = os.geteuid()
    if user == 0:
        for folder in (tmp_path, *tmp_path.parents[:2]):
            folder.chmod(0o755)
        os.seteuid(65534)
    try:
        outcome = examiner.examine(Task(0, "locked.cir"))
    finally:
        if user == 0:
            os.seteuid(user)
    assert outcome.state == "unreadable"
    assert "Permission denied" in outcome.why
