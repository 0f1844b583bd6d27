"""Reports of an audit: complete, safe to open, and the same for the same files."""

import csv
import io
import sqlite3
from contextlib import closing
from html.parser import HTMLParser
from pathlib import Path

import pytest
from click.testing import CliRunner

from railguard.audit.read import Base
from railguard.audit.store import Store
from railguard.commands.audit import audit
from railguard.errors import UsageError
from tests.audit.designs import BARE, CLIPPED, SOUND, UNKNOWN, put

HOSTILE = "<script>alert(1)</script>\x1b[31m"


@pytest.fixture
def audited(tmp_path, run_audit):
    """A small archive, audited."""
    share = put(
        tmp_path / "share",
        **{
            "sound.cir": SOUND,
            "=clipped.cir": CLIPPED,
            "bare.cir": BARE,
            "un.cir": UNKNOWN,
            "pic.cir": "\x00\x01\x02" * 100,
        },
    )
    return run_audit(share)


def test_the_terminal_names_designs_evidence_and_devices(audited):
    """What would fail, why, which device to describe, what was not read."""
    text = audited.text()
    assert "4 designs: 2 on hold" in text
    assert text.index("=clipped.cir") < text.index("bare.cir")
    assert "is asked for" in text
    assert "ZZ9101" in text
    assert "pic.cir" in text
    assert max(map(len, text.splitlines())) <= 80


def test_csv_has_a_row_for_each_finding(audited):
    """And one for a design without any; no cell is a formula."""
    rows = list(csv.DictReader(io.StringIO(audited.text("--as", "csv"))))
    document = audited.export()
    expected = sum(max(len(d["findings"]), 1) for d in document["designs"])
    assert len(rows) == expected
    assert {r["design"] for r in rows} == {"sound.cir", "'=clipped.cir", "bare.cir", "un.cir"}
    (worst,) = [r for r in rows if r["rule"] == "headroom-output"]
    assert float(worst["margin"]) < 0


class Tags(HTMLParser):
    """Collects a page's tags and its text."""

    def __init__(self):
        super().__init__()
        self.tags, self.said = [], ""

    def handle_starttag(self, tag, attrs):
        """Keep a tag."""
        self.tags.append(tag)
        assert not any(
            name.startswith("on") or "javascript" in (value or "") for name, value in attrs
        )

    def handle_data(self, data):
        """Keep text."""
        self.said += data


def test_html_is_whole_and_harmless(tmp_path, run_audit):
    """Nothing of a netlist becomes part of the page, and the page loads nothing."""
    share = put(tmp_path / "share")
    share.mkdir()
    hostile = CLIPPED.replace("XU1", "XU<script>").replace("gauge input", HOSTILE)
    (share / "a<b>&.cir").write_text(hostile)
    (share / "x.cir").write_text(UNKNOWN.replace("ZZ9101", "<img/src=x>"))
    audited = run_audit(share)
    page = audited.text("--as", "html")
    seen = Tags()
    seen.feed(page)
    assert "script" not in seen.tags
    assert "img" not in seen.tags
    assert "\x1b" not in page
    assert "a<b>&.cir" in seen.said
    assert "http" not in page.replace("http-equiv", "")


def test_reports_go_into_files(audited, tmp_path):
    """Whole or not at all."""
    target = tmp_path / "page.html"
    result = CliRunner().invoke(
        audit, ["report", str(audited.base), "--as", "html", "--to", str(target)]
    )
    assert result.exception is None
    assert target.read_text().rstrip().endswith("</html>")


def test_what_changed(tmp_path, run_audit):
    """New, gone and worse, against an earlier audit."""
    share = put(
        tmp_path / "share",
        **{"a.cir": CLIPPED, "b.cir": SOUND, "c.cir": CLIPPED, "d.cir": BARE, "same.cir": BARE},
    )
    older = run_audit(share, base="older.sqlite")
    put(share, **{"a.cir": SOUND, "b.cir": CLIPPED, "e.cir": BARE})
    (share / "c.cir").write_text(CLIPPED.replace("2000k", "4000k"))
    (share / "d.cir").unlink()
    newer = run_audit(share, base="newer.sqlite")
    changes = newer.export("--against", older.base)["changes"]
    found = {
        (one["change"], one["path"])
        for one in changes["changed"]
        if one["rule"] in ("headroom-output", "decoupling-absent")
    }
    assert found == {
        ("gone", "a.cir"),
        ("new", "b.cir"),
        ("worse", "c.cir"),
        ("gone", "d.cir"),
        ("new", "e.cir"),
    }
    assert (changes["designs_new"], changes["designs_gone"]) == (["e.cir"], ["d.cir"])
    text = newer.text("--against", older.base)
    assert "1 design more, 1 design gone" in text
    assert newer.text("--as", "csv", "--against", older.base).count("worse,c.cir") >= 1
    assert "worse" in newer.text("--as", "html", "--against", older.base)


def test_nothing_changed(tmp_path, run_audit):
    """Two audits of the same files differ in nothing."""
    share = put(tmp_path / "share", **{"a.cir": CLIPPED, "b.cir": BARE})
    older = run_audit(share, base="older.sqlite")
    newer = run_audit(share, base="newer.sqlite")
    assert newer.export("--against", older.base)["changes"]["changed"] == []
    assert newer.text("--as", "json") == older.text("--as", "json")


def test_a_file_that_is_no_audit_is_refused(tmp_path):
    """With the command that makes one."""
    (tmp_path / "text.txt").write_text("no audit\n" * 100)
    result = CliRunner().invoke(audit, ["report", str(tmp_path / "text.txt")])
    assert isinstance(result.exception, UsageError)
    assert "is no audit's file" in str(result.exception)


@pytest.mark.skipif(not Path("/proc/self/fd").is_dir(), reason="no list of open files here")
@pytest.mark.parametrize("opened", [Base, Store])
@pytest.mark.parametrize("kind", ["text", "another database", "another format"])
def test_a_file_that_is_refused_is_let_go(tmp_path, opened, kind):
    """Neither the file nor its lock stays open: on some systems nobody could move it."""
    place = tmp_path / "refused"
    if kind == "text":
        place.write_text("no audit\n" * 100)
    else:
        with closing(sqlite3.connect(place)) as base:
            table = "mine" if kind == "another database" else "about"
            base.execute(f"CREATE TABLE {table} (name, value)")
            base.execute(f"INSERT INTO {table} VALUES ('format', 'other/7')")
            base.commit()
    with pytest.raises(UsageError) as refused:
        opened(place)
    held = {str(link.readlink()) for link in Path("/proc/self/fd").iterdir() if link.exists()}
    assert str(place) not in held, refused.value
