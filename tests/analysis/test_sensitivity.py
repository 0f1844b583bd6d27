"""Derivatives to elements from one forward and one adjoint solution, by hand."""

import numpy as np
import pytest

from railguard.analysis.equations import Stamp
from railguard.analysis.sensitivity import TAIL, Elements, patterns, weighty

ADJOINT = np.array([[2.0, 3.0, 5.0]], dtype=complex)
X = np.array([7.0, 11.0, 13.0], dtype=complex)


def test_one_of_each_kind():
    """A conductance g (a0 - a1)(x0 - x1), -sC a1 x1 to ground, and sL a2 x2 of a coil's own row."""
    elements = Elements.of(
        [
            Stamp("R1", "R", 0, 1, 1e-3),
            Stamp("C1", "C", 1, -1, 4e-9),
            Stamp("L1", "L", 2, 2, 6e-3),
        ]
    )
    assert (elements.names, len(elements)) == (("R1", "C1", "L1"), 3)
    s = 1e3j
    expected = [1e-3 * (2 - 3) * (7 - 11), -s * 4e-9 * 3 * 11, s * 6e-3 * 5 * 13]
    assert elements.pulls(ADJOINT, X, s)[0] == pytest.approx(np.array(expected))
    assert elements.pulls(ADJOINT, X, 0j)[0] == pytest.approx(np.array([expected[0], 0.0, 0.0]))


def test_what_makes_up_a_sum_but_for_its_tail():
    """What is left out adds to no more than the tail's share."""
    weight = np.array([1.0, TAIL / 10, 0.5, 0.0])
    heavy, rest = weighty(weight)
    assert (heavy.tolist(), rest.tolist()) == ([0, 2], [1, 3])
    assert weight[rest].sum() <= TAIL * weight.sum()
    heavy, rest = weighty(np.zeros(2))
    assert (heavy.tolist(), rest.tolist()) == ([], [0, 1])
    many = np.array([1.0, *[2 * TAIL / 100] * 99])
    assert len(weighty(many)[0]) == 100


def test_patterns_have_no_row_for_ground():
    """Plus one, minus one, or one of them alone."""
    made = patterns(np.array([0, 1]), np.array([2, -1]), 3)
    assert made.real.tolist() == [[1, 0], [0, 1], [-1, 0]]
