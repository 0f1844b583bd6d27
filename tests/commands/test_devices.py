"""`railguard devices` as a person sees it."""

import pytest
from click.testing import CliRunner

from railguard.commands.devices import devices
from railguard.errors import CatalogueError, UsageError


def shown(*arguments):
    """Run the command and return what it prints, on one line per line of 80 columns."""
    result = CliRunner(env={"COLUMNS": "80"}).invoke(
        devices, list(arguments), catch_exceptions=False
    )
    assert result.exit_code == 0, result.output
    return result.output


def test_without_a_pattern_every_family_is_listed():
    """Without a pattern every family is listed."""
    text = shown()
    assert "family" in text.splitlines()[0]
    assert "TL07x" in text
    assert "MCP6001" in text
    assert "families. `railguard devices NAME` shows one with its sources." in text.replace(
        "\n", " "
    )


def test_an_order_code_shows_its_family_with_figures_and_source():
    """An order code shows its family with figures and source."""
    text = shown("TL072CP")
    assert text.startswith("TL07x  ")
    assert "Figures hold at ±15 V, 25 °C, unless a row says otherwise." in text
    row = next(line for line in text.splitlines() if line.startswith("slew rate"))
    assert row.split()[2:6] == ["13", "V/µs", "8", "V/µs"]
    assert "Source: Texas Instruments, SLOS080" in text


def test_a_value_from_memory_is_marked_and_the_mark_explained():
    """A value from memory is marked and the mark explained."""
    text = shown("NJM2068")
    row = next(line for line in text.splitlines() if line.startswith("gain-bandwidth"))
    assert "27 MHz†" in row
    assert "† from memory, not read in the document" in text
    assert "(not seen:" in text


def test_a_pattern_lists_the_families_it_fits():
    """A pattern lists the families it fits."""
    text = shown("mcp60*")
    assert [line.split()[0] for line in text.splitlines()[1:] if line[:1] == "M"] == [
        "MCP6001",
        "MCP601",
        "MCP602x",
        "MCP604x",
    ]
    assert "4 families." in text


def test_lines_fit_eighty_columns():
    """Lines fit eighty columns."""
    assert max(len(line) for line in shown("LM358").splitlines()) <= 80


@pytest.mark.parametrize(
    ("pattern", "words"),
    [
        ("NE555P", "NE555P is no op-amp: the catalogue takes it for a timer."),
        ("AD620AN", "the catalogue takes it for an instrumentation amplifier."),
        ("TL07Z", "TL07Z is not in the catalogue. The nearest name is TL07"),
        ("LMC6032", "LMC6032 is an op-amp the catalogue has no figures of."),
        ("nothing-like-it", "is not in the catalogue. `railguard devices` lists all."),
    ],
)
def test_a_name_without_a_family_says_what_it_is(pattern, words):
    """A name without a family says what it is."""
    with pytest.raises(UsageError) as refused:
        shown(pattern)
    assert words in str(refused.value)


def test_the_users_own_tables_stand_on_top(tmp_path):
    """The users own tables stand on top."""
    own = tmp_path / "house.toml"
    own.write_text(
        '[[devices]]\nfamily = "GAUGE9"\ntechnology = "cmos"\nslew_rate = { typical = 2e6 }\n'
        "supply = { low = 3.0, high = 12.0 }\n",
        encoding="utf-8",
    )
    text = shown("GAUGE9", "--devices", str(own))
    assert text.startswith("GAUGE9")
    assert "2 V/µs" in text
    assert "†" not in text
    assert "house.toml,line1." in "".join(text.split())


def test_an_impossible_table_of_the_users_own_is_an_error_with_its_line(tmp_path):
    """An impossible table of the users own is an error with its line."""
    own = tmp_path / "house.toml"
    own.write_text(
        '[review]\nhold-at = "major"\n[[devices]]\nfamily = "GAUGE9"\n'
        "slew_rate = { typical = 2 }\n",
        encoding="utf-8",
    )
    with pytest.raises(CatalogueError) as refused:
        shown("--devices", str(own))
    assert "the unit may be mistaken" in refused.value.what
    assert refused.value.where.line == 3


def test_help_tells_what_a_pattern_is():
    """Help tells what a pattern is."""
    text = shown("--help")
    assert "PATTERN is an order code (TL072CP)" in text
