"""Loop sign, noise gain, bandwidth and phase margin against hand calculation."""

import pytest


def test_noise_gain_of_an_inverting_stage(stage):
    """Gain -10 has a noise gain of 11; the bandwidth is GBW over it."""
    found = stage("VIN in 0 AC 1\nR1 in n 10k\nR2 n out 100k\nXU1 0 n vp vn out TL072")
    assert found.loop.dc == "negative"
    assert found.loop.noise_gain_dc == pytest.approx(11.0, rel=1e-6)
    gbw = found.family.gain_bandwidth.typical
    assert found.loop.crossover == pytest.approx(gbw / 11.0, rel=0.01)


def test_swapped_inputs_are_positive_feedback(stage):
    """The feedback divider on the non-inverting input."""
    found = stage("VIN in 0 SIN(0 0.1 1k)\nR1 in p 10k\nR2 p out 100k\nXU1 p 0 vp vn out TL072")
    assert found.loop.dc == "positive"
    assert found.loop.beta_plus == pytest.approx(1 / 11, rel=1e-3)
    assert found.output.demand.high is None


def test_no_feedback_is_open(stage):
    """Nothing but the input on the inverting pin."""
    found = stage("VIN in 0 SIN(0 0.1 1k)\nR1 in n 10k\nXU1 0 n vp vn out TL072")
    assert found.loop.dc == "open"


def test_integrator_is_open_at_dc_by_itself(stage):
    """A capacitor alone gives no feedback at DC."""
    found = stage("VIN in 0 SIN(0 0.1 1k)\nR1 in n 10k\nC2 n out 10n\nXU1 0 n vp vn out TL072")
    assert found.loop.dc == "open"


def test_outer_loop_holds_an_integrator(design):
    """An integrator whose output comes back through an inverter is held at DC."""
    cards = """
VIN in 0 SIN(0 0.1 1k)
R1 in n 10k
C2 n a 10n
XU1 0 n vp vn a TL072
R3 a m 10k
R4 m b 10k
XU2 0 m vp vn b TL072
R5 a n 1meg
"""
    assert [s.loop.dc for s in design(cards).stages] == ["negative", "negative"]


def test_current_pump_is_negative(stage):
    """A balanced current pump with a load has more negative than positive feedback."""
    cards = """
VIN in 0 SIN(0 1 100)
R1 0 n 10k
R2 n out 10k
R3 in p 10k
R4 p out 10k
RL p 0 1k
XU1 p n vp vn out TL072
"""
    assert stage(cards).loop.dc == "negative"


def test_transistor_inside_the_loop_keeps_its_sign(design):
    """An emitter follower inside the loop leaves the feedback negative."""
    cards = """
VIN in 0 SIN(2 0.5 100)
XU1 in e vp vn b TL072
Q1 vp b e QN
RE e 0 1k
.model QN NPN
"""
    assert design(cards).stages[0].loop.dc == "negative"


def test_common_emitter_inside_the_loop_turns_the_sign(design):
    """Feedback over a common-emitter stage to the inverting input is positive."""
    cards = """
VIN in 0 SIN(2 0.5 100)
XU1 in c vp vn b TL072
RB b bb 10k
Q1 c bb 0 QN
RC vp c 1k
.model QN NPN
"""
    assert design(cards).stages[0].loop.dc == "positive"


FAST = """
[[devices]]
family = "FAST50"
technology = "cmos"
gain_bandwidth = { typical = 50e6 }
input_capacitance = { typical = 0.01e-12 }
output_resistance = { typical = 0.1 }
names = { 1 = ["FAST50"] }
source = { title = "made for this test" }
"""


def test_phase_margin_of_a_transimpedance_stage(stage):
    """RF 100 kilohm, 20 pF, GBW 50 MHz, CF 1.1 pF: about 65 degrees.

    Source: Texas Instruments OPA607 data sheet SBOS981J, transimpedance example (the 20 pF is the
    whole input capacitance, so the device here adds none).
    """
    cards = (
        "IPD 0 n SIN(0 1u 1k)\nRF n out 100k\nCF n out 1.1p\nCT n 0 20p\nXU1 0 n vp vn out FAST50"
    )
    found = stage(cards, FAST)
    assert found.loop.phase_margin == pytest.approx(65.0, abs=2.0)
    assert found.loop.noise_gain_crossover == pytest.approx(1 + 20 / 1.1, rel=0.2)
