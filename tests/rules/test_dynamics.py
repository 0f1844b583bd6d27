"""Whether a stage is fast enough."""

import pytest

from railguard.analysis.bound import Range
from railguard.analysis.loop import Filter, Loop
from railguard.rules.dynamics import COUPLING, FILTER, LOOP_GAIN, SLEW
from tests.rules.stages import (
    FAMILY,
    changed,
    design,
    figure,
    findings,
    open_points,
    outcomes,
    stage,
    unknown_device,
)


def with_loop_gain(left, **fields):
    """Make a stage with some loop gain left at 20 kHz."""
    loop = Loop(dc="negative", noise_gain=11.0, band=20e3, loop_gain=left)
    return stage(**{"loop": loop, **fields})


@pytest.mark.parametrize(
    ("left", "severity"), [(100.0, None), (7.0, None), (6.9, "minor"), (0.5, "critical")]
)
def test_loop_gain_at_the_top_of_the_band(left, severity):
    """Seven leave 1 % of error; below one the band lies beyond the bandwidth."""
    assert [f.severity for f in findings(LOOP_GAIN, with_loop_gain(left))] == (
        [severity] if severity else []
    )


def test_loop_gain_says_what_is_lost_and_what_would_do():
    """The error in percent, and the gain-bandwidth product wanted."""
    (found,) = findings(LOOP_GAIN, with_loop_gain(2.0))
    assert "its gain falls short by 11 %" in found.message
    assert "1.54 MHz gain-bandwidth" in found.remedy


def test_loop_gain_without_a_band_a_speed_or_a_device():
    """Without a band nothing is asked; an unlisted speed and an unknown device are listed."""
    assert outcomes(LOOP_GAIN, stage(loop=Loop(dc="negative"))) == []
    assert len(open_points(LOOP_GAIN, with_loop_gain(None))) == 1
    assert len(open_points(LOOP_GAIN, with_loop_gain(None, family=None))) == 1
    assert outcomes(LOOP_GAIN, with_loop_gain(0.5, use="comparator")) == []


def slewing(slope, **fields):
    """Make a stage whose output moves at some slope; the device does 13, 8 guaranteed V/µs."""
    return stage(output=changed(stage().output, slew=slope, frequency=20e3), **fields)


@pytest.mark.parametrize(
    ("slope", "severity"),
    [(5e6, None), (5.3e6, None), (5.4e6, "minor"), (9e6, "major"), (14e6, "critical")],
)
def test_the_steepest_slope(slope, severity):
    """One and a half times the slope is wanted of the guaranteed slew rate."""
    assert [f.severity for f in findings(SLEW, slewing(slope))] == ([severity] if severity else [])


def test_slew_says_its_numbers():
    """Slopes are written as data sheets write them."""
    (found,) = findings(SLEW, slewing(14e6))
    assert found.message.startswith(
        "U1's output must move at 14 V/µs at 20 kHz; a TL072 slews at 13 V/µs (typical, data sheet)"
    )


def test_slew_of_unknown_devices_and_figures_is_listed():
    """What is not listed is not judged; without a slope nothing is asked."""
    bare = changed(FAMILY, slew_rate=figure())
    assert len(open_points(SLEW, slewing(1e6, family=bare))) == 1
    assert len(open_points(SLEW, slewing(1e6, family=None))) == 1
    assert outcomes(SLEW, slewing(None)) == []
    assert findings(SLEW, unknown_device()) == []


def coupled(corner, bottom=20.0):
    """Make a stage behind coupling capacitors."""
    return stage(high_pass=corner, band=Range(bottom, 20e3))


@pytest.mark.parametrize(
    ("corner", "severity"), [(5.0, None), (10.0, None), (11.0, "remark"), (30.0, "minor")]
)
def test_the_corner_of_a_coupling(corner, severity):
    """Half the lowest frequency costs 1 dB; beyond it a remark, inside the band minor."""
    assert [f.severity for f in findings(COUPLING, coupled(corner))] == (
        [severity] if severity else []
    )


def test_a_coupling_says_what_is_lost():
    """The loss in decibels, and how much larger the capacitors must be."""
    (found,) = findings(COUPLING, coupled(20.0))
    assert "3.01 dB are lost" in found.message
    assert "Fit coupling capacitors 2 times as large" in found.remedy


def test_a_band_from_dc_or_unknown_is_not_judged():
    """Without a lowest frequency nothing is asked."""
    assert outcomes(COUPLING, coupled(30.0, None)) == []
    assert outcomes(COUPLING, coupled(30.0, 0.0)) == []
    assert outcomes(COUPLING, coupled(None)) == []


def test_a_filters_own_corner_is_meant():
    """A filter stage, or one in a ring of stages, is not called a coupling."""
    one = changed(coupled(30.0), filter=Filter("high-pass", 100.0, 0.7))
    assert outcomes(COUPLING, one) == []
    ring = design(
        changed(coupled(30.0), after=("XU2",)), stage("XU2", after=("XU3",)),
        stage("XU3", after=("XU1",)),
    )  # fmt: skip
    assert outcomes(COUPLING, ring.stages[0], ring) == []
    chain = design(changed(coupled(30.0), after=("XU2",)), stage("XU2"))
    assert len(findings(COUPLING, chain.stages[0], chain)) == 1


def filtering(hertz, q=0.707, gain=1.0, **fields):
    """Make a filter stage of a device of 3 MHz."""
    return stage(filter=Filter("low-pass", hertz, q, gain), **fields)


@pytest.mark.parametrize(
    ("hertz", "q", "gain", "severity"),
    [
        (1e3, 0.707, 1.0, None),
        (30e3, 0.707, 1.0, None),
        (31e3, 0.707, 1.0, "minor"),
        (10e3, 4.0, 1.0, "minor"),
        (10e3, 0.707, 4.0, "minor"),
        (1e5, 4.0, 1.0, "major"),
    ],
)
def test_a_filter_wants_bandwidth(hertz, q, gain, severity):
    """A hundred times frequency, Q and gain are wanted; a tenth of that is far too little."""
    assert [f.severity for f in findings(FILTER, filtering(hertz, q, gain))] == (
        [severity] if severity else []
    )


def test_the_gain_of_a_two_sided_band_pass_does_not_move_it():
    """S. Franco, ex. 6.12: frequency falls by Q f / GBW, whatever stands before its network."""
    narrow = Filter("band-pass", 5e3, 4.0, 10.0)
    assert not findings(FILTER, stage(filter=narrow, topology="multiple-feedback filter"))
    assert findings(FILTER, stage(filter=narrow, topology="Sallen-Key band-pass"))


def test_a_filter_says_what_it_is_and_wants():
    """Frequency, Q, gain and the product wanted stand in the sentence."""
    (found,) = findings(FILTER, filtering(10e3, 4.0))
    assert found.message.startswith("U1 is a low-pass at 10 kHz with a Q of 4 and a gain of 1, ")
    assert "wants a gain-bandwidth product of 4 MHz; a TL072 has 3 MHz" in found.message


def test_a_filter_of_unknown_speed_is_listed():
    """An unlisted product and an unknown device are not checked; other stages are not judged."""
    bare = changed(FAMILY, gain_bandwidth=figure())
    assert len(open_points(FILTER, filtering(1e3, family=bare))) == 1
    assert len(open_points(FILTER, filtering(1e3, family=None))) == 1
    assert outcomes(FILTER, stage()) == []
