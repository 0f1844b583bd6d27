"""The linear transient: steps taken many at once are the steps taken one by one."""

import numpy as np
import pytest

from railguard.analysis.network import Network
from railguard.analysis.solve import LONGEST_STRETCH, Stepper
from railguard.analysis.transient import excursion
from railguard.circuit.model import Element
from railguard.circuit.sources import Exponential, Piecewise, Pulse, Source


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
