"""A large circuit is solved as a small one: the two ways of solving hold each other."""

import numpy as np
import pytest

from railguard.analysis import solve
from railguard.analysis.network import Network
from railguard.analysis.recognise import recognise
from railguard.circuit.model import Control, Element
from railguard.devices import catalogue
from railguard.errors import SolveError
from railguard.settings.model import Settings

CARDS = """VIN in 0 SIN(1 0.2 1k)
R1 in a 10k
C1 a out 2n
R2 a p 10k
C2 p 0 1n
R3 n 0 5k
R4 n out 5k
L1 out load 1m
RL load 0 2k
CL load 0 100n
XU1 p n vp vn out TL072
XU2 0 m vp vn o2 TL072
R5 out m 10k
R6 m o2 22k
"""
HERTZ = np.array([1.0, 1e3, 4.3e4, 1e6])


@pytest.fixture
def network(design):
    """Return the network of two stages, one with a filter and a load that stores energy."""
    circuit = design(CARDS).circuit
    found = recognise(circuit, catalogue.load(), Settings()).amplifiers
    return Network(circuit.elements, found)


@pytest.fixture
def large(monkeypatch):
    """Let every circuit count as large."""

    def make():
        monkeypatch.setattr(solve, "DENSE_LIMIT", 0)

    return make


@pytest.mark.parametrize("hertz", [0.0, *HERTZ])
def test_forwards_and_adjoint_are_the_inverse(network, large, hertz):
    """By numpy's own inverse of G + sC; ground has no row."""
    inverse = np.linalg.inv(network.g + 2j * np.pi * hertz * network.c)
    b = np.arange(network.size) + 1.0 + 0.5j
    for ways in ("dense", "sparse"):
        if ways == "sparse":
            large()
        made = solve.factor(network, hertz)
        scale = np.abs(inverse).max()
        assert made.forward(b) == pytest.approx(inverse @ b, rel=1e-6, abs=1e-12 * scale)
        two = np.stack([b, 2 * b], axis=1)
        assert made.forward(two) == pytest.approx(inverse @ two, rel=1e-6, abs=1e-12 * scale)
        rows = made.adjoint([2, -1, 0])
        expected = np.stack([inverse[2], np.zeros(network.size), inverse[0]])
        assert rows == pytest.approx(expected, rel=1e-6, abs=1e-12 * scale)


def test_loops_are_the_same_either_way(network, large):
    """Both amplifiers' loop transmission at every frequency."""
    small = solve.return_ratios(network, HERTZ)
    large()
    assert solve.return_ratios(network, HERTZ) == pytest.approx(small, rel=1e-6)
    assert np.abs(small[0]).min() > 1e3


def test_steps_are_the_same_either_way(network, large):
    """A hundred steps of a microsecond from rest."""
    b = network.right_hand_side([("VIN", 1.0)]).real
    drive = np.sin(0.1 * np.arange(100))

    def states():
        march = solve.Stepper(network, 1e-6)
        start = march.steady(0.0 * b)
        return np.concatenate(list(march.along(start, b, drive)))

    small = states()
    large()
    assert states() == pytest.approx(small, rel=1e-6, abs=1e-9)


def test_equations_without_an_answer_say_so(large):
    """A conductance that another takes away, whichever way it is solved."""
    fight = Network(
        [
            Element(kind="R", designator="R1", nets=("a", "0"), value=1e3),
            Element(
                kind="G",
                designator="G1",
                nets=("0", "a"),
                control=Control(gain=1e-3, nets=("a", "0")),
            ),
        ],
        (),
    )
    with pytest.raises(SolveError, match="no single answer"):
        solve.factor(fight, 0.0)
    large()
    with pytest.raises(SolveError, match="no single answer"):
        solve.factor(fight, 0.0)
