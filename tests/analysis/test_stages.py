"""What a stage carries beside its numbers: where its supply is from, what holds it, why not."""

import math

import pytest

from railguard.analysis.bound import Range
from railguard.analysis.reach import Gain
from railguard.analysis.recognise import recognise
from railguard.analysis.stages import _largest, unsolved
from railguard.devices import catalogue
from railguard.settings.model import Settings

FOLLOWER = "VIN in 0 SIN(1 2 100)\nXU1 in out vp vn out TL072\nRL out 0 2k"


@pytest.mark.parametrize(
    ("settings", "supply", "basis"),
    [
        ("", "VP vp 0 15\nVN vn 0 -15", "netlist"),
        ('[nets]\n"vp" = { volts = 15 }\n"vn" = { volts = -15 }', "", "user"),
        ('[nets]\n"vn" = { volts = -15 }', "VP vp 0 15", "user"),
    ],
)
def test_where_a_supply_is_from(stage, settings, supply, basis):
    """One rail that the user states is enough; each pin has its net."""
    found = stage(FOLLOWER, settings, supply=f"{supply}\n").supply
    assert (found.positive, found.negative) == (pytest.approx(15.0), pytest.approx(-15.0))
    assert (found.positive_net, found.negative_net) == ("vp", "vn")
    assert found.basis == basis


@pytest.mark.parametrize("stated", [True, False])
def test_a_use_is_the_user_s_or_worked_out(stage, stated):
    """A trigger is one either way; only one is stated."""
    cards = "VIN in 0 SIN(0 5 100)\nR1 p 0 10k\nR2 p out 100k\nXU1 p in vp vn out TL072"
    found = stage(cards, '[stages]\n"XU1" = { use = "comparator" }' if stated else "")
    assert (found.use, found.use_stated) == ("comparator", stated)


def test_heat_is_not_known_where_an_output_is_not(stage):
    """For the same reason."""
    cards = "VIN in 0 AC 1\nR1 p in 10k\nR2 p out 100k\nXU1 p 0 vp vn out TL072\nRL out 0 2k"
    found = stage(cards)
    assert found.dissipation is None
    assert found.unknown["dissipation"] == found.unknown["output"]


def test_a_circuit_without_an_answer_has_stages_of_which_nothing_is_known(design):
    """Each part with the reason, at its own line, with what the user states of it."""
    amplifiers = recognise(design(FOLLOWER).circuit, catalogue.load(), Settings()).amplifiers
    settings = Settings(uses={"U1": "comparator"})
    (found,) = unsolved(amplifiers, "two sources contradict each other", settings)
    assert {part: reason.why for part, reason in found.unknown.items()} == dict.fromkeys(
        ("supply", "output", "current", "input", "bias", "loop"),
        "two sources contradict each other",
    )
    assert found.location == amplifiers[0].element.location
    assert found.location is not None
    assert (found.use, found.use_stated) == ("comparator", True)


def test_an_outer_loop_holds_what_is_balanced_by_itself(design):
    """As much of its output comes back to either input; ten times that through an inverter."""
    cards = (
        "VIN in 0 SIN(0 1 100)\nXU1 p n vp vn a TL072\nR1 in p 10k\nR2 a p 100k\n"
        "R6 n 0 10k\nR7 a n 100k\nR8 n 0 100k\n"
        "XU2 0 m vp vn b TL072\nR3 a m 10k\nR4 m b 100k\nR5 b p 100k"
    )
    first, second = (s.loop for s in design(cards).stages)
    assert (first.dc, first.holds) == ("negative", ("XU2",))
    assert (second.dc, second.holds) == ("negative", ())


def test_a_band_pass_behind_an_amplifier_has_the_gain_of_both_at_mid_band(design):
    """Ten times two at 1.59 kHz with a Q of one, at 1 kHz."""
    cards = (
        "VIN in 0 SIN(0 1 1.6k)\nRG g 0 1k\nRH g pre 9k\nXU1 in g vp vn pre TL072\nR1 pre a 10k\n"
        "R2 n out 40k\nC1 a out 5n\nC2 a n 5n\nXU2 0 n vp vn out TL072"
    )
    found = design(cards).stages[1]
    assert found.filter.gain == pytest.approx(2.0, rel=1e-3)
    middle = 1 / (2 * math.pi * 5e-9 * 20e3)
    expected = 20 / math.hypot(1, 1e3 / middle - middle / 1e3)
    assert found.gain == (("in", pytest.approx(expected, rel=0.01)),)


def test_the_largest_gain_is_a_magnitude_with_its_ends_in_order():
    """Of an inverting one both change places with their sign."""
    gains = [Gain("a", 1.0, Range(0.9, 1.1)), Gain("b", -2.0, Range(-2.3, -1.8))]
    assert _largest(gains) == (2.0, Range(1.8, 2.3))
    assert _largest(gains[:1]) == (1.0, Range(0.9, 1.1))
    assert _largest([]) == (0.0, Range())


def test_a_controlled_source_is_an_amplifier_of_its_own_gain(design):
    """100,000 behind a divider of ten: 10 / (1 + 1e-4), and it stands in the equations once."""
    cards = (
        "VIN in 0 SIN(0 1 100)\nE1 out 0 in n 1e5\nR1 n 0 1k\nR2 n out 9k\n"
        "XU1 out o2 vp vn o2 OPAMP\nRL o2 0 10k"
    )
    first, second = design(cards).stages
    assert first.designator == "E1"
    assert first.output.demand.high == pytest.approx(10 / (1 + 1e-4), rel=1e-6)
    assert second.output.demand.high == pytest.approx(10 / (1 + 1e-4), rel=1e-4)


def test_a_deck_that_is_all_ground_has_a_stage_of_which_nothing_is_known(stage):
    """No unknown at all is no reason to stop."""
    found = stage("XU1 0 0 0 0 0 TL072\nR1 0 0 1k", supply="")
    assert found.unknown["loop"].why == "the output of XU1 is tied to 0, which something else holds"
    assert (found.output.demand.high, found.current.demand_source) == (None, None)


@pytest.mark.parametrize("card", ["G1 out 0 VALUE={V(in)*1m}", "B1 out 0 I=V(in)*1m"])
def test_an_expression_is_not_worked_out(stage, card):
    """What it takes of the output is open; the volts are the follower's."""
    found = stage(f"{FOLLOWER}\n{card}")
    name = card.split()[0]
    assert f"{name} is an expression" in found.unknown["current"].why
    assert found.output.demand.high == pytest.approx(3.0, rel=1e-4)
    assert "output" not in found.unknown
