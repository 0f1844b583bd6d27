"""What stands around an amplifier: its feedback network, dividers and loads, by hand."""

import pytest

INVERTING = "VIN in 0 SIN(0 0.5 1k)\nR1 in n 10k\nR2 n out 100k\nXU1 0 n vp vn out OPAMP"
TEE = (
    "VIN in 0 SIN(0 10m 1k)\nR1 in n 10k\nR2 out t 50k\nR3 t 0 1k\nR4 t n 50k\n"
    "XU1 0 n vp vn out OPAMP"
)


@pytest.mark.parametrize("turned", [False, True])
def test_the_network_of_a_non_inverting_stage(stage, turned):
    """9 and 1 kilohm: 900 ohm at the input, 10 kilohm to the output, 0.5 mA of 2 V and 3 V.

    The order of the cards changes nothing.
    """
    cards = ["VIN in 0 SIN(0.2 0.3 1k)", "XU1 in n vp vn out OPAMP", "R2 out n 9k", "R1 n 0 1k"]
    found = stage("\n".join(cards[:: -1 if turned else 1])).feedback
    assert found.elements == ("R2",)
    assert found.resistance == pytest.approx(9e3, rel=1e-6)
    assert found.seen == pytest.approx(900.0, rel=1e-6)
    assert found.load == pytest.approx(10e3, rel=1e-6)
    assert found.current == pytest.approx(0.5e-3, rel=1e-3)
    assert found.capacitance == 0.0


def test_a_capacitor_beside_the_resistor_is_no_way_back_at_dc(stage):
    """The resistor is named though the capacitors come first; both of them count together."""
    cards = INVERTING.replace("R2 n", "C2 n out 10p\nC3 out n 22p\nC4 n 0 1n\nR2 n")
    found = stage(cards).feedback
    assert found.elements == ("R2",)
    assert found.capacitance == pytest.approx(32e-12)
    alone = stage(cards.replace("R2 n out 100k", "RL out 0 100k")).feedback
    assert alone.elements == ("C2",)


def test_a_tee_counts_as_the_resistor_it_stands_for(stage):
    """R2 + R4 + R2 R4 / R3 = 2.6 megohm; to the output it is 50 kilohm and 1 in parallel with 60.

    The current is what goes into its first resistor: 2.6 V less what is left at the tee.
    """
    found = stage(TEE).feedback
    assert found.elements == ("R2", "R4")
    assert found.resistance == pytest.approx(2.6e6, rel=1e-6)
    below = 1 / (1 / 1e3 + 1 / 60e3)
    assert found.load == pytest.approx(50e3 + below, rel=1e-6)
    # the tee stands 50 kilohm of 1 uA away from the input, which the loop holds at ground
    assert found.current == pytest.approx((2.6 - 0.05) / 50e3, rel=2e-3)


def test_a_wire_is_no_resistance(stage):
    """Neither elements nor a load of its own."""
    found = stage("VIN in 0 1\nXU1 in out vp vn out OPAMP\nRL out 0 10k").feedback
    assert (found.elements, found.resistance) == ((), 0.0)


def test_capacitors_at_an_output_add_up(stage):
    """Straight to a held net, and no others; of its resistors the smallest is the heaviest."""
    cards = (
        f"{INVERTING}\nC5 out 0 1n\nC6 vp out 2.2n\nC7 out x 100n\nRX x 0 50\nRL out 0 10k\n"
        "RM out 0 2k"
    )
    found = stage(cards).current
    assert found.load_capacitance == pytest.approx(3.2e-9)
    assert found.into == "RM"


def test_a_bypassed_divider_is_its_resistors_alone(stage):
    """100 kilohm against 25: 20 kilohm at the tap; a microfarad to ground, one to the rail."""
    cards = (
        "R5 vp p 100k\nR6 p 0 25k\nC5 p 0 1u\nC6 vp p 1u\nVIN in 0 SIN(0 1 1k)\nC1 in p 1u\n"
        "XU1 p out vp vn out OPAMP"
    )
    found = stage(cards).inputs.plus
    assert found.divider.elements == ("R5", "R6")
    assert found.divider.resistance == pytest.approx(20e3)
    assert found.divider.bypass == pytest.approx(2e-6)
    assert found.level == pytest.approx(3.0, rel=1e-3)


@pytest.mark.parametrize(
    ("cards", "ohms"),
    [
        ("R8 in a 1k\nR9 a p 4.7k", 5.7e3),
        # the least of two ways, however many parts it takes
        ("R8 in a 1k\nR9 a p 1k\nR7 in p 10k", 2e3),
        ("R7 in p 1.5k\nR8 in a 1k\nR9 a p 1k", 1.5e3),
    ],
)
def test_what_stands_before_a_pin(stage, cards, ohms):
    """The least series resistance between it and what drives it."""
    found = stage(f"VIN in 0 SIN(0 1 1k)\n{cards}\nXU1 p out vp vn out OPAMP\nRL out 0 10k")
    assert found.inputs.plus.series == pytest.approx(ohms)
