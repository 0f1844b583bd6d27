"""`railguard sheet`: forms, one stage, and a name that is none."""

import csv
import io
import json
from pathlib import Path

import pytest
from click.testing import CliRunner

from railguard.commands.main import railguard
from railguard.errors import UsageError

STATION = Path(__file__).parents[2] / "fixtures" / "station" / "station.cir"


def run(*arguments):
    """Run the command line as a user does."""
    return CliRunner().invoke(railguard, ["sheet", *map(str, arguments)])


def test_screen_shows_the_stage_asked_for():
    """One stage, and the deck it belongs to."""
    result = run(STATION, "--of", "XU3")
    assert result.exit_code == 0
    for words in ("sha256", "XU3", "OP27G", "gain", "largest input", "limited by"):
        assert words in result.output
    assert "XU4A" not in result.output


@pytest.mark.parametrize("form", ["csv", "json", "markdown"])
def test_forms_go_to_the_output_whole(form):
    """Each form of the whole sheet can be read again."""
    data = run(STATION, "--as", form).stdout_bytes
    if form == "csv":
        assert len({r["designator"] for r in csv.DictReader(io.StringIO(data.decode()))}) == 10
    elif form == "json":
        assert json.loads(data)["tool"]["name"] == "railguard"
    else:
        assert data.startswith(b"## ")


def test_an_unknown_stage_is_no_empty_sheet():
    """The stages there are, are named."""
    result = run(STATION, "--of", "XU99")
    assert isinstance(result.exception, UsageError)
    assert "XU1, XU2" in result.exception.remedy


def test_samples_stand_beside_the_corners():
    """Monte Carlo on request, in a column of its own."""
    result = run(STATION, "--of", "XU3", "--monte-carlo", "20")
    assert "sampled" in result.output
