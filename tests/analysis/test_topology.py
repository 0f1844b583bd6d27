"""Names of stages, and the filters among them."""

import pytest

STAGES = {
    "follower": "VIN in 0 SIN(0 1 1k)\nXU1 in out vp vn out TL072",
    "inverting": "VIN in 0 SIN(0 1 1k)\nR1 in n 10k\nR2 n out 10k\nXU1 0 n vp vn out TL072",
    "non-inverting": "VIN in 0 SIN(0 1 1k)\nR1 0 n 10k\nR2 n out 10k\nXU1 in n vp vn out TL072",
    "difference": (
        "VA a 0 SIN(0 1 1k)\nVB b 0 SIN(0 1 2k)\nR1 a n 10k\nR2 n out 10k\nR3 b p 10k\n"
        "R4 p 0 10k\nXU1 p n vp vn out TL072"
    ),
    "summing": (
        "VA a 0 SIN(0 1 1k)\nVB b 0 SIN(0 1 2k)\nR1 a n 10k\nR2 b n 10k\nR3 n out 10k\n"
        "XU1 0 n vp vn out TL072"
    ),
    "instrumentation amplifier, output": (
        "VA a 0 SIN(0 1 1k)\nVB b 0 SIN(0 1 2k)\nXU2 a m vp vn o1 TL072\nR5 o1 m 20k\nRG m k 2k\n"
        "R6 k o2 20k\nXU3 b k vp vn o2 TL072\nR1 o1 n 10k\nR2 n out 10k\nR3 o2 p 10k\n"
        "R4 p 0 10k\nXU1 p n vp vn out TL072"
    ),
    "transimpedance": "I1 0 n SIN(0 1u 1k)\nR2 n out 100k\nXU1 0 n vp vn out TL072",
    "integrator": "VIN in 0 SIN(0 1 1k)\nR1 in n 10k\nC2 n out 10n\nXU1 0 n vp vn out TL072",
    "multiple-feedback filter": (
        "VIN in 0 SIN(0 1 1k)\nR1 in a 10k\nR2 a out 10k\nR3 a n 5k\nC1 a 0 10n\nC2 n out 2n\n"
        "XU1 0 n vp vn out TL072"
    ),
    "Sallen-Key low-pass": (
        "VIN in 0 SIN(0 1 1k)\nR1 in a 10k\nR2 a p 10k\nC1 a out 2n\nC2 p 0 1n\n"
        "XU1 p out vp vn out TL072"
    ),
    "Sallen-Key high-pass": (
        "VIN in 0 SIN(0 1 1k)\nC1 in a 100n\nC2 a p 100n\nR1 a out 2.7k\nR2 p 0 24k\n"
        "XU1 p out vp vn out TL072"
    ),
    "comparator with hysteresis": (
        "VIN in 0 SIN(0 1 1k)\nR1 p 0 1k\nR2 p out 10k\nXU1 p in vp vn out TL072"
    ),
}


def test_an_integrator_held_by_a_t_is_no_filter(stage):
    """A T of resistors beside the capacitor holds the level; no capacitor stands in it."""
    cards = "VIN in 0 SIN(0 1 1k)\nR1 in n 10k\nC2 n out 10n\nR2 n t 100k\nR3 t out 100k\n"
    assert stage(cards + "R4 t 0 1k\nXU1 0 n vp vn out TL072").topology == "integrator"


@pytest.mark.parametrize("name", STAGES)
def test_stage_is_named_as_people_name_it(stage, name):
    """Each textbook stage by its usual name."""
    assert stage(STAGES[name]).topology == name


def test_signals_added_at_the_non_inverting_input_are_summed(stage):
    """Two signals through a resistor each; a bias divider beside one signal is none."""
    cards = (
        "VA a 0 SIN(0 1 1k)\nR1 a p 10k\n{other}\nR3 n 0 1k\nR4 n out 1k\nXU1 p n vp vn out TL072"
    )
    two = stage(cards.format(other="VB b 0 SIN(0 1 3k)\nR2 b p 10k"))
    assert two.topology == "summing"
    assert stage(cards.format(other="R2 vp p 10k")).topology == "non-inverting"


def test_shared_amplifier_card_with_two_channels(design):
    """A dual package as one card of eight nets gives two stages in one package."""
    cards = "VIN in 0 SIN(0 1 1k)\nU1 a a in vn b b out2 vp TL072\nR1 a b 10k"
    found = design(cards)
    assert [s.designator for s in found.stages] == ["U1A", "U1B"]
    assert [p.designator for p in found.packages] == ["U1"]
