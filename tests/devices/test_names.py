"""Designators: packages, units, the schematic's spelling."""

import pytest

from railguard.devices.names import package_of, schematic_name


@pytest.mark.parametrize(
    ("written", "package", "unit"),
    [
        ("XU3A", "U3", "A"),
        ("XU3B", "U3", "B"),
        ("U3.B", "U3", "B"),
        ("U3_2", "U3", "2"),
        ("U3-1", "U3", "1"),
        ("U3/C", "U3", "C"),
        ("u3a", "u3", "A"),
        ("IC3C", "IC3", "C"),
        ("XCH1.XU2A", "CH1.U2", "A"),
        ("XCH1.XU2", "CH1.U2", ""),
        ("XU3", "U3", ""),
        ("U3", "U3", ""),
        ("X1", "X1", ""),
    ],
)
def test_units_of_one_package_share_its_name(written, package, unit):
    """Units of one package share its name."""
    assert package_of(written) == (package, unit)


@pytest.mark.parametrize("written", ["X1A", "XFILTA", "R3A", "U3Z", "U3_100A", "BUF1A", "XU1_A1"])
def test_a_trailing_letter_is_no_unit_where_it_makes_no_sense(written):
    """A letter after something that is no IC designator, or beyond H, belongs to the name."""
    assert package_of(written)[1] == ""


@pytest.mark.parametrize(
    ("written", "drawn"),
    [
        ("XU1", "U1"),
        ("X§U1", "U1"),
        ("X_U1", "U1"),
        ("XCH1.XU2", "CH1.U2"),
        ("X1", "X1"),
        ("XFILTER", "XFILTER"),
        ("xu7", "u7"),
        ("R12", "R12"),
        ("X_", "X_"),
    ],
)
def test_the_schematic_spelling_drops_the_letter_spice_needs(written, drawn):
    """The schematic spelling drops the letter spice needs."""
    assert schematic_name(written) == drawn
