"""Decks that once broke a review, each kept as it was found."""

import pytest

from tests.fuzz.hold import hold

FOUND = {
    "everything on ground": "gauge\nX1 0 0 0 0 0 TL072\n",
    "a value beyond what a computer holds": "gauge\nR1 0 0 10k\nR2 0 n1 1e400\nL1 n1 0\n" * 3,
    "an answer in time without end": (
        "stage\nVIN in 0 PULSE(0 5 0 1n 1n 1m 2m)\nR1 in m 1\nR2 m out 1\nC2 m out 0.0001\n"
        "R3 p 0 1e+05\nXU1 m p vp vn out TL072\nRL out 0 1\nVP vp 0 12\nVN vn 0 -12\nR9 out p 10k\n"
    ),
    "an output that moves one way only": (
        "stage\nVIN in 0 PULSE(0 5 0 1n 1n 1m 2m)\nR1 in m 1\nR2 m out 100\nC2 m out 0.0001\n"
        "R3 p 0 1000\nXU1 p m vp vn out TL072\nRL out 0 1\nVP vp 0 12\nVN vn 0 -12\n"
        "R9 out p 10k\n"
    ),
    "a battery of one node": "gauge\nb x.lib\nb2 x.lib tt\nX1 0 0 0 0 0 TL072\n",
    "everything in one parenthesis": (
        "gauge\nVR (   v 2 200)\nIC1 (a b) x(1 2)\nX1 0 0 0 0 0 TL072\n"
    ),
    "a node of empty quotes": "gauge\nM1 P ` v 2 '' n out 1meg\nR1 P 0 1k\nR2 '' 0 1k\n",
    "a condition without one": "gauge\nV1 a 0 5\n.if\nR1 a 0 1k\n.endif\nX1 0 0 a 0 b TL072\n",
    "steering characters": "gauge\nR1\x9b31m a \u202eb 1k\nX1 a b c d \u2066e ODD\n",
}


@pytest.mark.parametrize("deck", FOUND.values(), ids=FOUND)
def test_found(deck, tmp_path):
    """It is reviewed like any other."""
    assert hold(deck.encode(), tmp_path).designs
