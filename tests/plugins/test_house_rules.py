"""A package of somebody else's, installed with pip and run in a review."""

import importlib.util
import json
import os
import subprocess
import sys
from pathlib import Path

import pytest

ROOT = Path(__file__).parents[2]
PACKAGE = Path(__file__).parent / "house_rules"
STATION = ROOT / "fixtures" / "station" / "station.cir"


@pytest.fixture(scope="module")
def installed(tmp_path_factory):
    """Install the package into a folder of its own; return the environment that has it."""
    for needed in ("pip", "hatchling"):
        if importlib.util.find_spec(needed) is None:
            pytest.skip(f"{needed} is not installed")
    place = tmp_path_factory.mktemp("installed")
    subprocess.run(
        [
            *(sys.executable, "-m", "pip", "install", "-q", "--no-deps", "--no-build-isolation"),
            *("--no-index", "--target", str(place), str(PACKAGE)),
        ],
        check=True,
        capture_output=True,
    )
    return {**os.environ, "PYTHONPATH": os.pathsep.join((str(place), str(ROOT)))}


def run(environment, *arguments):
    """Run railguard beside the package; return what it did."""
    return subprocess.run(
        [sys.executable, "-m", "railguard", *arguments],
        cwd=ROOT,
        env=environment,
        capture_output=True,
        text=True,
        encoding="utf-8",
        check=False,
    )


def reported(environment, *arguments):
    """Review a deck with a JFET op-amp; return the design's part of the report."""
    done = run(environment, "review", *arguments, "--report", "json")
    return json.loads(done.stdout)["designs"][0]


@pytest.fixture
def deck(tmp_path):
    """An inverting stage round a JFET op-amp."""
    place = tmp_path / "gauge.cir"
    place.write_text(
        "gauge\nVIN in 0 SIN(0 0.5 1k)\nR1 in n 10k\nR2 n out 20k\nXU1 0 n vp vn out TL072\n"
        "VP vp 0 12\nVN vn 0 -12\nCP vp 0 100n\nCN vn 0 100n\n.end\n"
    )
    return str(place)


def test_its_rule_runs_and_the_report_says_so(installed, deck):
    """A finding, and a line that names rule, package and version."""
    design = reported(installed, deck)
    (found,) = [f for f in design["findings"] if f["rule"] == "bias-house-no-jfet"]
    assert found["designators"] == ["XU1"]
    assert found["line"] == 5
    told = [remark["message"] for remark in design["reading"]]
    assert "Rules of other packages: bias-house-no-jfet (house-rules 1.2)." in told


def test_it_can_be_left_out(installed, deck):
    """By an option, and then nothing speaks of it."""
    design = reported(installed, deck, "--no-plugins")
    assert "house" not in json.dumps(design)


def test_settings_take_its_name(installed, deck):
    """A severity for it is obeyed; without the package the name is refused."""
    toml = Path(deck).with_name("railguard.toml")
    toml.write_text('[severity]\nbias-house-no-jfet = "major"\n')
    done = run(installed, "review", deck)
    assert done.returncode == 1
    assert "bias-house-no-jfet" in done.stdout
    refused = run(installed, "review", deck, "--no-plugins")
    assert refused.returncode == 2
    assert 'no rule "bias-house-no-jfet"' in refused.stderr


def test_it_is_listed_and_explained(installed):
    """`railguard rules` knows it."""
    listed = run(installed, "rules").stdout
    assert "bias-house-no-jfet" in listed
    assert "(house-rules 1.2)" in listed
    assert "bias-house-no-jfet" not in run(installed, "rules", "--no-plugins").stdout
    assert "house list, revision C" in run(installed, "rules", "bias-house-no-jfet").stdout


def test_the_walk_through_is_the_package():
    """DEVELOPERS.md shows the file that these tests install."""
    page = (ROOT / "DEVELOPERS.md").read_text(encoding="utf-8")
    assert f"```python\n{(PACKAGE / 'house_rules.py').read_text(encoding='utf-8')}```" in page
    project = (PACKAGE / "pyproject.toml").read_text(encoding="utf-8")
    shown = next(part.split("```")[0] for part in page.split("```toml\n")[1:] if "rules" in part)
    assert shown.strip() in project
