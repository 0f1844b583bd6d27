"""`railguard devices measure` as a person sees it."""

import shutil

import pytest
from click.testing import CliRunner

from railguard.commands.devices import devices
from railguard.errors import EngineError, UsageError
from tests.engine.test_measure import STIFF

needs_ngspice = pytest.mark.skipif(shutil.which("ngspice") is None, reason="ngspice is missing")


@pytest.fixture
def model(tmp_path):
    """A file with a macromodel."""
    file = tmp_path / "gauge.lib"
    file.write_text(STIFF, encoding="utf-8")
    return file


def run(*arguments, **environment):
    """Run the command and return what it prints."""
    result = CliRunner(env={"COLUMNS": "80", **environment}).invoke(
        devices, ["measure", *map(str, arguments)], catch_exceptions=False
    )
    assert result.exit_code == 0, result.output
    return result.output


@needs_ngspice
def test_a_model_is_measured_and_shown(model):
    """Figures, what is odd about the model, and that nothing is guaranteed."""
    text = run(model, "--subckt", "gauge", "--supply", 10)
    assert text.startswith("gauge  ±5 V, 27 °C, in a macromodel")
    row = next(line for line in text.splitlines() if line.startswith("gain-bandwidth"))
    assert row.split()[1:] == ["1", "MHz"]
    said = " ".join(text.split())
    assert "The drop to the positive rail does not depend on the load" in said
    assert "Typical behaviour of a macromodel: nothing here is guaranteed." in said


@needs_ngspice
def test_the_written_entry_is_a_users_table(model, tmp_path):
    """`railguard devices NAME --devices FILE` shows it."""
    target = tmp_path / "measured.toml"
    assert "Written to" in run(model, "--subckt", "gauge", "--supply", 10, "--write", target)
    shown = CliRunner(env={"COLUMNS": "80"}).invoke(
        devices, ["gauge", "--devices", str(target)], catch_exceptions=False
    )
    assert shown.exit_code == 0
    assert "Figures hold at ±5 V, 27 °C, in a macromodel" in " ".join(shown.output.split())


@needs_ngspice
def test_pins_the_header_does_not_name_can_be_stated(tmp_path):
    """In the order of the card, one name each."""
    file = tmp_path / "odd.lib"
    file.write_text(STIFF.replace("p n vcc vee out", "out vee p vcc n", 1), encoding="utf-8")
    text = run(file, "--subckt", "gauge", "--supply", 10, "--pins", "out v- in+ v+ in-")
    assert "gain-bandwidth" in text


@needs_ngspice
def test_a_model_that_gives_nothing_is_an_error(tmp_path):
    """All benches fail: the first one's reason is told."""
    file = tmp_path / "dead.lib"
    file.write_text(STIFF.replace("v(g)", "3"), encoding="utf-8")
    with pytest.raises(UsageError, match=r"gauge could not be measured: as a follower"):
        run(file, "--subckt", "gauge", "--supply", 10)


def test_without_ngspice_the_message_says_how_to_install_it(model, tmp_path):
    """An empty search path stands for a machine without it."""
    with pytest.raises(EngineError) as refused:
        run(model, "--subckt", "gauge", PATH=str(tmp_path), RAILGUARD_NGSPICE="")
    assert "ngspice is not installed" in refused.value.what
    assert "nstall" in refused.value.remedy


def test_an_existing_file_is_not_written_over(model):
    """The model itself, for one."""
    with pytest.raises(UsageError, match="exists already"):
        run(model, "--subckt", "gauge", "--write", model)
    assert model.read_text(encoding="utf-8") == STIFF
