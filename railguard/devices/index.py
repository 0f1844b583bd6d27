"""Makes `data/index.json` from the families' tables: `python -m railguard.devices.index`.

Run it after adding or renaming a family; a test holds the index equal to the tables.
"""

import tomllib
from pathlib import Path

import msgspec

from railguard.devices.catalogue import DATA, Index, IndexEntry, read_family_file


def family_files() -> tuple[Path, ...]:
    """Return every family's file, in a fixed order."""
    return tuple(sorted(path for path in DATA.glob("*/*.toml")))


def build() -> Index:
    """Read all tables into the index."""
    entries = {}
    for path in family_files():
        table = read_family_file(path)
        entries[table.family] = IndexEntry(
            file=path.relative_to(DATA).as_posix(),
            names={channels: tuple(bases) for channels, bases in table.names.items()},
        )
    named = tomllib.loads((DATA / "named.toml").read_text(encoding="utf-8"))
    return Index(
        families=dict(sorted(entries.items(), key=lambda item: item[0].lower())),
        named_only={int(count): tuple(names) for count, names in named["names"].items()},
    )


def encode(index: Index) -> bytes:
    """Return the file's bytes."""
    return msgspec.json.format(msgspec.json.encode(index), indent=1) + b"\n"


if __name__ == "__main__":
    (DATA / "index.json").write_bytes(encode(build()))
