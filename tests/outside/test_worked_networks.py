"""Worked examples about what no stage carries: resistances, loop gains, responses.

The deck goes through reading, recognition and the network of the analysis; the figure is read from
the solved equations. What an example states of the op-amp's inside (its input resistance, a
saturated output) stands in the deck as an element.
"""

import cmath
import math

import numpy as np
import pytest

from railguard.analysis.solve import Stepper
from tests.outside.networks import Solved
from tests.outside.worked import FRANCO, GAYAKWAD, RAILS, device, stage

IDEAL = device(gain=1e7, gbw=2e10)
OUT75 = device(gain=2e5, gbw=1e6, output_resistance="typical = 75")


def solved(cards, settings=IDEAL, supply=RAILS):
    """Return a deck's solved network."""
    return Solved(cards, settings, supply)


@pytest.mark.parametrize(
    ("cards", "ohms", "source"),
    [
        ("VIN in 0 0.5\nR1 in n 10k\nR2 n out 100k\nXU1 0 n vp vn out OPAMP1", 10e3,
         FRANCO.format("1.3")),
        ("VIN in 0 0.5\nR1 in n 470\nRF n out 4.7k\nXU1 0 n vp vn out OPAMP1", 470.0,
         GAYAKWAD.format("3-3")),
        ("VIN a 0 1\nV2 b 0 0\nR1 a n 100k\nR2 n out 300k\nR3 b p 75k\nR4 p 0 25k\n"
         "XU1 p n vp vn out OPAMP1", 100e3, FRANCO.format("1.6") + ", R3 and R4 derived"),
        ("V1 a 0 0\nVIN b 0 1\nR1 a n 100k\nR2 n out 300k\nR3 b p 75k\nR4 p 0 25k\n"
         "XU1 p n vp vn out OPAMP1", 100e3, FRANCO.format("1.6") + ", R3 and R4 derived"),
        # Between both inputs of a difference amplifier: R1 + R3.
        ("VIN a b 1\nRC b 0 1g\nR1 a n 2k\nR2 n out 200k\nR3 b p 2k\nR4 p 0 200k\n"
         "XU1 p n vp vn out OPAMP1", 4e3, "A. S. Sedra, K. C. Smith, Microelectronic Circuits, "
         "exercise 2.15"),
    ],
)  # fmt: skip
def test_published_input_resistance(cards, ohms, source):
    """What the source works into."""
    assert source
    assert solved(cards).input_resistance("VIN") == pytest.approx(ohms, rel=0.01)


@pytest.mark.parametrize(
    ("cards", "ohms", "source"),
    [
        ("VIN in 0 0.1\nR1 n 0 1k\nR2 n out 999k\nXU1 in n vp vn out OPAMP1\nRD in n 2meg", 402e6,
         FRANCO.format("1.9a")),
        ("VIN in 0 0.1\nR1 n 0 1k\nRF n out 10k\nXU1 in n vp vn out OPAMP1\nRD in n 2meg", 36.4e9,
         GAYAKWAD.format("3-1")),
    ],
)  # fmt: skip
def test_published_bootstrapped_input_resistance(cards, ohms, source):
    """Two megohms between the inputs, times one plus the loop gain."""
    assert source
    assert solved(cards, OUT75).input_resistance("VIN") == pytest.approx(ohms, rel=0.01)


@pytest.mark.parametrize(
    ("cards", "ohms", "source"),
    [
        ("VIN in 0 0\nR1 n 0 1k\nR2 n out 999k\nXU1 in n vp vn out OPAMP1", 0.373,
         FRANCO.format("1.9a")),
        ("VIN in 0 0\nR1 in n 1k\nR2 n out 1meg\nXU1 0 n vp vn out OPAMP1", 0.374,
         FRANCO.format("1.10b")),
        ("VIN in 0 0\nR1 n 0 1k\nRF n out 10k\nXU1 in n vp vn out OPAMP1", 4.12e-3,
         GAYAKWAD.format("3-1")),
        ("VIN in 0 0\nXU1 in out vp vn out OPAMP1", 0.375e-3, GAYAKWAD.format("3-2")),
    ],
)  # fmt: skip
def test_published_output_resistance(cards, ohms, source):
    """75 ohms over one plus the loop gain."""
    assert source
    assert solved(cards, OUT75).resistance("out") == pytest.approx(ohms, rel=0.01)


@pytest.mark.parametrize(
    ("cards", "ohms", "source"),
    [
        ("VIN in 0 0\nR1 in n 1g\nR2 n out 1meg\nXU1 0 n vp vn out OPAMP1", 5.0,
         FRANCO.format("1.10b")),
        ("IIN 0 n 1u\nR n out 1meg\nXU1 0 n vp vn out OPAMP1\nRD n 0 2meg", 5.0,
         FRANCO.format("2.1")),
    ],
)  # fmt: skip
def test_published_resistance_of_a_virtual_ground(cards, ohms, source):
    """The feedback resistor over one plus the open-loop gain."""
    assert source
    assert solved(cards, OUT75).resistance("n") == pytest.approx(ohms, rel=0.01)


@pytest.mark.parametrize(
    ("cards", "gain", "source"),
    [
        ("VIN in 0 1m\nR1 n 0 1k\nR2 n out 999k\nXU1 in n vp vn out OPAMP1", 200.0,
         FRANCO.format("1.9a")),
        ("IIN 0 n 1u\nR n out 1meg\nXU1 0 n vp vn out OPAMP1\nRD n 0 2meg", 133_330.0,
         FRANCO.format("2.1")),
    ],
)  # fmt: skip
def test_published_loop_gain(cards, gain, source):
    """The open-loop gain times what comes back."""
    assert source
    assert solved(cards, OUT75).loop_gain().real == pytest.approx(gain, rel=1e-3)


def test_transimpedance_with_its_input_resistance():
    """-0.9999925 V/uA with a = 2e5 and 2 megohms at the input. Source: S. Franco, ex. 2.1."""
    cards = "IIN 0 n 1u\nR n out 1meg\nXU1 0 n vp vn out OPAMP1\nRD n 0 2meg"
    assert solved(cards, OUT75).level("out") == pytest.approx(-0.9999925, abs=1e-7)


@pytest.mark.parametrize(("gain", "volts"), [(1e2, 9.09091), (1e4, 9.99001), (1e6, 9.99990)])
def test_finite_open_loop_gain(gain, volts):
    """Gain of ten with three open-loop gains. Source: S. Franco, ex. 1.2, answers derived."""
    cards = f"VIN in 0 1\nR1 n 0 2k\nR2 n out 18k\nE1 out 0 in n {gain:g}"
    assert solved(cards).level("out") == pytest.approx(volts, abs=1e-5)


def test_a_saturated_output_lets_its_virtual_ground_go():
    """Output stuck at -13 V, 10 V in: the inverting node stands at 2.333 V. S. Franco, ex. 1.16."""
    cards = "VIN in 0 10\nR1 in n 10k\nR2 n out 20k\nVOUT out 0 -13"
    assert solved(cards).level("n") == pytest.approx(2.333, abs=1e-3)


def test_an_integrator_without_dc_feedback_drifts_to_its_rail():
    """80 nA into 1 nF: 13 V after 0.1625 s; 20 nA: 0.65 s. Source: S. Franco, ex. 5.2."""
    for amps, seconds in ((80e-9, 0.1625), (20e-9, 0.65)):
        found = solved("IB n 0 1n\nR 0 n 100k\nC n out 1n\nXU1 0 n vp vn out OPAMP1")
        network = found.network
        march = Stepper(network, seconds / 500)
        b = network.right_hand_side([("IB", amps)]).real
        states = list(march.along(np.zeros(network.size), b, np.ones(500)))
        assert states[-1][-1][network.row("out")] == pytest.approx(13.0, rel=0.01)


def test_a_coupled_input_without_return_ramps():
    """1 pA into 0.1 uF: 600 uV a minute, and 0.06 V at the output with a gain of 100.

    Source: C. Kitchin, Analog Dialogue 41-08.
    """
    found = solved(
        "VIN in 0 0\nCIN in p 0.1u\nIB 0 p 1p\nR1 n 0 1k\nR2 n out 99k\nXU1 p n vp vn out OPAMP1"
    )
    network, seconds = found.network, 60.0
    march = Stepper(network, seconds / 500)
    b = network.right_hand_side([("IB", 1e-12)]).real
    states = list(march.along(np.zeros(network.size), b, np.ones(500)))
    assert states[-1][-1][network.row("p")] == pytest.approx(600e-6, rel=0.01)
    assert states[-1][-1][network.row("out")] == pytest.approx(0.06, rel=0.01)


RESPONSES = [
    # cards, source, hertz, magnitude, relative tolerance, where it stands
    ("R1 in n 15.92k\nR2 n out 159.2k\nC n out 1n\nXU1 0 n vp vn out OPAMP1",
     ((1.0, 10.0, 0.01), (999.7, 10 / math.sqrt(2), 0.01), (9.95e3, 1.0, 0.01)),
     FRANCO.format("3.4")),
    ("R1 in a 7.96k\nC1 a n 1u\nR2 n out 79.6k\nC2 n out 100p\nXU1 0 n vp vn out OPAMP1",
     ((20.0, 10 / math.sqrt(2), 0.01), (632.0, 9.98, 0.01), (20e3, 10 / math.sqrt(2), 0.01)),
     FRANCO.format("3.5") + ", capacitors derived"),
    ("R1A in a 44.56k\nR1B a 0 24.76k\nR2 a p 15.92k\nC1 a out 10n\nC2 p 0 10n\nRA n 0 10k\n"
     "RB n out 18k\nXU1 p n vp vn out OPAMP1", ((1.0, 1.00, 0.01),), FRANCO.format("3.9")),
    ("R1 in a 5.758k\nR2 a p 2.199k\nC1 a out 20n\nC2 p 0 1n\nXU1 p out vp vn out OPAMP1",
     ((10.0, 1.00, 0.01), (10e3, 2.00, 0.01)), FRANCO.format("3.10")),
    ("R1 in a 11.25k\nR2 a p 11.25k\nC1 a out 2n\nC2 p 0 1n\nXU1 p out vp vn out OPAMP1",
     ((10.0, 1.00, 0.01), (10e3, 1 / math.sqrt(2), 0.01), (20e3, 0.2425, 0.01)),
     FRANCO.format("3.11")),
    ("C1 in a 0.1u\nC2 a p 0.1u\nR1 a out 2.653k\nR2 p 0 23.87k\nXU1 p out vp vn out OPAMP1",
     ((200.0, 1.50, 0.01), (20e3, 1.00, 0.01)), FRANCO.format("3.12")),
    ("R1 in a 22.51k\nC1 a 0 10n\nC2 a p 10n\nR2 p 0 22.51k\nR3 a out 22.51k\nRA n 0 10k\n"
     "RB n out 28.59k\nXU1 p n vp vn out OPAMP1", ((1e3, 27.3, 0.01),), FRANCO.format("3.13")),
    ("R in p 15.9k\nC p 0 0.01u\nR1 n 0 10k\nRF n out 10k\nXU1 p n vp vn out OPAMP1",
     # Two digits are printed at 10 kHz.
     ((1.0, 2.00, 0.01), (1.001e3, math.sqrt(2), 0.01), (3e3, 0.63, 0.01), (10e3, 0.20, 0.025)),
     GAYAKWAD.format("7-1, 7-3")),
    ("R1 in a 33.86k\nR2 a p 33.86k\nC1 a out 4.7n\nC2 p 0 4.7n\nRA n 0 27k\nRB n out 15.82k\n"
     "XU1 p n vp vn out OPAMP1", ((1.0, 1.586, 0.01), (1e3, 1.12, 0.01), (3e3, 0.18, 0.03)),
     GAYAKWAD.format("7-4")),
    ("C in p 0.01u\nR p 0 15.92k\nR1 n 0 10k\nRF n out 10k\nXU1 p n vp vn out OPAMP1",
     ((100e3, 2.00, 0.01), (1e3, 1.414, 0.01), (100.0, 0.199, 0.01)), GAYAKWAD.format("7-5")),
]  # fmt: skip


@pytest.mark.parametrize(("cards", "points", "source"), RESPONSES, ids=lambda v: "")
def test_published_response(cards, points, source):
    """Magnitudes at the published frequencies; the op-amp is as good as ideal."""
    assert source
    found = solved(f"VIN in 0 AC 1\n{cards}")
    for hertz, magnitude, tolerance in points:
        assert abs(found.gain("VIN", "out", hertz)) == pytest.approx(magnitude, rel=tolerance)


def test_phase_where_a_low_pass_has_unity_gain():
    """95.7 degrees at 9.95 kHz (of an inverting stage: 180 more). Source: S. Franco, ex. 3.4."""
    found = solved(f"VIN in 0 AC 1\n{RESPONSES[0][0]}")
    phase = math.degrees(cmath.phase(found.gain("VIN", "out", 9.95e3)))
    assert phase == pytest.approx(95.7, abs=0.1)


def test_corners_of_a_band_pass_and_a_butterworth():
    """20 Hz and 20 kHz: S. Franco, ex. 3.5. 10 kHz: ex. 3.11."""
    band = solved(f"VIN in 0 AC 1\n{RESPONSES[1][0]}")
    assert band.corner("VIN", "out", 1.0, 632.0) == pytest.approx(20.0, rel=0.01)
    assert band.corner("VIN", "out", 632.0, 1e6) == pytest.approx(20e3, rel=0.01)
    low = solved(f"VIN in 0 AC 1\n{RESPONSES[4][0]}")
    assert low.corner("VIN", "out", 1.0, 1e6) == pytest.approx(10e3, rel=0.01)


def test_phase_error_at_a_part_of_the_bandwidth():
    """Gain 10 of a 1 MHz op-amp lags by 5 degrees at 8.75 kHz. Source: S. Franco, ex. 6.1."""
    found = solved("VIN in 0 AC 1\nR1 n 0 2k\nR2 n out 18k\nXU1 in n vp vn out OPAMP1",
                   device(gain=1e7))  # fmt: skip
    phase = math.degrees(cmath.phase(found.gain("VIN", "out", 8.75e3)))
    assert phase == pytest.approx(-5.0, rel=0.01)


def test_two_stages_of_thirty_decibels():
    """31.6 V/V each, -3 dB of both together at 20.35 kHz. Source: S. Franco, ex. 6.2."""
    found = solved(
        "VIN in 0 AC 1\nR1 n1 0 1k\nR2 n1 o1 30.6k\nXU1 in n1 vp vn o1 OPAMP1\nR3 n2 0 1k\n"
        "R4 n2 out 30.6k\nXU2 o1 n2 vp vn out OPAMP1", device(gain=1e7)
    )  # fmt: skip
    assert abs(found.gain("VIN", "o1", 0.0)) == pytest.approx(31.6, rel=0.01)
    assert found.corner("VIN", "o1", 1.0, 1e6) == pytest.approx(31.6e3, rel=0.01)
    assert found.corner("VIN", "out", 1.0, 1e6) == pytest.approx(20.35e3, rel=0.01)


def test_transimpedance_bandwidth():
    """100 kilohm, 20 pF, 50 MHz, 1.1 pF: Butterworth, 2 MHz. Source: TI OPA607 SBOS981J."""
    cards = "RF n out 100k\nIPD n 0 AC 1\nCF n out 1.1p\nCTOT n 0 20p\nXU1 0 n vp vn out OPAMP1"
    found = solved(cards, device(gain=1e6, gbw=50e6))
    assert found.corner("IPD", "out", 1.0, 1e8) == pytest.approx(2e6, rel=0.03)  # "about 2 MHz"


def test_photodiode_amplifier_gain():
    """53.6 kV/A, which is 94.58 dB. Source: TI Designs Precision TIDU535."""
    cards = "IPD n 0 DC 90u\nRF n out 53.6k\nVB p 0 0.1\nXU1 p n vp 0 out OPAMP1"
    found = solved(cards, supply="VP vp 0 5\n")
    decibels = 20 * math.log10(abs(found.gain("IPD", "out", 0.0)))
    assert decibels == pytest.approx(94.58, abs=0.01)


def test_photodiode_amplifier_bandwidth():
    """1.464 MHz simulated, 68.59 degrees; 1.59 MHz and 62.1 measured. Source: TIDU535, table 1.

    Table and circuit description were seen in a stored copy of the guide's opening. Its pages of
    design steps were not: the feedback capacitor of 2.7 pF and the photodiode's 11 pF are from
    memory. The op-amp's 20 MHz and 4 pF + 5 pF at its inputs are those of the OPA320 data sheet,
    SBOS513F. The guide's phase margin is that of the vendor's macromodel, whose further poles no
    data sheet lists; with one pole it comes out a degree and a half above.
    """
    cards = (
        "IPD n 0 DC 90u AC 1\nRF n out 53.6k\nCF n out 2.7p\nCPD n 0 11p\nVB p 0 0.1\n"
        "XU1 p n vp 0 out OPAMP1"
    )
    inside = {"input_capacitance": "typical = 9e-12", "output_resistance": "typical = 90"}
    figures = device(gain=1e6, gbw=20e6, **inside)
    found = solved(cards, figures, supply="VP vp 0 5\n")
    assert found.corner("IPD", "out", 1.0, 1e8) == pytest.approx(1.464e6, rel=0.01)
    margin = stage(cards, figures, supply="VP vp 0 5\n").loop.phase_margin
    assert margin == pytest.approx(68.59, abs=1.5)


def test_bandwidth_a_multiple_feedback_filter_needs():
    """Q 10 at 10 kHz: 20 MHz cost 1 % of the bandwidth. Source: S. Franco, ex. 6.12, R2 derived."""
    cards = (
        "VIN in 0 AC 1\nR1 in a 15.92k\nR2 a 0 79.98\nC1 a out 10n\nC2 a n 10n\nR3 n out 31.83k\n"
        "XU1 0 n vp vn out OPAMP1"
    )

    def width(found):
        peak = max((abs(found.gain("VIN", "out", f)), f) for f in range(9_800, 10_100, 2))[1]
        upper = found.corner("VIN", "out", float(peak), 5e4)
        return upper - found.corner("VIN", "out", 1e3, float(peak)), peak

    ideal, real = width(solved(cards)), width(solved(cards, device(gain=1e7, gbw=20e6)))
    assert ideal[1] == pytest.approx(10e3, rel=1e-3)
    assert ideal[0] == pytest.approx(1e3, rel=0.01)
    # One per cent is stated; the peak is looked for in steps of 2 Hz.
    assert 1 - real[0] / ideal[0] == pytest.approx(0.01, rel=0.05)


def test_capacitive_load_with_compensation_inside_the_loop():
    """10 MHz and 100 ohm: the signal's pole is 1 / 2 pi R2 Cf = 141 kHz.

    It is read from the lag far below it. The published figure is that of the feedback network;
    the op-amp's own loop, which closes at 3.3 MHz, is taken out with its loop transmission.
    Source: S. Franco, ex. 8.5 (companion).
    """
    cards = (
        "VIN in 0 AC 1\nR1 in n 10k\nR2 n o2 20k\nCF n out 56p\nRS out o2 50\nCL o2 0 5n\n"
        "XU1 0 n vp vn out OPAMP1"
    )
    found = solved(cards, device(gain=1e7, gbw=10e6, output_resistance="typical = 100"))
    assert abs(found.gain("VIN", "o2", 1e3)) == pytest.approx(2.0, rel=1e-3)
    for hertz in (1e3, 1e4):
        lag = math.pi - cmath.phase(found.unlimited("VIN", "o2", hertz)) % (2 * math.pi)
        assert hertz / math.tan(lag) == pytest.approx(141e3, rel=0.01)


def test_resonance_of_a_bare_differentiator():
    """f0 100 Hz, 1 MHz: Q is 10 kHz / 100 Hz = 100. Source: S. Franco, ex. 8.2 (companion).

    From the loop's own figures, Q = 1 / |1 + T| where |T| is one; from the response, the gain at
    the resonance over that of the ideal differentiator.
    """
    cards = "VIN in 0 AC 1\nC in n 10n\nR n out 159k\nXU1 0 n vp vn out OPAMP1"
    found = solved(cards, device(gain=1e8))
    crossover = stage(cards, device(gain=1e8)).loop.crossover
    assert crossover == pytest.approx(10e3, rel=0.01)
    assert 1 / abs(1 + found.loop_gain(crossover)) == pytest.approx(100.0, rel=0.01)
    peak = max(abs(found.gain("VIN", "out", float(f))) for f in range(9_900, 10_100))
    ideal = 2 * math.pi * crossover * 159e3 * 10e-9
    assert peak / ideal == pytest.approx(100.0, rel=0.01)


MFB = (
    "VR1 r1 0 2.5\nVR2 r2 0 2.5\n"
    "CA in a 10n\nRA a r1 7.503k\nCB a m 10n\nRB m n1 1m\nCC a o1 10n\nRC n1 o1 33.76k\n"
    "XU1 r1 n1 vp 0 o1 OPAMP1\n"
    "R1 o1 b 7.503k\nC1 b r2 4.5n\nR2 b out 7.503k\nR3 b n2 7.503k\nC2 n2 out 1n\n"
    "XU2 r2 n2 vp 0 out OPAMP1"
)


def test_band_pass_of_two_multiple_feedback_stages():
    """Gain 1, corners at 1 kHz and 10 kHz. Source: TI CIRCUIT060055, SLYY137 (goals; values ours)."""
    found = solved(f"VIN in 0 DC 2.5 AC 1\n{MFB}", supply="VP vp 0 5\n")
    assert abs(found.gain("VIN", "out", 3162.0)) == pytest.approx(1.0, rel=0.01)
    target = abs(found.gain("VIN", "out", 3162.0)) / math.sqrt(2)
    for hertz in (1e3, 10e3):
        assert abs(found.gain("VIN", "out", hertz)) == pytest.approx(target, rel=0.01)
