"""The catalogue: families by name, loaded one by one when they are asked for.

`data/` holds one TOML file per family, the truth. `data/index.json` is made from them (and a test
holds it equal): which names lead to which family, so that reading one netlist costs one or two
small TOML files, not all of them.
"""

import tomllib
from collections.abc import Iterator, Mapping, Sequence
from functools import cache, lru_cache
from pathlib import Path

import msgspec

from railguard.devices import match as matching
from railguard.devices.layout import FamilyTable, read_table
from railguard.devices.model import Device, Match
from railguard.devices.tables import device_of
from railguard.errors import CatalogueError
from railguard.location import Location

DATA = Path(__file__).parent / "data"
"""Where the families' tables stand: beside this file in every kind of install."""


class IndexEntry(msgspec.Struct, frozen=True):
    """Where a family stands and what its order codes begin with, by channels."""

    file: str
    names: dict[int, tuple[str, ...]]


class Index(msgspec.Struct, frozen=True):
    """Every family of the catalogue, and op-amps known by name without figures."""

    families: dict[str, IndexEntry]
    named_only: dict[int, tuple[str, ...]] = {}


class Catalogue:
    """Families of the shipped catalogue, with the user's own before them."""

    def __init__(
        self,
        index: Index,
        names: matching.Names,
        user: Mapping[str, Device],
        listed: Mapping[str, Mapping[int, tuple[str, ...]]],
    ) -> None:
        """Take what `load` made; tables are read when first asked for."""
        self._index = index
        self._user = user
        self._listed = listed
        self._names = names

    def match(self, name: str, *, suggest: bool = True) -> Match:
        """Say what a name in a netlist stands for; with the nearest name, where it is wanted."""
        found = matching.identify(name, self._names, suggest=suggest)
        return Match(
            name=name,
            sort=found.sort,
            device=self.device(found.family) if found.family else None,
            channels=found.channels,
            also=found.also,
            nearest=found.nearest,
        )

    def families(self) -> tuple[str, ...]:
        """Return every family's name, sorted; the user's own among them."""
        return tuple(sorted({*self._index.families, *self._user}, key=str.lower))

    def order_codes(self, family: str) -> tuple[str, ...]:
        """Return what the order codes of a family begin with, as its table lists them."""
        entry = self._index.families.get(family)
        listed = self._listed.get(family) or (entry.names if entry else {})
        return tuple(base for bases in listed.values() for base in bases) or (family,)

    def device(self, family: str) -> Device:
        """Return a family's figures.

        Raises:
            CatalogueError: there is no such family.
        """
        if family in self._user:
            return self._user[family]
        entry = self._index.families.get(family)
        if entry is None:
            raise CatalogueError(f"There is no family {family} in the catalogue.")
        return _shipped_device(entry.file)


def load(user: Sequence[tuple[Mapping[str, object], Location]] = ()) -> Catalogue:
    """Load the catalogue with the user's tables on top.

    A user's table of a family the catalogue has changes the fields it states and leaves the others;
    any other table is a new family, matched by its `names` (its own name where it states none).

    Raises:
        CatalogueError: a table that cannot be used, with the place of it.
    """
    index, shipped = _shipped()
    names = matching.Names(dict(shipped.bases), {k: [*v] for k, v in shipped.also.items()})
    devices: dict[str, Device] = {}
    listed: dict[str, Mapping[int, tuple[str, ...]]] = {}
    for data, location in user:
        table, device = _user_device(data, location, index)
        if table.family in devices:
            raise CatalogueError(
                f"{table.family} is described twice.", location, "Keep one of the two tables."
            )
        devices[table.family] = device
        listed[table.family] = table.names
        _register_user(names, table, table.family in index.families)
    return Catalogue(index, names, devices, listed)


@lru_cache(maxsize=1)
def _shipped() -> tuple[Index, matching.Names]:
    """Return the index and the names it lists; read once in a process, never changed."""
    index = msgspec.json.decode((DATA / "index.json").read_bytes(), type=Index)
    names = matching.Names()
    for family, entry in index.families.items():
        _register(names, family, entry.names)
    for channels, bases in index.named_only.items():
        for base in _spelled_out(bases):
            names.bases[base] = ("", channels)
    return index, names


def _register(names: matching.Names, family: str, listed: Mapping[int, Sequence[str]]) -> None:
    for channels, bases in listed.items():
        for base in _spelled_out(bases):
            names.bases[base] = (family, channels or None)


def _register_user(names: matching.Names, table: FamilyTable, shipped: bool) -> None:
    """Let a user's table claim its names, and its family's name; say which family had them."""
    listed = [
        (matching.normalised(base), channels or None)
        for channels, bases in table.names.items()
        for base in _spelled_out(bases)
    ]
    if not shipped:
        counts = set(table.names)
        count = (counts.pop() or None) if len(counts) == 1 else None
        listed.append((matching.normalised(table.family), count))
    for base, channels in listed:
        earlier = names.bases.get(base)
        if earlier and earlier[0] not in ("", table.family):
            names.also.setdefault(base, []).append(earlier[0])
        if earlier is None or earlier[0] != table.family:
            names.bases[base] = (table.family, channels)


def _spelled_out(bases: Sequence[str]) -> Iterator[str]:
    """Yield every name a list stands for: `TL07[124]` is three."""
    for base in bases:
        if "[" in base:
            yield from matching.spell_out(base)
        else:
            yield base.upper()


def read_family_file(path: Path) -> FamilyTable:
    """Read one family's TOML file."""
    place = Location(file=str(path), line=1)
    try:
        data = tomllib.loads(path.read_text(encoding="utf-8"))
    except tomllib.TOMLDecodeError as wrong:
        raise CatalogueError(f"{path.name} is not TOML: {wrong}.", place) from wrong
    return read_table(data, place)


@cache
def _shipped_device(file: str) -> Device:
    """Read a family's figures, once in a process: a bulk run meets the same few over and over."""
    return device_of(read_family_file(DATA / file))


def _user_device(
    data: Mapping[str, object], location: Location, index: Index
) -> tuple[FamilyTable, Device]:
    # Imported here: schema checks are for tables of unknown quality, not for every start.
    from railguard.devices.schema import faults

    table = read_table(data, location)
    stated = device_of(table, location, stated_by_user=True)
    entry = index.families.get(table.family)
    if entry is not None:
        shipped = _shipped_device(entry.file)
        changed = {
            field: getattr(stated, field)
            for field in (*data, *_derived(data))
            if field in Device.__struct_fields__
        }
        stated = msgspec.structs.replace(shipped, **changed, location=location)
    wrong = faults(stated)
    if wrong:
        raise CatalogueError(
            f"The device table of {table.family} describes no possible device: {wrong[0]}.",
            location,
            "Check the figure and its unit (all are SI: volts, amperes, hertz, volts per second).",
        )
    return table, stated


def _derived(data: Mapping[str, object]) -> tuple[str, ...]:
    """Name the device's fields that follow from other fields of a table."""
    found: tuple[str, ...] = ()
    if "supply" in data:
        found += ("supply_low", "supply_high", "supply_absolute", "supply_basis")
    if "theta" in data:
        found += ("theta_basis",)
    return found
