"""Archives: read as folders, bounded in every direction."""

import bz2
import gzip
import io
import lzma
import tarfile
import zipfile
from contextlib import closing

import pytest

from railguard.audit.archives import ArchiveError, opened
from railguard.audit.trees import Trees
from railguard.audit.wire import Budget, Task


def zipped(files, compression=zipfile.ZIP_DEFLATED):
    """Return a zip archive of files by name."""
    out = io.BytesIO()
    with zipfile.ZipFile(out, "w", compression) as archive:
        for name, data in files.items():
            archive.writestr(name, data)
    return out.getvalue()


def tarred(files, mode="w"):
    """Return a tar archive of files by name."""
    out = io.BytesIO()
    with tarfile.open(fileobj=out, mode=mode) as archive:
        for name, data in files.items():
            info = tarfile.TarInfo(name)
            info.size = len(data)
            archive.addfile(info, io.BytesIO(data))
    return out.getvalue()


def content(archive, name):
    """Return a file of an archive."""
    with archive.open(name) as file:
        return file.read()


FILES = {"a.cir": b"deck", "lib/b.lib": b"models"}


@pytest.mark.parametrize(
    ("name", "data"),
    [
        ("x.zip", zipped(FILES)),
        ("x.tar", tarred(FILES)),
        ("x.tar.gz", tarred(FILES, "w:gz")),
        ("x.tgz", tarred(FILES, "w:gz")),
        ("x.tar.bz2", tarred(FILES, "w:bz2")),
        ("x.txz", tarred(FILES, "w:xz")),
    ],
)
def test_every_kind_is_read(name, data):
    """Names and contents, in any order and twice."""
    with closing(opened(io.BytesIO(data), name, Budget())) as archive:
        assert archive.names == ("a.cir", "lib/b.lib")
        for _ in range(2):
            assert content(archive, "lib/b.lib") == b"models"
            assert content(archive, "a.cir") == b"deck"


@pytest.mark.parametrize(
    ("name", "data"),
    [
        ("a.cir.gz", gzip.compress(b"deck", mtime=0)),
        ("a.cir.bz2", bz2.compress(b"deck")),
        ("a.cir.xz", lzma.compress(b"deck")),
    ],
    ids=["gz", "bz2", "xz"],  # the bytes hold the second they were made in
)
def test_a_file_compressed_alone(name, data):
    """It stands inside under its own name."""
    with closing(opened(io.BytesIO(data), name, Budget())) as archive:
        assert archive.names == ("a.cir",)
        assert content(archive, "a.cir") == content(archive, "a.cir") == b"deck"


@pytest.mark.parametrize("name", ["x.zip", "x.tar", "x.gz", "x.bz2", "x.xz", "x.tgz"])
@pytest.mark.parametrize("data", [b"no archive at all", b"PK\3\4broken", b"\x1f\x8b\x08\0"])
def test_damage_is_a_sentence(name, data):
    """Never an exception of the library's."""
    try:
        with closing(opened(io.BytesIO(data), name, Budget())) as archive:
            names = archive.names
    except ArchiveError as error:
        names, sentence = (), str(error)
        assert sentence.endswith(".")
    assert names == ()


def test_bounds_on_bytes_and_files():
    """A bomb is not unpacked."""
    bomb = zipped({"a.cir": b"\0" * 5_000_000})
    with pytest.raises(ArchiveError, match="would unpack to 5,000,000 bytes"):
        opened(io.BytesIO(bomb), "x.zip", Budget(unpacked=1_000_000))
    with pytest.raises(ArchiveError, match="unpacks to more than the 1,000,000 bytes"):
        opened(io.BytesIO(gzip.compress(b"\0" * 5_000_000)), "x.gz", Budget(unpacked=1_000_000))
    many = {f"{k}.cir": b"" for k in range(30)}
    for name, data in (("x.zip", zipped(many)), ("x.tar", tarred(many))):
        with pytest.raises(ArchiveError, match="more than 20 files"):
            opened(io.BytesIO(data), name, Budget(members=20))


def test_paths_that_lead_out_are_refused():
    """`..` never leaves the archive, and links are not followed."""
    out = io.BytesIO()
    with tarfile.open(fileobj=out, mode="w") as archive:
        archive.addfile(tarfile.TarInfo("../../etc/passwd"))
        link = tarfile.TarInfo("link.cir")
        link.type, link.linkname = tarfile.SYMTYPE, "/etc/passwd"
        archive.addfile(link)
        archive.addfile(tarfile.TarInfo("/abs/a.cir"))
    out.seek(0)
    with closing(opened(out, "x.tar", Budget())) as found:
        assert found.names == ("abs/a.cir",)
        assert [path for path, _ in found.refused] == ["passwd", "link.cir"]


def test_archives_in_archives(tmp_path):
    """To the bound, and no deeper."""
    data = FILES["a.cir"]
    name = "a.cir"
    names = []
    for k in range(4):
        data, name = zipped({name: data}), f"{k}.zip"
        names.insert(0, name)
    (tmp_path / name).write_bytes(data)
    with closing(Trees((str(tmp_path),), Budget(nested=3))) as trees:
        tops, path = (), ""
        for depth, top in enumerate(names):
            path = f"{path}/{top}" if path else top
            task = Task(0, path, tops, opens=True)
            if depth < 3:
                assert len(trees.archive(task).names) == 1
            else:
                with pytest.raises(ArchiveError, match="deeper than 3"):
                    trees.archive(task)
            tops = (*tops, path)
