"""Quantities printed for a report, read from a person's text, and rounded to what can be bought."""

import math
import subprocess
import sys

import pytest

from railguard.units import (
    QuantityError,
    canonical_unit,
    parse_quantity,
    percent,
    preferred,
    series_for,
    series_of,
    si,
    split_quantity,
)


@pytest.mark.parametrize(
    ("value", "unit", "text"),
    [
        (4700, "Ω", "4.7 kΩ"),
        (12.4, "V", "12.4 V"),
        (-0.18, "V", "-180 mV"),
        (0.0033, "A", "3.3 mA"),
        (1e-7, "F", "100 nF"),
        (4.7e-6, "F", "4.7 µF"),
        (0, "V", "0 V"),
        (-0.0, "V", "0 V"),
        (272727, "Hz", "273 kHz"),
        (1e6, "Ω", "1 MΩ"),
        (None, "V", "not known"),
        (math.nan, "V", "not known"),
        (math.inf, "", "infinite"),
        (-math.inf, "V", "-infinite"),
    ],
)
def test_a_number_is_written_as_engineers_write_it(value, unit, text):
    """Three digits, a prefix, no trailing zeros."""
    assert si(value, unit) == text


@pytest.mark.parametrize(
    ("value", "text"), [(999.4, "999 V"), (999.6, "1 kV"), (99.96, "100 V"), (-0.9996, "-1 V")]
)
def test_rounding_up_to_the_next_thousand_changes_the_prefix(value, text):
    """Never 1000 V."""
    assert si(value, "V") == text


@pytest.mark.parametrize(
    ("value", "unit", "text"),
    [
        (200000, "", "200000"),
        (0.5, "", "0.5"),
        (88.44, "°", "88.4°"),
        (85, "°C", "85 °C"),
        (13e6, "V/s", "13 V/µs"),
        (3e5, "V/s", "0.3 V/µs"),
        (200, "V/s", "200 V/s"),
        (1e-20, "A", "1.00e-20 A"),
    ],
)
def test_units_without_prefixes_keep_their_usual_form(value, unit, text):
    """Ratios, degrees and slew rates are written as data sheets do."""
    assert si(value, unit) == text


def test_more_digits_are_kept_where_asked_for():
    """A reference voltage needs its fourth digit."""
    assert si(2.4953, "V", digits=5) == "2.4953 V"


@pytest.mark.parametrize(
    ("share", "text"),
    [
        (0.05, "5 %"),
        (0.0123, "1.2 %"),
        (0.0005, "0.05 %"),
        (1.234, "123 %"),
        (-0.08, "-8 %"),
        (0, "0 %"),
        (0.999, "100 %"),
        (None, "not known"),
        (math.inf, "infinite"),
    ],
)
def test_a_share_is_written_as_a_percentage(share, text):
    """Whole from ten per cent on, two digits below."""
    assert percent(share) == text


@pytest.mark.parametrize(
    ("text", "unit", "value"),
    [
        ("4k7", "Ω", 4700.0),
        ("4.7k", "Ω", 4700.0),
        ("4.7 kΩ", "Ω", 4700.0),
        ("4K7", "ohm", 4700.0),
        ("4700", "Ω", 4700.0),
        ("470R", "Ω", 470.0),
        ("4R7", "Ω", 4.7),
        ("R47", "Ω", 0.47),
        ("10 ohm", "Ω", 10.0),
        ("2k2 ohms", "Ω", 2200.0),
        ("1 MEG", "Ω", 1e6),
        ("1Mega", "Ω", 1e6),
        ("1 megohm", "Ω", 1e6),
        ("1 MΩ", "Ω", 1e6),
        ("1.5 MHz", "Hz", 1.5e6),
        ("5 %", "%", 0.05),
        ("5%", "", 0.05),
        ("0.05", "%", 0.05),
        ("1 nF", "F", 1e-9),
        ("100nF", "F", 1e-7),
        ("100NF", "F", 1e-7),
        ("4n7", "F", 4.7e-9),
        ("1 F", "F", 1.0),
        ("2.2 µF", "F", 2.2e-6),
        ("2.2 μF", "F", 2.2e-6),
        ("2.2uF", "F", 2.2e-6),
        ("10 mA", "A", 0.01),
        ("50 mV", "V", 0.05),
        ("3V3", "V", 3.3),
        ("-12", "V", -12.0),
        ("−12 V", "V", -12.0),
        ("1e-3", "V", 0.001),
        ("60 °C", "°C", 60.0),
        ("2e3k", "Hz", 2e6),
    ],
)
def test_a_quantity_is_read_as_its_author_meant_it(text, unit, value):
    """Equal to the last bit: the text is converted once."""
    assert parse_quantity(text, unit) == value


@pytest.mark.parametrize("text", ["1M", "4M7", "10 MA", "1 MF"])
def test_a_bare_capital_m_is_refused_with_the_reason(text):
    """Mega to a person, milli to SPICE."""
    with pytest.raises(QuantityError) as caught:
        parse_quantity(text, "Ω")
    assert str(caught.value) == (
        f'"{text}" leaves open whether M is mega or milli (SPICE takes it as milli): '
        "write MEG or m."
    )


@pytest.mark.parametrize(
    ("text", "unit", "sentence"),
    [
        ("5 V", "Ω", '"5 V" is in V, and Ω is wanted here.'),
        ("5 %", "V", '"5 %" is in %, and V is wanted here.'),
        ("5 V", "", '"5 V" is in V, and a number without a unit is wanted here.'),
        ("4,7k", "Ω", '"4,7k" has a comma: write the decimal point as a point.'),
        (
            "1f",
            "F",
            '"1f" leaves open whether F is farad or femto: write a plain number.',
        ),
        ("", "V", '"" is no number that can be read here: write 12, 12 V or 50 mV.'),
        ("inf", "V", '"inf" is no number that can be read here: write 12, 12 V or 50 mV.'),
        ("1e999", "V", '"1e999" is no number that can be read here: write 12, 12 V or 50 mV.'),
        ("1.2.3", "F", '"1.2.3" is no number that can be read here: write 1e-9, 1 nF or 1n.'),
        ("0x10", "Ω", '"0x10" is no number that can be read here: write 4700, 4.7k or 4k7.'),
        ("ten", "A", '"ten" is no number that can be read here: write 0.02, 20 mA or 20m.'),
        ("1_0", "", '"1_0" is no number that can be read here: write 0.5, 4.7k or 10m.'),
        (
            "1" * 50,
            "V",
            f'"{"1" * 40}..." is no number that can be read here: write 12, 12 V or 50 mV.',
        ),
    ],
)
def test_what_is_no_such_quantity_is_refused_in_a_sentence(text, unit, sentence):
    """Wrong unit, decimal comma, and everything that is no number."""
    with pytest.raises(QuantityError) as caught:
        parse_quantity(text, unit)
    assert str(caught.value) == sentence


@pytest.mark.parametrize(
    ("text", "unit", "value"),
    [
        ("50M", "V", 0.05),
        ("50m", "V", 0.05),
        ("1MEG", "Ω", 1e6),
        ("1meg", "Ω", 1e6),
        ("100NF", "F", 1e-07),
        ("10%", "%", 0.1),
        ("20MA", "A", 0.02),
        ("2G", "Ω", 2e9),
    ],
)
def test_spice_notation_takes_m_as_milli_in_either_case(text, unit, value):
    """The notation of the netlist a directive stands in."""
    assert parse_quantity(text, unit, spice=True) == value


@pytest.mark.parametrize(("text", "unit"), [("1M", "Ω"), ("1MHz", "Hz"), ("2M2", "Ω")])
def test_spice_notation_refuses_an_m_that_surely_means_mega(text, unit):
    """A milliohm and a millihertz are not what is meant by a capital M."""
    with pytest.raises(QuantityError) as caught:
        parse_quantity(text, unit, spice=True)
    assert str(caught.value) == (
        f'"{text}" is a thousandth in SPICE notation, where M is milli: '
        "write MEG for mega, or a small m."
    )


@pytest.mark.parametrize("unit", ["F", "Ω", "A"])
def test_spice_notation_refuses_a_bare_f(unit):
    """SPICE reads 1F as a femtofarad, which nobody means."""
    with pytest.raises(QuantityError, match="leaves open whether F is farad or femto"):
        parse_quantity("1F", unit, spice=True)


@pytest.mark.parametrize(
    ("text", "value", "unit"),
    [("5m", 0.005, ""), ("1 nF", 1e-9, "F"), ("5 %", 0.05, "%"), ("-2 mA", -0.002, "A")],
)
def test_a_quantity_of_unknown_kind_gives_its_unit_as_well(text, value, unit):
    """For limits and accepted margins, whose unit only the rule knows."""
    assert split_quantity(text) == (value, unit)


def test_units_are_known_by_their_spellings():
    """An unknown unit stays as it is."""
    spellings = ("ohms", "\N{OHM SIGN}", "Volt", "V/s")
    assert [canonical_unit(unit) for unit in spellings] == ["Ω", "Ω", "V", "V/s"]


@pytest.mark.parametrize(
    ("value", "series", "direction", "found"),
    [
        (4600, "E24", "nearest", 4700.0),
        (4700, "E24", "up", 4700.0),
        (4700, "E24", "down", 4700.0),
        (4701, "E24", "up", 5100.0),
        (4699, "E24", "down", 4300.0),
        (9.3, "E24", "up", 10.0),
        (0.99, "E12", "down", 0.82),
        (1.01e-7, "E6", "up", 1.5e-7),
        (919, "E192", "nearest", 920.0),
        (3.05, "E24", "nearest", 3.0),
    ],
)
def test_a_preferred_value_is_one_of_the_series(value, series, direction, found):
    """In each direction and across decades."""
    assert preferred(value, series, direction) == found


@pytest.mark.parametrize("value", [0.0, -4.7, math.inf, math.nan])
def test_there_is_no_preferred_value_for_what_cannot_be_bought(value):
    """Zero, negative and infinite values have none."""
    with pytest.raises(ValueError, match="no preferred value"):
        preferred(value)


@pytest.mark.parametrize(
    ("tolerance", "series"),
    [(0.2, "E6"), (0.1, "E12"), (0.05, "E24"), (0.02, "E48"), (0.01, "E96"), (0.001, "E192")],
)
def test_a_tolerance_has_its_series(tolerance, series):
    """As IEC 60063 pairs them."""
    assert series_for(tolerance) == series


@pytest.mark.parametrize(
    ("value", "series"),
    [
        (10, "E3"),
        (4700, "E3"),
        (1.5e-09, "E6"),
        (1200, "E12"),
        (5100.0, "E24"),
        (4990.0, "E96"),
        (9.2e-07, "E192"),
        (4800.0, None),
        (0, None),
        (-10, None),
    ],
)
def test_a_value_is_known_by_its_coarsest_series(value, series):
    """A value off every series has none."""
    assert series_of(value) == series


def test_reading_and_printing_load_no_library_of_preferred_values():
    """The library costs as much as all the rest of a short run."""
    code = (
        "import sys; from railguard.units import si, parse_quantity; si(1, 'V'); "
        "parse_quantity('4k7', 'Ω'); sys.exit('eseries' in sys.modules)"
    )
    assert subprocess.run([sys.executable, "-c", code], check=False).returncode == 0
