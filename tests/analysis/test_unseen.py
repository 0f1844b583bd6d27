"""What the netlist does not tell, and what of it moves a stage's numbers."""

import pytest

FOLLOWER = "R1 in p 1k\nXU1 p out vp vn out TL072\nRL out 0 10k"
LATER = "VIN in 0 SIN({sine} 100)"


@pytest.mark.parametrize(
    ("sine", "diode", "conducts"),
    [
        # 1 V round 0 V at its anode, or at its cathode
        ("0 1", "D1 p 0 DX", True),
        ("0 1", "D1 0 p DX", True),
        ("0 0.2", "D1 p 0 DX", False),
        ("-2 1", "D1 p 0 DX", False),
        ("2 1", "D1 0 p DX", False),
        # a clamp to either rail
        ("0 10", "D1 p vp DX", False),
        ("0 10", "D1 vn p DX", False),
        ("10 6", "D1 p vp DX", True),
        # backwards it stands off what its model says, less a tenth
        ("2 1", "D1 0 p DZ", True),
        ("0.95 0.9", "D1 0 p DZ", True),
        ("0.9 0.8", "D1 0 p DZ", False),
        ("12 1", "D1 0 p DX", False),
    ],
)
@pytest.mark.parametrize("first", [True, False])
def test_a_diode_that_conducts_bends_what_rests_on_it(stage, sine, diode, conducts, first):
    """From 0.3 V on, or from nine tenths of its breakdown: BV = 2 V. Whatever its place."""
    source = LATER.format(sine=sine)
    cards = f"{diode}\n{source}\n{FOLLOWER}" if first else f"{source}\n{FOLLOWER}\n{diode}"
    found = stage(f"{cards}\n.model DX D\n.model DZ D(BV=2)")
    why = {part: found.unknown[part].why for part in ("output", "current") if part in found.unknown}
    expected = dict.fromkeys(("output", "current"), "it rests on D1, which conducts")
    assert why == (expected if conducts else {})


def test_ground_stands_at_nothing_whatever_current_flows(stage):
    """2 A into half an ohm are no volts at the anode of a diode from ground."""
    cards = f"VIN in 0 SIN(1 0.1 100)\n{FOLLOWER}\nD1 0 p DX\n.model DX D"
    assert "output" not in stage(cards.replace("RL out 0 10k", "RL out 0 0.5")).unknown


@pytest.mark.parametrize("card", ["M1 out g 0 0 MX", "Q1 out g 0 QX", "J1 out g 0 JX"])
def test_a_transistor_that_is_not_followed_takes_what_nobody_knows(stage, card):
    """At the output: the current is open, the range is not."""
    models = ".model MX NMOS\n.model QX NPN\n.model JX NJF"
    found = stage(f"VIN in 0 SIN(1 1 100)\n{FOLLOWER}\n{card}\nVG g 0 0.2\n{models}")
    name = card.split()[0]
    assert f"the transistor {name}" in found.unknown["current"].why
    assert "output" not in found.unknown


def test_what_the_user_states_of_a_net_is_seen(stage):
    """A connector behind 1 kilohm: a signal is stated, and its resistance."""
    cards = "J1 in\nXU1 in out vp vn out TL072\nRL out 0 10k\nRI in 0 10k"
    stated = stage(cards, '[signals]\n"in" = { low = 0, high = 1, ohms = 1000, to = 10 }')
    assert stated.unknown == {}
    assert stated.output.demand.high == pytest.approx(10 / 11, rel=1e-4)
    assert "J1" in stage(cards).unknown["output"].why


def test_a_net_without_a_level_is_held_by_its_capacitor_where_the_signal_is(design):
    """What stands behind another capacitor has its level, and the signal's range."""
    cards = (
        "VIN in 0 SIN(0 1 1k)\nC1 in p 1u\nXU1 p a vp vn a TL072\nC2 a q 1u\nRQ q 0 100k\n"
        "XU2 q out vp vn out TL072\nRL out 0 10k"
    )
    first, second = design(cards).stages
    assert first.unknown["output"].why == "net p has no DC path, so nothing sets its level"
    assert "output" not in second.unknown
    assert second.output.demand.high == pytest.approx(1.0, rel=1e-3)
