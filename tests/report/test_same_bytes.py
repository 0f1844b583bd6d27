"""The same netlists, settings and day give the same bytes, in whatever environment."""

import pytest

from railguard.report.formats import FORMATS
from tests import environments
from tests.environments import ENVIRONMENTS
from tests.report import designs

DAY = ["--as-of", "2027-01-31"]
REDLINED = "faulty"


def commands(netlists, redlined):
    """Return every command that reports on netlists, in every form it has."""
    found = {f"review {form}": ["review", *netlists, *DAY, "--report", form] for form in FORMATS}
    for form in ("screen", "csv", "json", "markdown"):
        found[f"sheet {form}"] = ["sheet", *netlists, *DAY, "--as", form]
    for form in ("screen", "diff", "json"):
        found[f"redline {form}"] = ["redline", redlined, *DAY, "--as", form]
    found["samples"] = ["review", redlined, *DAY, "--monte-carlo", "20", "--report", "json"]
    found["rules"] = ["rules", "--markdown"]
    found["devices"] = ["devices"]
    return found


@pytest.fixture(scope="module")
def printed(tmp_path_factory):
    """Return what every command printed, by environment and name."""
    root = tmp_path_factory.mktemp("laid")
    for name in ("faulty", "partly", "hostile", "waived"):
        (root / name).mkdir()
        designs.paths(name, root / name)
    netlists = sorted(str(p.relative_to(root)) for p in root.rglob("*.cir"))
    (redlined,) = (name for name in netlists if name.startswith("faulty"))
    made = environments.locales(tmp_path_factory.mktemp("locales"))
    return {
        name: environments.run(
            name, commands(netlists, redlined), root, tmp_path_factory.mktemp("out"), made
        )
        for name in ENVIRONMENTS
    }


@pytest.mark.parametrize("command", commands([], ""))
def test_hash_seed_locale_and_time_zone_change_nothing(command, printed):
    """Every report of every command."""
    first, *others = (by_name[command] for by_name in printed.values())
    assert first.strip()
    assert all(other == first for other in others)
    assert len(others) == 2
