"""The demanded ranges against hand calculation."""

import math

import pytest

INVERTING = """
VIN in 0 SIN(0 0.5 1k)
R1 in n 10k
R2 n out 100k
RL out 0 2k
XU1 0 n vp vn out TL072
"""


def test_inverting_stage_swings_gain_times_input(stage):
    """0.5 V peak times 10, either way."""
    output = stage(INVERTING).output
    assert output.demand.high == pytest.approx(5.0, rel=1e-3)
    assert output.demand.low == pytest.approx(-5.0, rel=1e-3)
    assert output.level == pytest.approx(0.0, abs=1e-6)


def test_output_current_is_load_and_feedback(stage):
    """5 V into 2 kilohm and into 100 kilohm to the virtual ground."""
    current = stage(INVERTING).current
    assert current.demand_source == pytest.approx(5 / 2e3 + 5 / 100e3, rel=1e-3)
    assert current.demand_sink == pytest.approx(current.demand_source, rel=1e-9)
    assert current.into == "RL"


def test_capacitive_load_adds_in_quadrature(stage):
    """A follower at 10 kHz, 1 V peak, with 10 nF and 1 kilohm."""
    cards = "VIN in 0 SIN(0 1 10k)\nXU1 in out vp vn out TL072\nRL out 0 1k\nCL out 0 10n"
    expected = math.hypot(1e-3, 2 * math.pi * 10e3 * 10e-9)
    assert stage(cards).current.demand_source == pytest.approx(expected, rel=2e-3)


def test_two_tones_meet_at_their_worst(stage):
    """Two sines of different frequency add their peaks."""
    cards = """
V1 a 0 SIN(0 1 1k)
V2 b 0 SIN(0 0.5 1.7k)
R1 a n 10k
R2 b n 10k
R3 n out 10k
XU1 0 n vp vn out TL072
"""
    assert stage(cards).output.demand.high == pytest.approx(1.5, rel=2e-3)


def test_tones_of_one_frequency_keep_their_phase(stage):
    """Two equal sines in opposite phase cancel at a summing node."""
    cards = """
V1 a 0 SIN(0 1 1k)
V2 b 0 SIN(0 1 1k 0 0 180)
R1 a n 10k
R2 b n 10k
R3 n out 10k
XU1 0 n vp vn out TL072
"""
    assert stage(cards).output.demand.high == pytest.approx(0.0, abs=1e-6)


def test_stated_band_keeps_its_worst_frequency(stage):
    """A Q of 5 peaks at 10 kHz inside a band up to 20 kHz."""
    cards = """
R1 in a 5.758k
R2 a p 2.199k
C1 a out 20n
C2 p 0 1n
XU1 p out vp vn out TL072
"""
    settings = '[signals]\n"in" = { low = -1, high = 1, to = 20e3 }'
    output = stage(cards, settings).output
    assert output.demand.high == pytest.approx(2.06, rel=0.03)
    assert output.frequency == pytest.approx(9.35e3, rel=0.25)


def test_slew_is_the_steepest_slope(stage):
    """5 V peak at 1 kHz needs 2 pi f V."""
    assert stage(INVERTING).output.slew == pytest.approx(2 * math.pi * 1e3 * 5, rel=2e-3)


def test_pulse_is_followed_through_its_edges(stage):
    """A first-order stage reaches 1 - exp(-T/tau) of its step."""
    cards = """
VIN in 0 PULSE(0 2 0 1u 1u 100u 200u)
R1 in n 10k
R2 n out 20k
C2 n out 1n
XU1 0 n vp vn out TL072
"""
    output = stage(cards).output
    assert output.demand.low == pytest.approx(-4 * (1 - math.exp(-5.05)), rel=5e-3)
    assert output.demand.high == pytest.approx(0.0, abs=0.01)


def test_an_output_that_moves_one_way_only(stage):
    """A falling ramp through a capacitor: the follower goes from rest to one side."""
    cards = "VIN in 0 PWL(0 3 1m 0)\nC1 in p 1n\nR1 p 0 100k\nXU1 p out vp vn out TL072"
    output = stage(f"{cards}\nRL out 0 10k").output
    assert output.demand.high == output.level == pytest.approx(0.0, abs=1e-6)
    assert output.demand.low == pytest.approx(-100e3 * 1e-9 * 3e3, rel=0.01)
    assert output.available.high is not None


def test_probe_states_no_amplitude(stage):
    """AC 1 leaves the DC level and an open question."""
    cards = "VIN in 0 AC 1\nR1 in n 10k\nR2 n out 100k\nXU1 0 n vp vn out TL072"
    found = stage(cards)
    assert found.output.level == pytest.approx(0.0, abs=1e-6)
    assert "VIN" in found.unknown["output"].why
    assert found.allowed.net == "in"


def test_saturated_stage_feeds_its_limit(design):
    """The second stage sees what the first really reaches, not its demand."""
    cards = """
VIN in 0 SIN(0 0.5 1k)
R1 in n 10k
R2 n a 500k
XU1 0 n vp vn a TL072
R3 a m 10k
R4 m out 5k
XU2 0 m vp vn out TL072
"""
    first, second = design(cards).stages
    assert first.output.demand.high == pytest.approx(25.0, rel=2e-3)
    assert second.output.demand.high == pytest.approx(first.output.available.high / 2, rel=0.02)


def test_unknown_load_leaves_the_current_open(design):
    """A connector on the output takes what nobody states; the voltage is known all the same."""
    cards = "VIN in 0 SIN(0 1 1k)\nXU1 in out vp vn out TL072\nJ1 out 0 CONN_2"
    found = design(cards).stages[0]
    assert found.output.demand.high == pytest.approx(1.0, rel=1e-3)
    assert "J1" in found.unknown["current"].why
    assert "output" not in found.unknown


SUM = "R1 a n 10k\nR2 b n 10k\nR3 n out 10k\nXU1 0 n vp vn out TL072\nRL out 0 10k"


@pytest.mark.parametrize("hertz", [1000, 0.5])
@pytest.mark.parametrize("turned", [False, True])
def test_sines_with_a_common_period_keep_their_real_peak(stage, hertz, turned):
    """sin(t) + sin(2t) never reaches two: its largest value is 1.7602, either way.

    So it is of the current, whatever else goes further, and of the first net of a deck.
    """
    sines = f"V1 a 0 SIN(0 1 {hertz})\nV2 b 0 SIN(0 1 {2 * hertz})"
    cards = "\n".join((f"{sines}\n{SUM}").splitlines()[:: -1 if turned else 1])
    found = stage(cards)
    assert found.output.demand.high == pytest.approx(1.7602, rel=1e-3)
    assert found.output.demand.low == pytest.approx(-1.7602, rel=1e-3)
    for amps in (found.current.demand_source, found.current.demand_sink):
        assert amps == pytest.approx(1.7602 / 5e3, rel=2e-3)


def test_a_slow_sine_below_two_fast_ones_leaves_their_real_peak(stage):
    """A tenth of a volt beside the 1.7602 V of two that turn forty and eighty times in its time."""
    cards = (
        "V1 a 0 SIN(0 1 40k)\nV2 b 0 SIN(0 1 80k)\nV3 c 0 SIN(0 0.1 1k)\nR4 c n 10k\n"
        f"{SUM}".replace("TL072", "OPAMP")
    )
    assert stage(cards).output.demand.high == pytest.approx(1.8602, rel=5e-3)


@pytest.mark.parametrize(
    ("sources", "settings"),
    [
        # what the user states has no phase
        (
            "J1 a\nJ2 b",
            '[signals]\n"a" = { low = -1, high = 1, from = 1e3, to = 1e3 }\n'
            '"b" = { low = -1, high = 1, from = 2e3, to = 2e3 }',
        ),
        # nor has the envelope of a carrier: 0.5 V twice, at 1 kHz and 50 Hz
        ("V1 a 0 AM(0.5 1 50 1k)\nV2 b 0 SIN(0 1 525)", ""),
    ],
)
def test_what_has_no_phase_meets_at_its_peaks(stage, sources, settings):
    """Two volts, though their frequencies are one to two."""
    found = stage(f"{sources}\n{SUM}", settings)
    assert found.output.demand.high == pytest.approx(2.0, rel=3e-3)
    assert found.output.demand.low == pytest.approx(-2.0, rel=3e-3)


def test_a_slope_is_off_by_what_moves_it_where_it_is_steepest(stage):
    """Two signals that come together, a low-pass of 1 kHz: largest at 100 Hz, steepest at 10 kHz.

    Far above the corner the gain goes with one over R and C: 100 of 101 parts of 11 %, to first
    order; the quotients themselves make two hundredths more of it.
    """
    settings = (
        '[signals]\n"a" = { low = -1, high = 1, from = 100, to = 100, group = "g" }\n'
        '"b" = { low = -1, high = 1, from = 10e3, to = 10e3, group = "g" }'
    )
    cards = "RA a p 20k\nRB b p 20k\nC1 p 0 15.915n\nXU1 p out vp vn out TL072\nRL out 0 10k"
    output = stage(cards, settings).output
    assert output.frequency == pytest.approx(100.0)
    assert output.slew == pytest.approx(2 * math.pi * 10e3 / math.hypot(1, 10), rel=2e-3)
    assert output.slew_worst.span / 2 == pytest.approx(output.slew * 0.11 * 100 / 101, rel=0.03)


def test_the_quiescent_current_drops_on_what_stands_before_the_pins(stage):
    """1.4 mA a channel on 100 ohm, towards ground from either side; one channel, no load."""
    cards = "VIN in 0 1\nXU1 in out vp vn out TL071"
    found = stage(cards, supply="VP rp 0 15\nRP rp vp 100\nVN rn 0 -15\nRN rn vn 100\n")
    amps = found.family.supply_current.typical
    assert found.supply.positive == pytest.approx(15 - 100 * amps, rel=1e-4)
    assert found.supply.negative == pytest.approx(-15 + 100 * amps, rel=1e-4)


@pytest.mark.parametrize("device", ["LM358", "MCP6001"])
def test_what_arithmetic_leaves_of_zero_is_zero(design, device):
    """A shunt's current from nothing on: no end lies below ground, so nothing is beyond it.

    Unequal resistors leave some 1e-17 V there, which a limit of 0 V would take for a breach.
    """
    for ohms in ("2.8k", "2.94k", "3.09k", "3.3k", "49.9k"):
        cards = (
            f"ISH 0 sh PWL(0 0 1 2 2 0)\nR5 sh 0 25m\nR1 sh p 1k\nR2 n 0 1k\nR3 n out {ohms}\n"
            f"C3 n out 15n\nXU1 p n vp 0 out {device}"
        )
        (found,) = design(cards, supply="VP vp 0 3.3\nC1 vp 0 100n").stages
        assert found.output.demand.low == 0.0
        assert found.inputs.low.demand == 0.0
        assert found.output.demand.high == pytest.approx(0.05 * (1 + float(ohms[:-1])), rel=3e-3)
