"""SPICE numbers, and where SPICE reads them otherwise than meant."""

import pytest

from railguard.deck.numbers import read_number


@pytest.mark.parametrize(
    ("text", "value"),
    [
        ("1k", 1e3), ("1MEG", 1e6), ("1Megohm", 1e6), ("10kOhm", 1e4), ("22uF", 22e-6),
        ("1.5e3k", 1.5e6), ("1E-3m", 1e-6), (".5k", 500.0), ("5.", 5.0), ("+15V", 15.0),
        ("-3.3", -3.3), ("1mil", 25.4e-6), ("1µ", 1e-6), ("4.7n", 4.7e-9), ("2p", 2e-12),
        ("3f", 3e-15), ("1T", 1e12), ("2G", 2e9), ("10Volts", 10.0), ("1e-3", 1e-3),
    ],
)  # fmt: skip
def test_plain_number(text, value):
    """Suffix and exponent count, letters behind them do not."""
    found = read_number(text)
    assert found.value == pytest.approx(value)
    assert found.spice == pytest.approx(value)
    assert found.trap == ""


@pytest.mark.parametrize(
    ("text", "letter", "value", "spice"),
    [
        ("1M", "R", 1e6, 1e-3),
        ("2M2", "R", 2.2e6, 2e-3),
        ("1F", "C", 1.0, 1e-15),
        ("4Farads", "C", 4.0, 4e-15),
        ("1X", "R", 1e6, 1.0),
        ("4k7", "R", 4700.0, 4000.0),
        ("4R7", "R", 4.7, 4.0),
        ("R47", "R", 0.47, 0.0),
        ("4n7", "C", 4.7e-9, 4e-9),
        ("1μ", "C", 1e-6, 1.0),
    ],
)
def test_trap_keeps_both_readings(text, letter, value, spice):
    """What the author meant, and what SPICE takes it for."""
    found = read_number(text, letter)
    assert found.value == pytest.approx(value)
    assert found.spice == pytest.approx(spice)
    assert found.trap


@pytest.mark.parametrize(
    ("text", "letter"), [("5m", "R"), ("100m", "R"), ("1mF", "C"), ("10uF", "C")]
)
def test_ordinary_small_values_are_no_trap(text, letter):
    """A shunt of 5m is milliohms, and was meant so."""
    assert read_number(text, letter).trap == ""


@pytest.mark.parametrize(
    "text", ["", "abc", "1N4148", "2N3904", "1.2.3", "0x10", "inf", "nan", "1e+", "TL072"]
)
def test_what_is_no_number(text):
    """Names that begin with a digit are names."""
    assert read_number(text) is None
