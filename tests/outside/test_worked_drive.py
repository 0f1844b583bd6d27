"""Worked examples about what an output gives: swing, current, heat, speed; through the whole path."""

import math

import pytest

from tests.outside.worked import FRANCO, GAYAKWAD, device, stage

FIVE = "VP vp 0 5\n"


def test_published_currents():
    """Output current, feedback current, and what the negative rail takes.

    Sources: S. Franco, ex. 1.3 (0.05 mA in R2), ex. 1.14 (3.3 mA sunk, 3.8 mA from the rail), ex. 2.3
    (0.5 mA through the load); R. A. Gayakwad, ex. 3-3 (1.06 mA at 5 V); all companion.
    """
    found = stage("VIN in 0 0.5\nR1 in n 10k\nR2 n out 100k\nXU1 0 n vp vn out OPAMP1")
    assert found.feedback.current == pytest.approx(0.05e-3, rel=0.01)
    found = stage(
        "VIN in 0 3\nR1 in n 10k\nR2 n out 20k\nRL out 0 2k\nXU1 0 n vp vn out OPAMP1",
        device(supply_current="typical = 0.5e-3"),
    )
    rail = found.current.demand_sink + found.family.supply_current.typical
    assert rail == pytest.approx(3.8e-3, rel=0.01)
    found = stage("VIN in 0 5\nR n 0 10k\nRL n out 16k\nXU1 in n vp vn out OPAMP1")
    assert found.current.demand_source == pytest.approx(0.5e-3, rel=0.01)
    found = stage("VIN in 0 0.5\nR1 in n 470\nRF n out 4.7k\nXU1 0 n vp vn out OPAMP1")
    assert found.feedback.current == pytest.approx(1.06e-3, rel=0.01)


@pytest.mark.parametrize(
    ("cards", "volts"),
    [
        ("VIN in 0 5\nR n 0 10k\nRL n out 16k\nXU1 in n vp vn out OPAMP1", 13.0),
        # The same 0.5 mA in the inverting form: 26 kilohm from the virtual ground.
        ("VIN in 0 -5\nR in n 10k\nRL n out 26k\nXU1 0 n vp vn out OPAMP1", 13.0),
    ],
)
def test_compliance_of_a_voltage_to_current_converter(cards, volts):
    """The largest load takes the output to its limit of 13 V. Source: S. Franco, ex. 2.3."""
    assert stage(cards).output.demand.high == pytest.approx(volts, rel=0.01)


def test_headroom_of_a_cookbook_stage():
    """+-14 V on +-15 V leaves 1 V each; noise gain 3. Source: TI SBOA270, SLYY137 (goals)."""
    found = stage("VIN in 0 SIN(0 7 100)\nR1 in n 10k\nR2 n out 20k\nXU1 0 n vp vn out OPAMP1")
    assert found.output.high.absolute - found.output.high.demand == pytest.approx(1.0, rel=0.01)
    assert found.output.low.demand - found.output.low.absolute == pytest.approx(1.0, rel=0.01)
    assert found.loop.noise_gain_dc == pytest.approx(3.0, rel=0.01)


def test_headroom_of_a_current_sense_stage():
    """4.953 V on 5 V leaves 47 mV. Source: TI TLV9051 SBOS942J, section 8.2."""
    cards = "ILOAD 0 sh DC 1\nRSHUNT sh 0 0.1\nRG n 0 3.4k\nRF n out 165k\nXU1 sh n vp 0 out OPAMP1"
    found = stage(cards, device(gain=1e8), FIVE)
    left = found.output.high.absolute - found.output.high.demand
    assert left == pytest.approx(47e-3, abs=0.5e-3)


def test_single_supply_filter_spans_inputs_and_output():
    """0.05 V to 4.95 V at both, 10 kHz. Source: TI CIRCUIT060054, SLYY137 (goals; values ours)."""
    cards = (
        "VIN in 0 SIN(2.5 2.45 10)\nR1 in a 11.25k\nR2 a p 11.25k\nC1 a out 2n\nC2 p 0 1n\n"
        "XU1 p out vp 0 out OPAMP1"
    )
    found = stage(cards, device(gain=1e8, gbw=1e10), FIVE)
    for span in (found.output.demand, found.inputs.demand):
        assert span.low == pytest.approx(0.05, abs=0.001)
        assert span.high == pytest.approx(4.95, rel=0.01)
    assert found.filter.frequency == pytest.approx(10e3, rel=0.01)


def test_band_pass_stays_inside_five_volts():
    """+-2.45 V about 2.5 V in, gain 1: 0.05 V to 4.95 V. Source: TI CIRCUIT060055 (goals)."""
    cards = (
        "VIN in 0 SIN(2.5 2.45 3162)\nVR1 r1 0 2.5\nVR2 r2 0 2.5\n"
        "CA in a 10n\nRA a r1 7.503k\nCB a n1 10n\nCC a o1 10n\nRC n1 o1 33.76k\n"
        "XU1 r1 n1 vp 0 o1 OPAMP1\n"
        "R1 o1 b 7.503k\nC1 b r2 4.5n\nR2 b out 7.503k\nR3 b n2 7.503k\nC2 n2 out 1n\n"
        "XU2 r2 n2 vp 0 out OPAMP1"
    )
    swing = "[{ amps = 0.0, typical = 5e-3 }]"
    text = device(gain=1e7, gbw=2e10).replace(
        "names =", f"swing_high = {swing}\nswing_low = {swing}\nnames ="
    )
    found = stage(cards, text, FIVE, "XU2")
    # Each of the two stages is half a per cent down in the middle of the band.
    assert found.output.demand.high == pytest.approx(4.95, rel=0.01)
    assert 5.0 - found.output.demand.low == pytest.approx(4.95, rel=0.01)


@pytest.mark.parametrize(("load", "volts"), [("10k", -14.5), ("2k", -13.8), ("600", -12.8)])
def test_swing_of_a_low_distortion_part_into_three_loads(load, volts):
    """1.45, 6.9 and 21.3 mA. Source: Texas Instruments, E2E answer on the OPA2134."""
    found = stage(f"VIN in 0 SIN(0 10 100)\nXU1 in out vp vn out OPA2134\nRL out 0 {load}")
    assert found.output.guaranteed.low == pytest.approx(volts, rel=0.01)
    assert found.current.short_circuit == pytest.approx(40e-3)


@pytest.mark.parametrize(("load", "volts"), [("2k", 12.0), ("10k", 13.5)])
def test_typical_swing_of_a_classic_part(load, volts):
    """TL072 at +-15 V. Source: ST TL072 data sheet."""
    found = stage(f"VIN in 0 SIN(0 10 100)\nXU1 in out vp vn out TL072\nRL out 0 {load}")
    assert found.output.available.high == pytest.approx(volts, rel=0.01)
    assert found.output.available.low == pytest.approx(-volts, rel=0.01)
    assert found.inputs.available.high == pytest.approx(15.0)
    assert found.inputs.available.low == pytest.approx(-12.0)
    assert found.family.short_circuit.guaranteed == pytest.approx(10e-3)
    assert found.family.short_circuit.typical == pytest.approx(40e-3)


def test_dissipation_at_half_the_supply():
    """2.75 V and 1.375 mA: 3.78 mW beside the quiescent power.

    Source: Texas Instruments E2E, op amp power dissipation, part 2 (OPA316).
    """
    cards = "VIN in 0 DC 1.375\nRL out 0 2k\nRI n 0 1meg\nRF n out 1meg\nXU1 in n vp 0 out OPAMP1"
    found = stage(cards, device(supply_current="typical = 400e-6"), "VP vp 0 5.5\n")
    assert found.current.demand_source == pytest.approx(1.375e-3, rel=0.01)
    assert found.dissipation - 5.5 * 400e-6 == pytest.approx(3.78e-3, rel=0.01)


def test_worst_dissipation_of_a_grounded_load():
    """5 V squared over four times 100 ohms: 62.5 mW at +-2.5 V. Source: TI OPA695 SBOS293I."""
    cards = "VIN in 0 SIN(0 5 100)\nRL out 0 100\nXU1 in out vp vn out OPAMP1"
    found = stage(cards, device(supply_current="typical = 1e-3"), "VP vp 0 5\nVN vn 0 -5\n")
    assert found.dissipation - 10 * 1e-3 == pytest.approx(62.5e-3, rel=0.01)


def test_current_left_when_hot():
    """310 mW to 70 degrees, 5.6 mW/K less above: at 100 degrees 3.9 mA are left beside 2.8 mA.

    Source: S. Franco, ex. 5.11 (companion). The rating ends at 125.4 degrees of the junction.
    """
    text = device(supply_current="guaranteed = 2.8e-3").replace(
        "names =", f'theta = {{ "DIP-8" = {1 / 5.6e-3:.6g} }}\nnames ='
    )
    text += "[conditions]\nambient = [0, 100]\n"
    found = stage("VIN in 0 0\nIL out 0 3.87m\nXU1 in out vp vn out OPAMP1", text)
    assert found.dissipation == pytest.approx(142e-3, rel=0.01)
    assert found.junction == pytest.approx(70 + 0.310 / 5.6e-3, rel=0.01)


def test_largest_sine_at_the_corner_of_the_bandwidth():
    """0.5 V/us and 100 kHz: 0.796 V peak; the bandwidth at a gain of 10 of 1 MHz.

    Source: textbook companion, ex. 9.4 (title not shown).
    """
    peak = 0.796 * math.sqrt(2) / 10
    cards = f"VIN in 0 SIN(0 {peak:.6g} 100k)\nR1 n 0 1k\nR2 n out 9k\nXU1 in n vp vn out OPAMP1"
    found = stage(cards, device(gain=1e7, slew_rate="guaranteed = 0.5e6"))
    assert found.loop.crossover == pytest.approx(100e3, rel=0.01)
    assert found.output.demand.high == pytest.approx(0.796, rel=0.01)
    assert found.output.slew == pytest.approx(found.family.slew_rate.guaranteed, rel=0.01)


def test_largest_gain_for_a_bandwidth():
    """1e5 and a pole of 10 Hz: a gain of 50 has 20 kHz. M. S. Sivakumar, ex. 5.12 (companion)."""
    cards = "VIN in 0 AC 1\nR1 n 0 1k\nR2 n out 49k\nXU1 in n vp vn out OPAMP1"
    found = stage(cards, device(gain=1e5, gbw=1e5 * 10))
    assert found.loop.noise_gain_dc == pytest.approx(50.0)
    assert found.loop.crossover == pytest.approx(20e3, rel=0.01)


def test_coupled_stage_on_a_single_supply():
    """31.8 Hz from Ci and 50 kilohm, 90.9 kHz at the top. Source: R. A. Gayakwad, ex. 6-2.

    The capacitor of the gain network, which the example leaves out of account, is large here.
    """
    cards = (
        "VIN in 0 SIN(0 0.1 1k)\nRS in s 50\nCI s p 0.1u\nR2 vp p 100k\nR3 p 0 100k\nC1 g 0 100u\n"
        "R1 n g 100k\nRF n out 1meg\nXU1 p n vp 0 out OPAMP1"
    )
    found = stage(cards, supply="VP vp 0 15\n")
    assert found.high_pass == pytest.approx(31.8, rel=0.01)
    assert found.loop.crossover == pytest.approx(90.9e3, rel=0.01)
    assert found.output.high.absolute - found.output.low.absolute == pytest.approx(15.0)
    assert found.inputs.plus.divider.bypass == 0.0


QUIET = {"input_capacitance": "typical = 1e-14", "output_resistance": "typical = 1e-2"}


def test_a_differentiator_is_practically_unstable():
    """Crossover 10 kHz, 0.6 degrees. Source: S. Franco, ex. 8.2 (companion)."""
    cards = "VIN in 0 AC 1\nC in n 10n\nR n out 159k\nXU1 0 n vp vn out OPAMP1"
    found = stage(cards, device(gain=1e7, **QUIET))
    assert found.loop.crossover == pytest.approx(10e3, rel=0.01)
    assert found.loop.phase_margin == pytest.approx(0.6, abs=0.05)


def test_a_pole_at_the_inverting_input_costs_phase():
    """30 kilohm twice, 16 pF, 20 MHz: 14.7 degrees. Source: S. Franco, ex. 8.3 (companion)."""
    cards = "VIN in 0 AC 1\nR1 in n 30k\nR2 n out 30k\nCP n 0 16p\nXU1 0 n vp vn out OPAMP1"
    found = stage(cards, device(gain=1e7, gbw=20e6, **QUIET))
    assert found.loop.phase_margin == pytest.approx(14.7, rel=0.02)


def test_compensation_takes_a_capacitive_load_out_of_the_loop():
    """50 ohms and 56 pF give back the phase that 5 nF took. Source: S. Franco, ex. 8.5."""
    figures = {**QUIET, "output_resistance": "typical = 100"}
    text = device(gain=1e7, gbw=1e7, **figures)
    bare = "VIN in 0 AC 1\nR1 in n 10k\nR2 n o2 20k\nCL o2 0 5n\n"
    without = stage(bare + "XU1 0 n vp vn o2 OPAMP1", text).loop.phase_margin
    cured = stage(bare + "CF n out 56p\nRS out o2 50\nXU1 0 n vp vn out OPAMP1", text)
    assert without < 20.0
    assert cured.loop.phase_margin == pytest.approx(90.0, abs=1.0)


def test_band_pass_near_its_limit_of_gain():
    """K = 3.859: 27.3 V/V at 1 kHz, Q 10. Source: S. Franco, ex. 3.13 (companion)."""
    cards = (
        "VIN in 0 SIN(0 0.1 1k)\nR1 in a 22.51k\nC1 a 0 10n\nC2 a p 10n\nR2 p 0 22.51k\n"
        "R3 a out 22.51k\nRA n 0 10k\nRB n out 28.59k\nXU1 p n vp vn out OPAMP1"
    )
    found = stage(cards, device(gain=1e7, gbw=2e10))
    assert found.filter.kind == "band-pass"
    assert found.filter.frequency == pytest.approx(1e3, rel=0.01)
    assert found.filter.q == pytest.approx(10.0, rel=0.01)
    assert found.output.demand.high == pytest.approx(2.73, rel=0.01)


def test_published_gains():
    """-10, 10.9994, 11 and 22.28. S. Franco, ex. 1.3; R. A. Gayakwad, ex. 3-1, 3-6; T. L. Floyd."""
    for cards, gain in (
        ("VIN in 0 0.5\nR1 in n 10k\nR2 n out 100k\nXU1 0 n vp vn out OPAMP1", -10.0),
        ("VIN in 0 0.1\nR1 n 0 1k\nRF n out 10k\nXU1 in n vp vn out OPAMP1", 10.9994),
        ("VIN in 0 0.1\nRI n 0 4.7k\nRF n out 100k\nXU1 in n vp vn out OPAMP1", 22.28),
    ):
        found = dict(stage(cards).gain)
        assert found["in"] == pytest.approx(gain, rel=1e-3)


def test_weighted_summer_has_the_noise_gain_of_all_its_resistors():
    """1 + 120k / (20k || 15k || 30k) = 19. Source: S. Franco, ex. 1.4 (companion)."""
    cards = (
        "V1 a 0 0.1\nV2 b 0 0.2\nV3 c 0 0.3\nR1 a n 20k\nR2 b n 15k\nR3 c n 30k\nRF n out 120k\n"
        "XU1 0 n vp vn out OPAMP1"
    )
    found = stage(cards)
    assert found.loop.noise_gain_dc == pytest.approx(19.0, rel=1e-3)
    weights = dict(found.gain)
    assert [weights[n] for n in "abc"] == pytest.approx([-6.0, -8.0, -4.0], rel=1e-3)


def test_sources_are_named():
    """The two book titles that most examples here come from."""
    assert "Franco" in FRANCO
    assert "Gayakwad" in GAYAKWAD
