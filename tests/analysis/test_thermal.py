"""Heat, and the case it is judged in."""

import pytest

from railguard.analysis.thermal import case_of
from railguard.devices import catalogue

LMV = catalogue.load().device("LMV358")
BUFFER = "VIN in 0 5\nXU1 in out vp vn out {device}\nRL out 0 1k"


@pytest.mark.parametrize(
    ("channels", "text", "case"),
    [
        # Listed: SC70-5 478, SOT23-5 265, SOIC-8 190, MSOP-8 235, SOIC-14 145, TSSOP-14 155 K/W.
        (1, "LMV321", "SC70-5"),
        (2, "LMV358", "MSOP-8"),
        (4, "LMV3X4", "TSSOP-14"),
        (2, "LMV358 Package_SO:SOIC-8_3.9x4.9mm", "SOIC-8"),
        (1, "LMV321 SOT23-5", "SOT23-5"),
        (None, "LMV3XX", "SC70-5"),
    ],
)
def test_a_case_holds_so_many_amplifiers(channels, text, case):
    """Two amplifiers fit in no case of five pins; a footprint on the card settles it."""
    found = case_of(LMV, channels, text)
    assert (found.name, found.resistance) == (case, LMV.theta[case])


def test_junction_by_hand(stage):
    """10 V at 5 mA in the output stage, and 30 V times the quiescent current, at 25 degrees."""
    found = stage(BUFFER.format(device="TL072"))
    watts = 30.0 * found.family.supply_current.best + 10.0 * 5e-3
    assert found.dissipation == pytest.approx(watts, rel=1e-3)
    assert found.junction == pytest.approx(25.0 + watts * found.case.resistance, rel=1e-3)
    assert found.case.name.endswith("-8")


def test_hottest_ambient_counts(stage):
    """The stated range's upper end."""
    hot = stage(BUFFER.format(device="TL072"), "[conditions]\nambient = [-20, 60]")
    cool = stage(BUFFER.format(device="TL072"))
    assert hot.junction - cool.junction == pytest.approx(35.0)


def test_worst_level_of_a_grounded_load_is_half_the_rail(stage):
    """+-15 V into 1 kilohm swung to 12 V: most heat at 7.5 V, 56.25 mW. Source: TI SBOS293I."""
    cards = "VIN in 0 SIN(0 12 100)\nXU1 in out vp vn out TL072\nRL out 0 1k"
    found = stage(cards)
    quiescent = 30.0 * found.family.supply_current.best
    assert found.dissipation - quiescent == pytest.approx(56.25e-3, rel=0.01)
