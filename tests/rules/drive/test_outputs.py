"""What outputs and inputs are joined to."""

import pytest

from railguard.analysis.bound import Range
from railguard.analysis.stage import Current
from railguard.devices.model import Figure
from railguard.rules.drive.outputs import ABOVE_RAIL, CAPACITIVE, JOINED, TIED
from tests.rules.stages import (
    ELEMENTS,
    FAMILY,
    changed,
    design,
    findings,
    inputs,
    open_points,
    outcomes,
    pin,
    single,
    stage,
    voltage_source,
)


def on_net(designator, net, **fields):
    """Make a stage whose output stands on a net."""
    return stage(designator, output=changed(stage().output, net=net), **fields)


def test_outputs_on_nets_of_their_own_are_quiet():
    """Two outputs on two nets drive nothing into each other."""
    whole = design(on_net("XU1", "a"), on_net("XU2", "b"))
    assert [outcomes(JOINED, s, whole) for s in whole.stages] == [[], []]


def test_joined_outputs_make_one_critical_finding():
    """Two outputs on one net are told once, with both designators."""
    whole = design(on_net("XU1", "a"), on_net("XU2", "a"))
    found = [findings(JOINED, s, whole) for s in whole.stages]
    assert found[1] == []
    assert found[0][0].severity == "critical"
    assert found[0][0].designators == ("XU1", "XU2")


def test_unknown_comparators_may_have_open_collectors():
    """Joined outputs of comparators nobody knows are minor."""
    pair = [on_net(n, "a", use="comparator", family=None) for n in ("XU1", "XU2")]
    whole = design(*pair)
    assert [f.severity for f in findings(JOINED, pair[0], whole)] == ["minor"]


def test_a_free_output_is_quiet():
    """An output on a net of its own, or behind an ammeter, is not tied."""
    assert outcomes(TIED, stage()) == []
    meter = (*ELEMENTS, voltage_source("VAM", 0.0, "out", "load"))
    assert outcomes(TIED, stage(), design(stage(), elements=meter)) == []


@pytest.mark.parametrize("other", ["0", "+12V"])
def test_an_output_against_a_source(other):
    """A source between the output and ground or a rail holds it: critical."""
    tied = (*ELEMENTS, voltage_source("VX", 3.0, "out", other))
    (found,) = findings(TIED, stage(), design(stage(), elements=tied))
    assert found.severity == "critical"
    assert "held by VX" in found.message


def test_an_output_on_ground():
    """Ground itself is as stiff."""
    (found,) = findings(TIED, on_net("XU1", "0"))
    assert "held by ground" in found.message


def charging(farads, slew=None, available=10e-3, **fields):
    """Make a stage with a capacitor at its output; its device slews at 1 V/µs."""
    current = Current(
        available_source=available, available_sink=available, load_capacitance=farads
    )  # fmt: skip
    family = changed(FAMILY, slew_rate=Figure(typical=1e6))
    output = changed(stage().output, slew=slew)
    return stage(**{"current": current, "output": output, "family": family, **fields})


def test_a_small_capacitor_is_quiet():
    """What it takes at the device's own slope is within what the output gives; at it as well."""
    assert outcomes(CAPACITIVE, charging(1e-9)) == []
    assert outcomes(CAPACITIVE, charging(10e-9)) == []


def test_a_large_capacitor_slows_steps_that_nobody_states():
    """Twenty nanofarads at 1 V/µs take 20 mA of 10: half the slope is left."""
    (found,) = findings(CAPACITIVE, charging(20e-9))
    assert (found.severity, found.unit) == ("remark", "A")
    assert found.demand == pytest.approx(20e-3)
    assert "0.5 V/µs" in found.message


def test_a_known_signal_is_left_to_drive_current():
    """The solved current holds the capacitor's, so nothing is told twice."""
    assert outcomes(CAPACITIVE, charging(20e-9, slew=1e5)) == []


def test_an_unknown_slew_rate_is_not_checked():
    """Of a device without one, or of a device nobody knows, it is listed as missing."""
    unlisted = charging(20e-9, family=changed(FAMILY, slew_rate=Figure()))
    assert len(open_points(CAPACITIVE, unlisted)) == 1
    assert len(open_points(CAPACITIVE, charging(20e-9, family=None))) == 1
    assert outcomes(CAPACITIVE, charging(20e-9, available=None)) == []


def driven(volts, series, **fields):
    """Make a comparator on 5 V whose input is driven from elsewhere."""
    plus = pin("in", demand=Range(0.0, volts), series=series)
    usual = {"use": "comparator", "supply": single()}
    return stage(inputs=inputs(plus=plus), **{**usual, **fields})


@pytest.mark.parametrize(("volts", "series"), [(5.0, 0.0), (5.3, 0.0), (12.0, 1.5e3)])
def test_inputs_within_the_rail_or_behind_a_resistor_are_quiet(volts, series):
    """Three tenths of a volt, or five milliamperes, are borne."""
    assert outcomes(ABOVE_RAIL, driven(volts, series)) == []


def test_an_input_driven_beyond_its_rail():
    """Twelve volts into a device on five: the resistor that would do is named."""
    (found,) = findings(ABOVE_RAIL, driven(12.0, 100.0))
    assert found.severity == "major"
    assert found.demand == pytest.approx(67e-3)
    assert "Fit at least 1.5 kΩ in series" in found.remedy
    (direct,) = findings(ABOVE_RAIL, driven(12.0, 0.0))
    assert "without a resistor" in direct.message


def test_an_input_driven_while_its_rail_is_off():
    """Five volts into a device without power go through its diode into the dead rail."""
    off = changed(single(), positive=0.0, positive_worst=Range(0.0, 0.0))
    (found,) = findings(ABOVE_RAIL, driven(5.0, 100.0, supply=off))
    assert found.demand == pytest.approx(47e-3)
    turned = changed(off, positive=-5.0)
    assert outcomes(ABOVE_RAIL, driven(5.0, 100.0, supply=turned)) == []


def test_an_input_below_its_negative_rail():
    """The lower rail counts as well."""
    plus = pin("in", demand=Range(-5.0, 1.0), series=0.0)
    one = stage(inputs=inputs(plus=plus), supply=single())
    assert len(findings(ABOVE_RAIL, one)) == 1


def test_an_unknown_series_resistance_is_not_judged():
    """Where it is not known what lies before the input, nothing is claimed."""
    assert outcomes(ABOVE_RAIL, driven(12.0, None)) == []
    assert outcomes(ABOVE_RAIL, stage(supply=changed(single(), positive=None))) == []
