"""A family in words."""

import pytest

from railguard.devices.catalogue import load
from railguard.devices.describe import facts, legend, rows


def device(family):
    """Return a shipped family."""
    return load().device(family)


def test_typical_and_guaranteed_of_one_swing_test_share_a_row():
    """Typical and guaranteed of one swing test share a row."""
    found = [row for row in rows(device("TL07x")) if row.label == "drop to V+"]
    assert [(row.typical, row.guaranteed) for row in found] == [("1.5 V", "3 V"), ("3 V", "5 V")]
    assert found[0].condition == "10 kΩ to mid-supply, 30 V supply"


def test_what_is_not_known_has_no_row():
    """What is not known has no row."""
    labels = {row.label for row in rows(device("TL07x"))}
    assert "output resistance" not in labels
    assert "slew rate" in labels


def test_an_input_that_works_above_the_positive_rail_is_told():
    """An input that works above the positive rail is told."""
    reach = next(row for row in rows(device("LT1490")) if row.label == "input reach")
    assert reach.condition == "works 44 V above the negative rail"


def test_facts_name_behaviour_only_where_it_is_known():
    """Facts name behaviour only where it is known."""
    assert facts(device("TL07x")) == "jfet, reverses phase"
    assert facts(device("NJM2068")) == "bipolar"
    assert facts(device("THS3091")) == "bipolar, current feedback"
    assert facts(device("MCP6001")) == (
        "cmos, no phase reversal, rail-to-rail input, rail-to-rail output"
    )


@pytest.mark.parametrize(("family", "marks"), [("LMV358", "†"), ("NJM2068", "†‡")])
def test_the_legend_explains_the_marks_that_occur(family, marks):
    """The legend explains the marks that occur."""
    assert "".join(mark for mark, _meaning in legend(device(family))) == marks


@pytest.mark.parametrize("family", load().families())
def test_every_family_can_be_told(family):
    """Every family can be told."""
    found = rows(device(family))
    assert len(found) >= 3
    assert all(row.typical or row.guaranteed or row.condition for row in found)
