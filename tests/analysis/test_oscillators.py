"""Circuits that move by themselves, beside faults that look like them."""

import pytest

WIEN = """
R1 out a 39k
C1 a p 10n
R2 p 0 39k
C2 p 0 10n
RG n 0 10k
RF n out {gain}
XU1 p n vp vn out TL072
"""
PHASE_SHIFT = """
C1 out a 10n
R1 a 0 10k
C2 a b 10n
R2 b 0 10k
C3 b c 10n
R3 c n 10k
RF n out {gain}
XU1 0 n vp vn out TL072
"""
GENERATOR = """
R1 square n 100k
C1 n tri 10n
XU1 0 n vp vn tri TL072
R2 tri p 10k
R3 square p 22k
XU2 {inputs} vp vn square TL072
"""
RELAXATION = """
R1 out p 10k
R2 p 0 10k
R3 out n 47k
C1 n 0 100n
XU1 p n vp vn out TL072
"""


@pytest.mark.parametrize("cards", [WIEN.format(gain="22k"), PHASE_SHIFT.format(gain="330k")])
def test_a_circuit_that_swings_with_an_ideal_amplifier_is_an_oscillator(stage, cards):
    """A Wien bridge over a gain of three, and three sections with more than 29."""
    assert stage(cards).use == "oscillator"


def test_a_bridge_that_stands_on_a_reference_is_an_oscillator(stage):
    """A source that stands still is as good as ground, at either resistor."""
    cards = WIEN.format(gain="{gain}k").replace("R2 p 0", "R2 p ref").replace("RG n 0", "RG n ref")
    for gain, use in ((22, "oscillator"), (18, "linear")):
        assert stage(f"{cards.format(gain=gain)}\nVREF ref 0 1").use == use


@pytest.mark.parametrize("cards", [WIEN.format(gain="18k"), PHASE_SHIFT.format(gain="220k")])
def test_below_the_gain_it_takes_it_is_an_amplifier(stage, cards):
    """A Wien bridge under three and a phase shift under 29 die out."""
    assert stage(cards).use == "linear"


def test_a_signal_makes_it_an_amplifier(stage):
    """A filter that oscillates although a signal enters it is a fault, no oscillator."""
    cards = WIEN.format(gain="22k").replace("R2 p 0", "VIN in 0 SIN(0 1 100)\nR2 p in")
    assert stage(cards).use == "linear"


def test_a_net_that_leaves_the_sheet_may_bring_a_signal(stage):
    """What a connector brings cannot be seen."""
    cards = WIEN.format(gain="22k").replace("R2 p 0", "J1 in CONN\nR2 p in")
    assert stage(cards).use == "linear"


def test_a_function_generator_is_an_oscillator_and_its_ramp_is_not_followed(design):
    """The integrator is held by the Schmitt trigger; what it reaches is no number of ours."""
    found = {s.designator: s for s in design(GENERATOR.format(inputs="p 0")).stages}
    assert found["XU1"].use == found["XU2"].use == "oscillator"
    assert found["XU1"].loop.holds == ("XU2",)
    assert found["XU1"].output.demand.high is None


def test_a_function_generator_with_swapped_inputs_is_none(design):
    """With negative feedback round the second stage nothing turns."""
    found = {s.designator: s for s in design(GENERATOR.format(inputs="0 p")).stages}
    assert found["XU2"].use != "oscillator"


def test_a_relaxation_oscillator_stands_at_its_limits(stage):
    """The capacitor is on a net of its own."""
    assert stage(RELAXATION).use == "oscillator"


def test_a_stated_use_is_kept(stage):
    """Whoever says linear gets the judgement of a linear stage."""
    cards = WIEN.format(gain="22k")
    assert stage(cards, '[stages]\n"XU1" = { use = "linear" }').use == "linear"


def test_a_rails_own_amplitude_is_taken_where_nothing_else_sets_it(design):
    """What follows an oscillator without diodes may get all its output reaches."""
    follower = "XU2 out o2 vp vn o2 TL072\nRL o2 0 10k"
    plain = {s.designator: s for s in design(WIEN.format(gain="22k") + follower).stages}
    assert plain["XU2"].output.demand.high > 12.0
    held = WIEN.format(gain="15k").replace("RF n out", "RF n m") + "RV m out 6.8k\n"
    held += "D1 m out DX\nD2 out m DX\n" + follower
    limited = {s.designator: s for s in design(held).stages}
    assert limited["XU1"].use == "oscillator"
    assert limited["XU2"].output.demand.high is None


INTEGRATOR = """
VIN in 0 1
R1 in n 100k
C1 n out 1u
XU1 0 n vp vn out TL072
{reset}
R2 d out 100
"""


@pytest.mark.parametrize("reset", ["S1 n d c 0 SX\nVC c 0 5", "U2 n d c 0 vp CD4066\nVC c 0 5"])
def test_a_reset_is_seen_where_it_bridges_the_capacitor(stage, reset):
    """A switch from the inverting input to the output may close the loop."""
    found = stage(INTEGRATOR.format(reset=reset))
    assert found.loop.dc == "open"
    assert len(found.loop.bridges) == 1
    assert found.use == "linear"


def test_a_switch_elsewhere_is_no_reset(stage):
    """A switch at the signal leaves the integrator open."""
    assert stage(INTEGRATOR.format(reset="S1 in d c 0 SX\nVC c 0 5")).loop.bridges == ()
