"""The heat of a package."""

import pytest

from railguard.analysis.stage import Case
from railguard.rules.drive.power import POWER
from railguard.settings.model import Settings
from tests.rules.stages import FAMILY, changed, design, figure, findings, open_points, stage

WARM = changed(
    FAMILY,
    theta={"DIP8": 100.0, "SOIC8": 150.0},
    theta_basis="catalogue",
    supply_current=figure(1.4e-3, 2.5e-3),
)


def hot(junction, watts=0.5, family=WARM, **fields):
    """Make a design whose package reaches a temperature."""
    case = Case("SOIC8", 150.0)
    one = stage(family=family, case=case, dissipation=watts, junction=junction, **fields)
    return design(one, settings=Settings(ambient=(-20.0, 60.0)))


def judged(whole):
    """Return what drive-power says of the first package."""
    return findings(POWER, whole.packages[0], whole)


@pytest.mark.parametrize("junction", [60.0, 125.0])
def test_a_cool_package_is_quiet(junction):
    """Up to 125 °C nothing is told."""
    assert judged(hot(junction)) == []


@pytest.mark.parametrize(("junction", "severity"), [(126.0, "major"), (160.0, "critical")])
def test_a_hot_package(junction, severity):
    """Beyond the usual limit major, beyond the absolute one critical."""
    (found,) = judged(hot(junction))
    assert (found.severity, found.unit) == (severity, "°C")
    assert "at 60 °C ambient with 150 K/W (SOIC8, data sheet)" in found.message


def test_a_thermal_resistance_by_class_is_minor():
    """Where the case's figure is common practice the finding is minor."""
    by_class = changed(WARM, theta_basis="practice")
    (found,) = judged(hot(160.0, family=by_class))
    assert found.severity == "minor"


@pytest.mark.parametrize(
    ("fields", "words"),
    [
        ({"watts": None, "junction": None}, "supply current of TL072"),
        ({"junction": None}, "thermal resistance of TL072"),
        ({"junction": None, "family": None}, "does not know TL072"),
    ],
)
def test_what_is_not_known_is_listed(fields, words):
    """Heat that cannot be worked out is not checked, with what is missing."""
    whole = hot(**fields)
    assert judged(whole) == []
    (point,) = open_points(POWER, whole.packages[0], whole)
    assert words in point.why
