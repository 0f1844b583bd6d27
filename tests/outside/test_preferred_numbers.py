"""IEC 60063 preferred numbers, against a table written down independently of the library used.

The tables E24 and E48 were compared with published lists; those from E96 on with the parts that
were seen of one. E192 follows round(100 * 10 ** (i / 192)) with the one exception of the standard,
920 for 919; E96 is every second and E48 every fourth value of it.
"""

import itertools

import pytest

from railguard.units import preferred

E24 = (
    *(10, 11, 12, 13, 15, 16, 18, 20, 22, 24, 27, 30),
    *(33, 36, 39, 43, 47, 51, 56, 62, 68, 75, 82, 91),
)
E192 = tuple(920 if i == 185 else round(100 * 10 ** (i / 192)) for i in range(192))
TABLES = {
    "E3": (10, 22, 47),
    "E6": E24[::4],
    "E12": E24[::2],
    "E24": E24,
    "E48": E192[::4],
    "E96": E192[::2],
    "E192": E192,
}


@pytest.mark.parametrize("series", TABLES)
def test_each_value_of_the_standard_is_its_own_preferred_value(series):
    """In each direction: the library's table is the standard's."""
    for base in TABLES[series]:
        value = float(base)
        assert preferred(value, series) == value
        assert preferred(value, series, "up") == value
        assert preferred(value, series, "down") == value


@pytest.mark.parametrize("series", TABLES)
def test_between_two_values_of_the_standard_lies_no_other(series):
    """From just above one value, up gives the next and down the one."""
    values = [*TABLES[series], 10 * TABLES[series][0]]
    for low, high in itertools.pairwise(values):
        assert preferred(low * 1.001, series, "up") == high
        assert preferred(high / 1.001, series, "down") == low


def test_e24_is_historical_and_not_part_of_e192():
    """27 to 47 and 82 are not where the formula would put them."""
    assert 27 in E24
    assert 270 not in E192
