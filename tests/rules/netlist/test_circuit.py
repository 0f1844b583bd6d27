"""Loose nets, shorted elements, unknown devices, odd values."""

from railguard.circuit.model import Element
from railguard.rules.netlist.circuit import DANGLING, DEVICE_UNKNOWN, SHORTED, VALUE_SERIES, _common
from railguard.settings.model import Load, NetLevel, Settings, Signal
from railguard.units import series_of
from tests.rules.stages import (
    ELEMENTS,
    changed,
    design,
    findings,
    resistor,
    stage,
    unknown_device,
    voltage_source,
)


def judged(rule, *elements, **fields):
    """Return what a rule says of the usual circuit with some elements more."""
    whole = design(stage(), elements=(*ELEMENTS, *elements), **fields)
    return findings(rule, whole, whole)


def test_connected_nets_are_quiet():
    """Nets with two connections, and nets of op-amp pins, draw nothing."""
    assert judged(DANGLING) == []
    assert judged(DANGLING, resistor("R8", 1e3, "in", "0")) == []


def test_a_net_with_one_connection_is_a_remark():
    """A misspelt name leaves two loose ends."""
    (found,) = judged(DANGLING, resistor("R8", 1e3, "outt", "0"))
    assert (found.severity, found.nets, found.designators) == ("remark", ("outt",), ("R8",))


def test_stated_nets_and_unfitted_elements_are_not_loose():
    """A net the user states something for leads somewhere; what is not fitted leads nowhere."""
    lone = resistor("R8", 1e3, "x", "0")
    for settings in (
        Settings(nets={"x": NetLevel(1.0)}),
        Settings(loads=(Load(net="x", ohms=1.0),)),
        Settings(signals=(Signal(name="x"),)),
        Settings(signals=(Signal(name="s", between=("x", "0")),)),
    ):
        assert judged(DANGLING, lone, settings=settings) == []
    assert judged(DANGLING, changed(lone, fitted=False)) == []


def test_a_net_at_something_unseen_is_not_loose():
    """A connector or an opaque element counts as a connection."""
    connector = Element(kind="open", designator="J1", nets=("x",))
    assert judged(DANGLING, resistor("R8", 1e3, "x", "0"), connector) == []


def test_shorted_elements():
    """A resistor across one net does nothing: minor; a source there is major."""
    (found,) = judged(SHORTED, resistor("R8", 1e3, "out", "out"))
    assert (found.severity, found.designators) == ("minor", ("R8",))
    (source,) = judged(SHORTED, voltage_source("VX", 5.0, "a", "a"))
    assert source.severity == "major"
    (meter,) = judged(SHORTED, voltage_source("VX", 0.0, "a", "a"))
    assert meter.severity == "minor"


def test_elements_between_two_nets_or_not_fitted_are_not_shorted():
    """Only what is fitted with both ends on one net is told."""
    assert judged(SHORTED) == []
    assert judged(SHORTED, changed(resistor("R8", 1e3, "a", "a"), fitted=False)) == []


def test_an_unknown_device_is_a_remark_for_all_its_stages():
    """One remark for each name, with every stage of it."""
    whole = design(unknown_device("XU1"), unknown_device("XU2"), stage("XU3"))
    (found,) = findings(DEVICE_UNKNOWN, whole, whole)
    assert (found.severity, found.designators) == ("remark", ("XU1", "XU2"))
    assert "MYAMP (U1 and U2)" in found.message


def test_known_devices_and_amplifiers_without_a_type_are_quiet():
    """OPAMP is no name that a catalogue could know."""
    whole = design(stage(), unknown_device("XU2", generic=True))
    assert findings(DEVICE_UNKNOWN, whole, whole) == []


def test_values_of_a_series_are_quiet():
    """E24, E96 and E192 values can be bought."""
    values = (4700.0, 4990.0, 9.2e3, 0.1)
    parts = [resistor(f"R{i}", v, "a", "b") for i, v in enumerate(values, 10)]
    assert judged(VALUE_SERIES, *parts) == []


def test_the_quick_look_agrees_with_the_standard():
    """Every value the quick look takes is of a series, and it takes all of E24 and E96."""
    for digits in range(100, 1000):
        if _common(digits * 1e-9):
            assert series_of(digits * 1e-9) is not None
        if series_of(float(digits)) in ("E3", "E6", "E12", "E24", "E48", "E96"):
            assert _common(float(digits))


def test_values_of_no_series_are_one_remark():
    """Each is named with its neighbour, up to a number that can be read."""
    parts = [resistor(f"R{i}", 12345.0 + i, "a", "b") for i in range(10, 17)]
    (found,) = judged(VALUE_SERIES, *parts)
    assert found.severity == "remark"
    assert "R10 12.36 kΩ (near 12 kΩ)" in found.message
    assert "and 2 more." in found.message


def test_benches_and_unknown_values_are_not_judged():
    """A bench's values are worked out; a value that is not known is of no series."""
    odd = resistor("R10", 12345.0, "a", "b")
    assert judged(VALUE_SERIES, odd, kind="bench") == []
    assert judged(VALUE_SERIES, changed(odd, value=None), changed(odd, value=0.0)) == []
