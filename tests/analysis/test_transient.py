"""The linear transient: steps taken many at once are the steps taken one by one."""

import numpy as np
import pytest

from railguard.analysis.network import Network
from railguard.analysis.solve import LONGEST_STRETCH, Stepper
from railguard.analysis.transient import excursion, value_at, window
from railguard.circuit.model import Element
from railguard.circuit.sources import (
    AmplitudeModulated,
    Exponential,
    FrequencyModulated,
    Piecewise,
    Pulse,
    Sine,
    Source,
)


def element(kind, nets, value, name):
    """Return an element between two nets."""
    source = Source(0.0) if kind == "V" else None
    return Element(kind=kind, designator=name, nets=nets, value=value, source=source)


def ladder():
    """Return a source behind two RC sections and a coil."""
    return Network(
        [
            element("V", ("in", "0"), None, "V1"),
            element("R", ("in", "a"), 1e3, "R1"),
            element("C", ("a", "0"), 1e-7, "C1"),
            element("R", ("a", "b"), 2e3, "R2"),
            element("C", ("b", "0"), 5e-8, "C2"),
            element("L", ("b", "c"), 1e-2, "L1"),
            element("R", ("c", "0"), 1e4, "R3"),
        ],
        (),
    )


@pytest.mark.parametrize("count", [1, 5, LONGEST_STRETCH, LONGEST_STRETCH + 1, 1000])
def test_stretches_of_steps_are_the_steps_one_by_one(count):
    """Backward Euler by the book beside it, with a drive that never repeats."""
    network, step = ladder(), 1e-5
    b = network.right_hand_side([("V1", 1.0)]).real
    drive = np.random.default_rng(count).normal(size=count)
    march = Stepper(network, step)
    start = march.steady(b)
    states = np.concatenate(list(march.along(start, b, drive)))
    matrix, x = network.g + network.c / step, start
    for n in range(count):
        x = np.linalg.solve(matrix, network.c / step @ x + b * drive[n])
        assert states[n] == pytest.approx(x, rel=1e-9, abs=1e-12)


RC = [
    element("V", ("in", "0"), None, "V1"),
    element("R", ("in", "a"), 1e3, "R1"),
    element("C", ("a", "0"), 1e-7, "C1"),
]


@pytest.mark.parametrize(
    ("wave", "highest"),
    [
        # 1 kilohm and 100 nF: 100 us. A step of 100 us reaches 1 - 1/e.
        (Pulse(0.0, 1.0, 0.0, 1e-9, 1e-9, 1e-4, 1e-2), 1 - np.exp(-1)),
        # A ramp of 1 V in 1 ms and a millisecond to catch up.
        (Piecewise(((0.0, 0.0), (1e-3, 1.0), (2e-3, 1.0))), 1.0),
        # Two equal time constants: 1 - (1 + t/tau) exp(-t/tau) at the end of five of them.
        (Exponential(0.0, 1.0, 0.0, 1e-4, None, None), 1 - 6 * np.exp(-5)),
    ],
)
def test_a_first_order_stage_follows_a_wave(wave, highest):
    """By hand, within the half per cent that the step size costs."""
    network = Network(RC, ())
    found = excursion(network, "V1", wave, 0.0)
    assert found.up[network.row("a")] == pytest.approx(highest, rel=5e-3)


def test_a_corner_of_a_wave_falls_on_a_step():
    """A photodiode's current that turns at one instant: 0.1 V and 90 uA in 53.6 kilohm."""
    network = Network([*RC[:1], element("R", ("in", "0"), 1e3, "R1")], ())
    wave = Piecewise(((0.0, 0.0), (1.0, 4.824), (2.0, 0.0)))
    assert excursion(network, "V1", wave, 0.0).up[network.row("in")] == pytest.approx(4.824)


SINE = Sine(1.0, 2.0, 1e3, 1e-3, 100.0, 90.0)
PULSE = Pulse(0.0, 5.0, 1e-3, 1e-3, 2e-3, 3e-3, 10e-3)
STEP = Pulse(1.0, 3.0, 1e-3)
EXPONENTIAL = Exponential(1.0, 3.0, 1e-3, 1e-3, 3e-3, 2e-3)
TEETH = Piecewise(((0.0, 0.0), (1.0, 1.0), (2.0, 0.0)), 0.0)


@pytest.mark.parametrize(
    ("wave", "at", "expected"),
    [
        (SINE, 0.0, 3.0),  # until its delay it stands at its phase
        (SINE, 1e-3, 3.0),
        (SINE, 1.25e-3, 1.0),
        (SINE, 2e-3, 1 + 2 * np.exp(-0.1)),
        (Sine(0.5, 1.0), 1.0, 0.5),  # no frequency: a level
        (PULSE, 0.5e-3, 0.0),
        (PULSE, 1.5e-3, 2.5),
        (PULSE, 3e-3, 5.0),
        (PULSE, 5e-3, 5.0),
        (PULSE, 6e-3, 2.5),
        (PULSE, 8e-3, 0.0),
        (PULSE, 11.25e-3, 1.25),  # it comes round ten milliseconds after it began
        (STEP, 0.9e-3, 1.0),
        (STEP, 1.1e-3, 3.0),
        (STEP, 1e3, 3.0),  # without a width it stays
        (EXPONENTIAL, 0.5e-3, 1.0),
        (EXPONENTIAL, 2e-3, 1 + 2 * (1 - np.exp(-1))),
        (EXPONENTIAL, 5e-3, 1 + 2 * (1 - np.exp(-4)) - 2 * (1 - np.exp(-1))),
        (Exponential(0.0, 1.0, 0.0, 1e-3, 1e-3), 2e-3, np.exp(-1) - np.exp(-2)),  # one tau for both
        (Exponential(0.0, 1.0, 1e-3), 1.1e-3, 1.0),  # none at all: a step
        (Piecewise(((0.0, 1.0), (1.0, 3.0))), 0.5, 2.0),
        (Piecewise(((0.0, 1.0), (1.0, 3.0))), 9.0, 3.0),
        (Piecewise(((0.0, 1.0), (1.0, 3.0)), None, 1.0), 1.5, 2.0),
        (TEETH, 2.5, 0.5),
        (TEETH, 5.0, 1.0),
        (Piecewise(((0.0, 0.0), (1.0, 1.0), (2.0, 0.0)), 1.0), 2.25, 0.75),  # from its middle on
        (Piecewise(((0.0, 0.0), (1.0, 1.0)), 1.0), 1.5, 1.0),  # nothing to start over with
        (FrequencyModulated(1.0, 2.0, 1e3, 0.5, 250.0), 1e-3, 1 + 2 * np.sin(0.5)),
        (FrequencyModulated(1.0, 2.0, 1e3, 0.0, 250.0), 0.25e-3, 3.0),
        (FrequencyModulated(1.0, 2.0), 0.25e-3, 1.0),
        (AmplitudeModulated(2.0, 1.0, 250.0, 1e3), 1.25e-3, 2 * (1 + np.sin(0.625 * np.pi))),
        (AmplitudeModulated(2.0, 1.0, 250.0, 1e3, 1e-3), 1.25e-3, 2 * (1 + np.sin(np.pi / 8))),
        (AmplitudeModulated(2.0, 1.0, 250.0, 1e3, 1e-3), 0.25e-3, 0.0),
    ],
)
def test_waves_by_the_formulas_of_spice(wave, at, expected):
    """Source: SPICE3 user's manual, independent sources; worked by hand."""
    assert value_at(wave, np.array([at]))[0] == pytest.approx(expected, abs=1e-9)


@pytest.mark.parametrize(
    ("wave", "length", "finest"),
    [
        (Sine(0.0, 1.0, 1e3), 2e-3, 1e-3 / 32),
        (PULSE, 21e-3, 0.21e-3),  # two periods behind its delay, in hundredths
        (Pulse(0.0, 1.0, 0.0, 1e-6, 2e-6, 1e-3), 2 * 1.003e-3, 1e-6),
        (EXPONENTIAL, 3e-3 + 5 * 2e-3, 1e-3),
        (Exponential(0.0, 1.0, 1e-3, 1e-3), 6e-3, 1e-3),
        (Piecewise(((0.0, 1.0), (1.0, 3.0), (1.5, 3.0))), 1.8, 0.5),
        (Piecewise(((0.0, 1.0), (1.0, 3.0)), None, 2.0), 3.2, 1.0),
        (TEETH, 1.2 * 4.0, 1.0),
        (FrequencyModulated(0.0, 1.0, 1e3, 2.0, 100.0), 20e-3, 1 / 9600),
        (AmplitudeModulated(1.0, 1.0, 100.0, 1e3, 1e-3), 21e-3, 1 / 8800),
    ],
)
def test_how_long_a_wave_is_followed_and_how_finely(wave, length, finest):
    """To its end or twice round, and as finely as what is quickest in it."""
    assert window(wave) == (pytest.approx(length), pytest.approx(finest))


def test_a_modulated_carrier_is_followed_to_its_crest():
    """(1 + 1) x 0.5 V where the envelope is fullest, through nothing but a resistor."""
    network = Network([*RC[:1], element("R", ("in", "0"), 1e3, "R1")], ())
    wave = AmplitudeModulated(0.5, 1.0, 100.0, 2e3)
    found = excursion(network, "V1", wave, 0.0)
    assert found.up[network.row("in")] == pytest.approx(1.0, rel=0.02)
    assert found.down[network.row("in")] == pytest.approx(1.0, rel=0.02)


def test_a_wave_is_measured_from_its_mean():
    """A square between 1 and 5 V round 2 V goes 3 V up and 1 V down."""
    network = Network([*RC[:1], element("R", ("in", "0"), 1e3, "R1")], ())
    wave = Pulse(1.0, 5.0, 0.0, 1e-6, 1e-6, 1e-3, 2e-3)
    found = excursion(network, "V1", wave, 2.0)
    row = network.row("in")
    assert (found.up[row], found.down[row]) == (pytest.approx(3.0), pytest.approx(1.0))
    assert found.slew[row] == pytest.approx(4e6, rel=0.01)
