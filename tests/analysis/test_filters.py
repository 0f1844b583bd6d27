"""Frequency and Q of filters of second order, with their ranges, by the formulas of the books."""

import math

import pytest

UNITY = (
    "VIN in 0 SIN(0 1 100)\nR1 in a 11.3k\nR2 a p 11.3k\nC1 a out 2n\nC2 p 0 1n\n"
    "XU1 p out vp vn out TL072"
)
GAIN = (
    "VIN in 0 SIN(0 1 100)\nR1 in a 10k\nR2 a p 10k\nC1 a out 10n\nC2 p 0 10n\nR3 n 0 20k\n"
    "R4 n out 10k\nXU1 p n vp vn out TL072"
)
HIGH = (
    "VIN in 0 SIN(0 1 9k)\nC1 in a 10n\nC2 a p 10n\nR1 a out 10k\nR2 p 0 40k\n"
    "XU1 p out vp vn out TL072"
)
LOW = (
    "VIN in 0 SIN(0 1 100)\nR1 in a 10k\nR2 a out 10k\nR3 a n 10k\nC1 a 0 9n\nC2 n out 1n\n"
    "XU1 0 n vp vn out TL072"
)
BAND = (
    "VIN in 0 SIN(0 1 1.6k)\nR1 in a 10k\nR2 n out 40k\nC1 a out 5n\nC2 a n 5n\n"
    "XU1 0 n vp vn out TL072"
)
MFB_HIGH = (
    "VIN in 0 SIN(0 1 9k)\nC1 in a 10n\nC2 a n 10n\nC3 a out 5n\nR1 a {level} 10k\nR2 n out 40k\n"
    "XU1 {level} n vp vn out TL072"
)
SLOW = (
    "VIN in 0 SIN(0 1 0.2)\nR1 in a 1meg\nR2 a out 2meg\nR3 a n 1meg\nC1 a 0 470n\nC2 n out 47n\n"
    "XU1 0 n vp vn out TL072"
)


@pytest.mark.parametrize(
    ("cards", "kind", "hertz", "q", "gain"),
    [
        # 1 / (2 pi R sqrt(C1 C2)), Q = sqrt(C1 / C2) / 2
        (UNITY, "low-pass", 1 / (2 * math.pi * 11.3e3 * math.sqrt(2) * 1e-9), math.sqrt(0.5), 1.0),
        # equal parts: Q = 1 / (3 - K)
        (GAIN, "low-pass", 1 / (2 * math.pi * 1e-4), 1 / 1.5, 1.5),
        # the Q is half the root of R2 over R1
        (HIGH, "high-pass", 1 / (2 * math.pi * 20e3 * 10e-9), 1.0, 1.0),
        # 1 / (2 pi sqrt(R2 R3 C1 C2)), Q = sqrt(C1 / C2) / 3 with equal resistors
        (LOW, "low-pass", 1 / (2 * math.pi * 10e3 * 3e-9), 1.0, 1.0),
        # 1 / (2 pi C sqrt(R1 R2)), Q = sqrt(R2 / R1) / 2
        (BAND, "band-pass", 1 / (2 * math.pi * 5e-9 * 20e3), 1.0, 2.0),
        # two equal resistors in parallel are one, an output's load and an order of cards nothing
        (
            BAND.replace("R1 in a 10k", "RL out 0 10k\nR1 in a 20k\nR9 a in 20k"),
            "band-pass",
            1 / (2 * math.pi * 5e-9 * 20e3),
            1.0,
            2.0,
        ),
        (
            "RL out 0 10k\nC2 p 0 1n\nRT p tp 0\n" + UNITY.replace("\nC2 p 0 1n", ""),
            "low-pass",
            1 / (2 * math.pi * 11.3e3 * math.sqrt(2) * 1e-9),
            math.sqrt(0.5),
            1.0,
        ),
        # 1 / (2 pi sqrt(R1 R2 C2 C3)), Q = sqrt(R2 C2 C3 / R1) / (C1 + C2 + C3), C1 over C3
        *(
            (
                MFB_HIGH.format(level=level) + more,
                "high-pass",
                1 / (2 * math.pi * 20e3 * math.sqrt(50) * 1e-9),
                2 * math.sqrt(50) / 25,
                2.0,
            )
            for level, more in (("0", ""), ("ref", "\nVREF ref 0 1"))
        ),
        # about one hertz the gain is still that at DC; Q = sqrt(C1 / C2 R2 R3) / (sum of 1 / R)
        (
            SLOW,
            "low-pass",
            1 / (2 * math.pi * math.sqrt(2e12 * 470e-9 * 47e-9)),
            math.sqrt(10 / 2) / 2.5,
            2.0,
        ),
    ],
)
def test_a_filter_is_what_its_formula_says(stage, cards, kind, hertz, q, gain):
    """Source: TI SLOA049, TI SLOD006B ch. 16, from memory; worked by hand."""
    found = stage(cards).filter
    assert found.kind == kind
    assert found.frequency == pytest.approx(hertz, rel=1e-4)
    assert found.q == pytest.approx(q, rel=1e-4)
    assert abs(found.gain) == pytest.approx(gain, rel=0.02)


R, C = (1.01, 0.99), (1.1, 0.9)
"""What parts of 1 % and of 10 % may be times their value."""


@pytest.mark.parametrize(
    ("cards", "high", "low"),
    [
        # equal resistors leave the Q alone; the capacitors' ratio is under its root
        (UNITY, (C[0] / C[1]) ** 0.5, (C[1] / C[0]) ** 0.5),
        # powers of the Q: Q - 1/2 of the resistors, 2 Q - 1/2 of the capacitors, one of the gain
        # of 1.5, of which a third moves by 2 %
        (
            GAIN,
            (R[0] / R[1]) ** (1 / 6) * (C[0] / C[1]) ** (5 / 6) / (1 - 0.02 / 3),
            (R[1] / R[0]) ** (1 / 6) * (C[1] / C[0]) ** (5 / 6) / (1 + 0.02 / 3),
        ),
    ],
)
def test_the_ranges_are_those_of_every_part_at_its_worst(stage, cards, high, low):
    """The frequency goes with one over the root of all four; each part at the end that counts."""
    found = stage(cards).filter
    assert found.frequency_worst.high == pytest.approx(found.frequency / (R[1] * C[1]), rel=1e-4)
    assert found.frequency_worst.low == pytest.approx(found.frequency / (R[0] * C[0]), rel=1e-4)
    assert found.q_worst.high == pytest.approx(found.q * high, rel=1e-3)
    assert found.q_worst.low == pytest.approx(found.q * low, rel=1e-3)


@pytest.mark.parametrize(
    ("cards", "gain", "off"),
    [
        (LOW, 1.0, 2 * 0.01),  # R2 over R1
        (MFB_HIGH.format(level="0"), 2.0, 2 * 0.1),  # C1 over C3
        # R2 over R1, and C1 over the sum of both capacitors at the middle of the band
        (BAND, 2.0, 2 * 0.01 + 2 * 0.1 * 0.5),
    ],
)
def test_how_far_the_gain_of_a_multiple_feedback_filter_may_be_off(stage, cards, gain, off):
    """By the powers of its parts, to first order."""
    found = stage(cards).filter
    assert found.gain_worst.low == pytest.approx(gain * (1 - off), rel=1e-3)
    assert found.gain_worst.high == pytest.approx(gain * (1 + off), rel=1e-3)


@pytest.mark.parametrize(
    "cards",
    [
        UNITY + "\nL1 p 0 1m",  # of third order
        UNITY.replace("C1 a out 2n", "C1 a 0 2n"),  # nothing leads back: two sections in a row
        "VIN in 0 SIN(0 1 100)\nR1 in n 10k\nR2 n out 10k\nC2 n out 1n\nXU1 0 n vp vn out TL072",
        "VIN in 0 SIN(0 1 100)\nXU1 in out vp vn out TL072",
    ],
)
def test_what_is_no_filter_of_second_order(stage, cards):
    """One pole, none, or two that no amplifier couples."""
    assert stage(cards).filter is None
