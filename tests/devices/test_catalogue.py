"""The catalogue: its families, its speed, and the user's own tables."""

import subprocess
import sys

import pytest

from railguard.devices import catalogue
from railguard.devices.catalogue import DATA, load, read_family_file
from railguard.devices.index import build, encode, family_files
from railguard.errors import CatalogueError
from railguard.location import Location

HERE = Location("railguard.toml", 12)


def test_the_index_is_equal_to_the_tables():
    """Where this fails, run `python -m railguard.devices.index`."""
    assert (DATA / "index.json").read_bytes() == encode(build())


def test_every_family_loads_and_is_found_by_each_of_its_names():
    """Every family loads and is found by each of its names."""
    catalogue = load()
    assert len(catalogue.families()) >= 140
    for path in family_files():
        table = read_family_file(path)
        assert catalogue.device(table.family).family == table.family
        for bases in table.names.values():
            for base in bases:
                name = base.split("[")[0]
                if name == base:
                    assert catalogue.match(base).device.family == table.family


def test_a_family_nobody_has_is_an_error():
    """A family nobody has is an error."""
    with pytest.raises(CatalogueError, match="no family XYZ"):
        load().device("XYZ")


def test_one_match_reads_one_family(monkeypatch):
    """Of the many tables only that of the family that was asked for is opened."""
    opened = []

    def read(path):
        opened.append(path.stem)
        return read_family_file(path)

    monkeypatch.setattr(catalogue, "read_family_file", read)
    catalogue._shipped_device.cache_clear()  # a family is read once in a process
    found = load()
    assert opened == []
    assert found.match("TL072CP").device.family == "TL07x"
    assert len(opened) == 1


def test_importing_the_catalogue_loads_nothing_heavy():
    """Importing the catalogue loads nothing heavy."""
    code = (
        "import sys, railguard.devices.catalogue, railguard.devices.pinouts;"
        "print([m for m in ('numpy', 'scipy', 'lark', 'rich', 'click') if m in sys.modules])"
    )
    run = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert run.stdout.strip() == "[]"


def test_a_user_table_of_a_known_family_changes_only_what_it_states():
    """A user table of a known family changes only what it states."""
    own = {
        "family": "TL07x",
        "supply": {"low": 9.0, "high": 36.0, "absolute": 42.0},
        "slew_rate": {"typical": 20e6},
    }
    catalogue = load([(own, HERE)])
    device = catalogue.match("TL072").device
    shipped = load().device("TL07x")
    assert (device.slew_rate.typical, device.slew_rate.typical_basis) == (20e6, "user")
    assert (device.supply_high, device.supply_basis["high"]) == (36.0, "user")
    assert device.swing_high == shipped.swing_high
    assert device.location == HERE
    assert catalogue.match("TL074").device == device


def test_a_user_table_of_a_new_family_is_found_by_its_own_name():
    """A user table of a new family is found by its own name."""
    own = {"family": "HYDRO-77", "gain_bandwidth": {"typical": 2e6}, "technology": "cmos"}
    catalogue = load([(own, HERE)])
    match = catalogue.match("hydro-77a")
    assert (match.sort, match.device.family, match.channels) == ("op-amp", "HYDRO-77", None)
    assert match.device.gain_bandwidth.typical_basis == "user"
    assert match.device.source.title == "railguard.toml"
    assert "HYDRO-77" in catalogue.families()


def test_a_user_family_takes_over_a_name_and_the_earlier_owner_is_named():
    """A user family takes over a name and the earlier owner is named."""
    own = {"family": "HOUSE072", "names": {"2": ["TL072"]}, "slew_rate": {"typical": 8e6}}
    catalogue = load([(own, HERE)])
    match = catalogue.match("TL072CP")
    assert (match.device.family, match.channels, match.also) == ("HOUSE072", 2, ("TL07x",))
    assert catalogue.match("TL074").device.family == "TL07x"
    assert catalogue.match("HOUSE072").channels == 2


@pytest.mark.parametrize(
    ("own", "words"),
    [
        ({"slew_rate": {"typical": 1e6}}, "missing required field `family`"),
        ({"family": "A1", "gbw": 3}, "unknown field `gbw`"),
        (
            {"family": "A1", "gain_bandwidth": {"typical": 3.0}},
            "gain bandwidth of 3 Hz is outside 1000 to 2e+10 Hz, the unit may be mistaken",
        ),
        (
            {"family": "TL07x", "supply": {"low": 40.0, "high": 30.0}},
            "its lowest supply, 40 V, is not below its highest, 30 V",
        ),
    ],
)
def test_a_user_table_that_cannot_be_is_an_error_at_its_line(own, words):
    """A user table that cannot be is an error at its line."""
    with pytest.raises(CatalogueError) as refused:
        load([(own, HERE)])
    assert words in refused.value.what
    assert refused.value.where == HERE
    assert refused.value.remedy


def test_a_family_described_twice_is_an_error():
    """A family described twice is an error."""
    own = {"family": "A1", "technology": "cmos"}
    with pytest.raises(CatalogueError, match="A1 is described twice"):
        load([(own, HERE), (own, HERE)])


def test_a_broken_file_names_itself(tmp_path):
    """A broken file names itself."""
    path = tmp_path / "broken.toml"
    path.write_text("family = ", encoding="utf-8")
    with pytest.raises(CatalogueError, match=r"broken\.toml is not TOML"):
        read_family_file(path)
