"""Worked examples of handbooks, data sheets and application notes, through the whole path.

Each deck goes from text to stage; the published figure is compared within 1 %, or within the
rounding of the printed figure where that is coarser. `source` says where it stands; "companion" means
that inputs and printed answer were seen in the open textbook-companion notebooks, not on the book's
page; "derived" that the figure was worked out from the published inputs because the printed answer
has a slip.
"""

from typing import NamedTuple

import pytest

from tests.outside.worked import FRANCO, GAYAKWAD, RAILS, device, stage


class Level(NamedTuple):
    """A circuit whose output level is published."""

    name: str
    cards: str
    volts: float
    source: str
    amplifier: str = "XU1"
    tolerance: float = 0.01
    supply: str = RAILS


LEVELS = [
    Level("inverting", "VIN in 0 DC 0.5\nR1 in n 10k\nR2 n out 100k\nXU1 0 n vp vn out OPAMP1",
          -5.00, FRANCO.format("1.3")),
    Level("weighted summer",
          "V1 a 0 0.1\nV2 b 0 0.2\nV3 c 0 0.3\nR1 a n 20k\nR2 b n 15k\nR3 c n 30k\nRF n out 120k\n"
          "XU1 0 n vp vn out OPAMP1", -3.40, FRANCO.format("1.4")),
    Level("difference, unequal weights",
          "V1 a 0 1\nV2 b 0 2\nR1 a n 100k\nR2 n out 300k\nR3 b p 75k\nR4 p 0 25k\n"
          "XU1 p n vp vn out OPAMP1", -1.00, FRANCO.format("1.6") + ", R3 and R4 derived"),
    Level("gain of 1000 with a = 200 000",
          "VIN in 0 DC 1m\nR1 n 0 1k\nR2 n out 999k\nXU1 in n vp vn out OPAMP1",
          0.99502, FRANCO.format("1.9a"), tolerance=1e-4),
    Level("inverting 1000 with a = 200 000",
          "VIN in 0 DC 5m\nR1 in n 1k\nR2 n out 1meg\nXU1 0 n vp vn out OPAMP1",
          -4.9751, FRANCO.format("1.10b"), tolerance=1e-4),
    Level("transimpedance 1 V/uA", "IIN 0 n DC 1u\nR n out 1meg\nXU1 0 n vp vn out OPAMP1",
          -0.9999925, FRANCO.format("2.1"), tolerance=1e-4),
    Level("voltage to current converter",
          "VIN in 0 DC 5\nR n 0 10k\nRL n out 16k\nXU1 in n vp vn out OPAMP1",
          13.0, FRANCO.format("2.3")),
    Level("difference amplifier, matched",
          "V1 a 0 4.9\nV2 b 0 5.1\nR1 a n 10k\nR2 n out 100k\nR3 b p 10k\nR4 p 0 100k\n"
          "XU1 p n vp vn out OPAMP1", 2.000, FRANCO.format("2.8")),
    Level("difference amplifier, mismatched",
          "V1 a 0 4.9\nV2 b 0 5.1\nR1 a n 10k\nR2 n out 98k\nR3 b p 9.9k\nR4 p 0 103k\n"
          "XU1 p n vp vn out OPAMP1", 2.230, FRANCO.format("2.8") + ", answer derived"),
    Level("741-class non-inverting", "VIN in 0 DC 0.1\nR1 n 0 1k\nRF n out 10k\n"
          "XU1 in n vp vn out OPAMP1", 1.09994, GAYAKWAD.format("3-1"), tolerance=1e-4),
    Level("follower", "VIN in 0 DC 1\nXU1 in out vp vn out OPAMP1\nRL out 0 10k", 1.0,
          GAYAKWAD.format("3-2")),
    Level("inverting, low values", "VIN in 0 DC 0.5\nR1 in n 470\nRF n out 4.7k\n"
          "XU1 0 n vp vn out OPAMP1", -5.0, GAYAKWAD.format("3-3")),
    Level("two op-amp difference amplifier",
          "VX x 0 -1.5\nVY y 0 -2\nR2 n1 0 6.8k\nR3 n1 o1 680\nXU1 y n1 vp vn o1 OPAMP1\n"
          "R1 o1 n2 680\nRF n2 out 6.8k\nXU2 x n2 vp vn out OPAMP1",
          5.50, GAYAKWAD.format("3-6"), "XU2"),
    Level("averager", "VA a 0 1\nVB b 0 2\nVC c 0 3\nRA a n 3k\nRB b n 3k\nRC c n 3k\nRF n out 1k\n"
          "XU1 0 n vp vn out OPAMP1", -2.00, GAYAKWAD.format("6-4")),
    Level("non-inverting 100k/4.7k", "VIN in 0 DC 0.1\nRI n 0 4.7k\nRF n out 100k\n"
          "XU1 in n vp vn out OPAMP1", 2.228, "T. L. Floyd, Electronic Devices, ex. 12-3 (companion)"),
    Level("inverting -2 of a cookbook", "VIN in 0 DC 7\nR1 in n 10k\nR2 n out 20k\n"
          "XU1 0 n vp vn out OPAMP1", -14.0,
          "Texas Instruments SBOA270, SLYY137 (goals; resistor values from memory)"),
    Level("low-side current sense", "ILOAD 0 sh DC 1\nRSHUNT sh 0 0.1\nRG n 0 3.4k\nRF n out 165k\n"
          "XU1 sh n vp 0 out OPAMP1", 4.953, "Texas Instruments SBOS942J, section 8.2",
          supply="VP vp 0 5\n"),
    Level("photodiode amplifier, lit", "IPD n 0 DC 90u\nRF n out 53.6k\nVB p 0 0.1\n"
          "XU1 p n vp 0 out OPAMP1", 4.924, "Texas Instruments TIDU535", supply="VP vp 0 5\n"),
    Level("photodiode amplifier, dark", "IPD n 0 DC 0\nRF n out 53.6k\nVB p 0 0.1\n"
          "XU1 p n vp 0 out OPAMP1", 0.100, "Texas Instruments TIDU535", supply="VP vp 0 5\n"),
    Level("dissipation example, gain of two", "VIN in 0 DC 1.375\nRL out 0 2k\nRI n 0 1meg\n"
          "RF n out 1meg\nXU1 in n vp 0 out OPAMP1", 2.75,
          "Texas Instruments E2E, op amp power dissipation, part 2", supply="VP vp 0 5.5\n"),
    Level("bias divider on half of 15 V",
          "VIN in 0 SIN(0 0.1 1k)\nRS in s 50\nCI s p 0.1u\nR2 vp p 100k\nR3 p 0 100k\nC1 g 0 0.1u\n"
          "R1 n g 100k\nRF n out 1meg\nXU1 p n vp 0 out OPAMP1", 7.50, GAYAKWAD.format("6-2"),
          supply="VP vp 0 15\n"),
]  # fmt: skip


@pytest.mark.parametrize("example", LEVELS, ids=lambda e: e.name)
def test_published_output_level(example):
    """The output's DC level is the published one."""
    found = stage(example.cards, supply=example.supply, name=example.amplifier)
    assert found.output.level == pytest.approx(example.volts, rel=example.tolerance)


def test_finite_gain_of_a_non_inverting_stage():
    """Gain of ten with a = 1e4 and 1e6: 9.99001 and 9.99990.

    The example's third figure, a = 1e2, is outside what the device schema takes for an op-amp.
    Source: S. Franco, 3rd ed., ex. 1.2, inputs (companion); answers derived.
    """
    cards = "VIN in 0 DC 1\nR1 n 0 2k\nR2 n out 18k\nXU1 in n vp vn out OPAMP1"
    for gain, volts in ((1e4, 9.99001), (1e6, 9.99990)):
        assert stage(cards, device(gain=gain)).output.level == pytest.approx(volts, rel=1e-5)


def test_output_current_is_load_and_feedback():
    """3.0 mA into the load and 0.3 mA into the feedback are sunk.

    Source: S. Franco, 3rd ed., ex. 1.14 (companion), answer derived.
    """
    cards = "VIN in 0 DC 3\nR1 in n 10k\nR2 n out 20k\nRL out 0 2k\nXU1 0 n vp vn out OPAMP1"
    found = stage(cards, device(supply_current="typical = 0.5e-3"))
    assert found.output.level == pytest.approx(-6.0, rel=1e-3)
    assert found.current.demand_sink == pytest.approx(3.3e-3, rel=1e-3)
    # 30 V times 0.5 mA, and 9 V times 3.3 mA in the output stage.
    assert found.dissipation == pytest.approx(44.7e-3, rel=2e-3)


@pytest.mark.parametrize(
    ("cards", "settings", "hertz", "source"),
    [
        ("VIN in 0 AC 1\nR1 n 0 1k\nRF n out 10k\nXU1 in n vp vn out OPAMP1", device(), 90.9e3,
         GAYAKWAD.format("3-1")),
        ("VIN in 0 AC 1\nXU1 in out vp vn out OPAMP1\nRL out 0 10k", device(), 1e6,
         GAYAKWAD.format("3-2")),
        ("VIN in 0 AC 1\nR1 in n 470\nRF n out 4.7k\nXU1 0 n vp vn out OPAMP1", device(), 90.9e3,
         GAYAKWAD.format("3-3") + ", bandwidth derived from the noise gain"),
        ("VIN in 0 AC 1\nRI n 0 3.3k\nRF n out 220k\nXU1 in n vp vn out OPAMP1", device(gbw=3e6),
         44.3e3, "T. L. Floyd, Electronic Devices, ex. 12-12 (companion)"),
        ("VIN in 0 AC 1\nRI in n 1k\nRF n out 47k\nXU1 0 n vp vn out OPAMP1", device(gbw=3e6),
         62.5e3, "T. L. Floyd, ex. 12-12, by the noise gain of 48"),
        ("VIN in 0 AC 1\nR1 in n 10k\nR2 n out 20k\nXU1 0 n vp vn out OPAMP1", device(gbw=1.2e6),
         400e3, "Texas Instruments SBOA270: 1.2 MHz over a noise gain of 3"),
        ("VIN in 0 AC 1\nR1 n1 0 1k\nR2 n1 o1 30.6k\nXU1 in n1 vp vn o1 OPAMP1", device(), 31.6e3,
         FRANCO.format("6.2")),
    ],
)  # fmt: skip
def test_published_bandwidth(cards, settings, hertz, source):
    """The bandwidth is the gain-bandwidth product over the noise gain, as published."""
    assert source
    assert stage(cards, settings).loop.crossover == pytest.approx(hertz, rel=0.01)


@pytest.mark.parametrize(
    ("cards", "gain", "source"),
    [
        ("V1 a 0 0.1\nR1 a n 20k\nR2 0 n 15k\nR3 0 n 30k\nRF n out 120k\nXU1 0 n vp vn out OPAMP1",
         19.0, FRANCO.format("1.4")),
        ("VIN in 0 0\nR1 in n 1k\nRF n out 10k\nXU1 0 n vp vn out OPAMP1", 11.0,
         GAYAKWAD.format("4-2")),
        ("VIN in 0 0\nR1 in n 470\nRF n out 47k\nXU1 0 n vp vn out OPAMP1", 101.0,
         GAYAKWAD.format("4-4")),
    ],
)  # fmt: skip
def test_published_noise_gain(cards, gain, source):
    """The noise gain counts the same for both polarities."""
    assert source
    assert stage(cards).loop.noise_gain_dc == pytest.approx(gain, rel=1e-3)


@pytest.mark.parametrize(
    ("cards", "vos", "bias", "volts", "source"),
    [
        ("VIN in 0 0\nR1 in n 1k\nRF n out 10k\nXU1 0 n vp vn out OPAMP1", 10e-3, 1e-15, 0.110,
         GAYAKWAD.format("4-2")),
        ("VIN in 0 0\nR1 in n 470\nRF n out 47k\nXU1 0 n vp vn out OPAMP1", 6e-3, 500e-9,
         0.606 + 0.0235, GAYAKWAD.format("4-4")),
        ("VIN in 0 0\nR1 in n 1k\nRF n out 100k\nXU1 0 n vp vn out OPAMP1", 6e-3, 500e-9,
         0.606 + 0.050, GAYAKWAD.format("4-5")),
        ("VIN in 0 0\nR1 in n 1k\nRF n out 10k\nXU1 0 n vp vn out OPAMP1", 7.5e-3, 250e-9, 0.085,
         GAYAKWAD.format("4-7")),
        ("VIN in 0 0\nR1 in n 10k\nR2 n out 100k\nXU1 0 n vp vn out OPAMP1", 1e-8, 1.1e-6, 0.11,
         "M. S. Sivakumar, Linear Integrated Circuit, ex. 5.5 (companion)"),
    ],
)  # fmt: skip
def test_published_offset_at_the_output(cards, vos, bias, volts, source):
    """Offset voltage times the noise gain, and bias current times the feedback resistor."""
    assert source
    settings = device(
        gain=1e7, offset_voltage=f"guaranteed = {vos}", bias_current=f"guaranteed = {bias}"
    )
    assert stage(cards, settings).output.offset == pytest.approx(volts, rel=0.01)


class Filtered(NamedTuple):
    """A filter, driven with one volt peak: its output's peak at a frequency is published."""

    name: str
    cards: str
    hertz: float
    peak: float
    source: str
    tolerance: float = 0.01


FILTERS = [
    Filtered("first-order inverting low-pass",
             "R1 in n 15.92k\nR2 n out 159.2k\nC n out 1n\nXU1 0 n vp vn out OPAMP1",
             999.7, 10 / 2**0.5, FRANCO.format("3.4")),
    Filtered("band-pass, mid-band",
             "R1 in a 7.96k\nC1 a n 1u\nR2 n out 79.6k\nC2 n out 100p\nXU1 0 n vp vn out OPAMP1",
             632.0, 9.98, FRANCO.format("3.5") + ", capacitors derived"),
    Filtered("KRC low-pass with an input divider, Q 5",
             "R1A in a 44.56k\nR1B a 0 24.76k\nR2 a p 15.92k\nC1 a out 10n\nC2 p 0 10n\nRA n 0 10k\n"
             "RB n out 18k\nXU1 p n vp vn out OPAMP1", 999.7, 5.0, FRANCO.format("3.9"), 0.015),
    Filtered("unity-gain Sallen-Key, Q 2",
             "R1 in a 5.758k\nR2 a p 2.199k\nC1 a out 20n\nC2 p 0 1n\nXU1 p out vp vn out OPAMP1",
             10e3, 2.00, FRANCO.format("3.10")),
    Filtered("unity-gain Butterworth at twice its corner",
             "R1 in a 11.25k\nR2 a p 11.25k\nC1 a out 2n\nC2 p 0 1n\nXU1 p out vp vn out OPAMP1",
             20e3, 0.2425, FRANCO.format("3.11")),
    Filtered("unity-gain high-pass, Q 1.5",
             "C1 in a 0.1u\nC2 a p 0.1u\nR1 a out 2.653k\nR2 p 0 23.87k\nXU1 p out vp vn out OPAMP1",
             200.0, 1.50, FRANCO.format("3.12")),
    Filtered("multiple-feedback band-pass",
             "R1 in a 15.92k\nR2 a 0 79.98\nC1 a out 10n\nC2 a n 10n\nR3 n out 31.83k\n"
             "XU1 0 n vp vn out OPAMP1", 10e3, 1.00, FRANCO.format("6.12") + ", R2 derived"),
    Filtered("first-order non-inverting low-pass at 3 kHz",
             "R in p 15.9k\nC p 0 0.01u\nR1 n 0 10k\nRF n out 10k\nXU1 p n vp vn out OPAMP1",
             3e3, 0.63, GAYAKWAD.format("7-1"), 0.01),
    Filtered("second-order Butterworth at its corner",
             "R1 in a 33.86k\nR2 a p 33.86k\nC1 a out 4.7n\nC2 p 0 4.7n\nRA n 0 27k\nRB n out 15.82k\n"
             "XU1 p n vp vn out OPAMP1", 1e3, 1.12, GAYAKWAD.format("7-4")),
    Filtered("first-order high-pass at its corner",
             "C in p 0.01u\nR p 0 15.92k\nR1 n 0 10k\nRF n out 10k\nXU1 p n vp vn out OPAMP1",
             1e3, 1.414, GAYAKWAD.format("7-5")),
]  # fmt: skip


@pytest.mark.parametrize("example", FILTERS, ids=lambda e: e.name)
def test_published_filter_response(example):
    """The output's peak at the published frequency; the op-amp is as good as ideal."""
    cards = f"VIN in 0 SIN(0 1 {example.hertz})\n{example.cards}"
    found = stage(cards, device(gain=1e7, gbw=2e10))
    peak = (found.output.demand.high - found.output.demand.low) / 2
    assert peak == pytest.approx(example.peak, rel=example.tolerance)


def test_published_filter_figures():
    """Natural frequency and Q: 10 kHz and 2; 1 kHz and 10; 10 kHz and 10; 200 Hz and 1.5."""
    for example, hertz, quality in (
        (FILTERS[3], 10e3, 2.0),
        (FILTERS[6], 10e3, 10.0),
        (FILTERS[5], 200.0, 1.5),
    ):
        cards = f"VIN in 0 SIN(0 1 {example.hertz})\n{example.cards}"
        found = stage(cards, device(gain=1e7, gbw=2e10)).filter
        assert found.frequency == pytest.approx(hertz, rel=0.01)
        assert found.q == pytest.approx(quality, rel=0.01)


def test_error_at_a_seventh_of_the_bandwidth():
    """Gain 10 of a 1 MHz op-amp is 1 % low at 14.2 kHz. Source: S. Franco, 3rd ed., ex. 6.1."""
    cards = "VIN in 0 SIN(0 1 14.2k)\nR1 n 0 2k\nR2 n out 18k\nXU1 in n vp vn out OPAMP1"
    peak = stage(cards, device(gain=1e7)).output.demand.high
    assert peak == pytest.approx(9.9, rel=5e-4)


def test_swing_into_two_loads():
    """TL072 at +-15 V: +-10 V guaranteed into 2 kilohm, +-12 V into 10 kilohm.

    Source: ST TL072 data sheet, electrical characteristics.
    """
    for load, volts in (("2k", 10.0), ("10k", 12.0)):
        cards = f"VIN in 0 SIN(0 {volts} 100)\nXU1 in out vp vn out TL072\nRL out 0 {load}"
        found = stage(cards)
        assert found.output.guaranteed.high == pytest.approx(volts, rel=0.01)
        assert found.output.guaranteed.low == pytest.approx(-volts, rel=0.01)


def test_common_mode_and_short_circuit_of_a_jfet_family():
    """TL072 at +-15 V: inputs to +-11 V guaranteed; slew rate 8 V/us. Source: ST TL072 data sheet."""
    found = stage("VIN in 0 SIN(0 1 100)\nXU1 in out vp vn out TL072\nRL out 0 10k")
    assert found.inputs.guaranteed.high == pytest.approx(11.0)
    assert found.inputs.guaranteed.low == pytest.approx(-11.0)
    assert found.family.slew_rate.guaranteed == pytest.approx(8e6)


def test_input_without_return_charges_until_it_stands_at_a_rail():
    """A capacitor-coupled input without a return is found; 1 pA into 0.1 uF is 10 uV/s.

    Source: C. Kitchin, Analog Dialogue 41-08.
    """
    cards = "VIN in 0 AC 1\nCIN in p 0.1u\nR1 n 0 1k\nR2 n out 99k\nXU1 p n vp vn out OPAMP1"
    assert stage(cards).inputs.plus.state == "floating"


def test_integrator_without_dc_feedback_is_open():
    """Only a capacitor closes the loop: it drifts to a rail. Source: S. Franco, 3rd ed., ex. 5.2."""
    cards = "VIN in 0 0\nR in n 100k\nC n out 1n\nXU1 0 n vp vn out OPAMP1"
    assert stage(cards).loop.dc == "open"


def test_slew_rate_of_a_cookbook_stage():
    """14 V peak at 3 kHz needs 0.264 V/us. Source: Texas Instruments SBOA270, SLYY137."""
    cards = "VIN in 0 SIN(0 7 3k)\nR1 in n 10k\nR2 n out 20k\nXU1 0 n vp vn out OPAMP1"
    assert stage(cards, device(gbw=1e9)).output.slew == pytest.approx(0.264e6, rel=0.01)


def test_worst_case_gain_error_of_a_difference_amplifier():
    """1 % resistors, gain 10, 10 V common: up to 0.364 V. Source: S. Franco, ex. 2.9, derived."""
    cards = "V1 a 0 10\nV2 b 0 10\nR1 a n 10k\nR2 n out 100k\nR3 b p 10k\nR4 p 0 100k\n"
    found = stage(
        cards + "XU1 p n vp vn out OPAMP1", device(gain=1e8) + '[tolerances]\nresistor = "1 %"'
    )
    assert found.output.worst.high == pytest.approx(0.364, rel=0.01)
