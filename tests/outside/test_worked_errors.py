"""Worked examples about errors: resistors that do not match, offset, bias current, drift.

Through the whole path, except where an example is about a formula alone: then through the function
that states it.
"""

import math

import numpy as np
import pytest

from railguard.analysis.corners import Parameter, Spread
from railguard.analysis.thermal import bias_current
from railguard.devices import catalogue
from railguard.settings.file import parse
from tests.outside.worked import FRANCO, GAYAKWAD, device, stage

EXACT = '[tolerances]\nresistor = "0 %"\nrail = "0 %"\n'


def difference(v1, v2, r1, r2, r3, r4):
    """Return the cards of a difference amplifier."""
    return (
        f"V1 a 0 {v1}\nV2 b 0 {v2}\nR1 a n {r1}\nR2 n out {r2}\nR3 b p {r3}\nR4 p 0 {r4}\n"
        "XU1 p n vp vn out OPAMP1"
    )


@pytest.mark.parametrize(
    ("v1", "v2", "volts"), [(-0.1, 0.1, 1.965), (4.9, 5.1, 2.230), (9.9, 10.1, 2.495)]
)
def test_mismatched_difference_amplifier(v1, v2, volts):
    """Three common-mode levels; matched it gives 2.000 V each. S. Franco, ex. 2.8, derived."""
    found = stage(difference(v1, v2, "10k", "98k", "9.9k", "103k"), device(gain=1e8))
    assert found.output.level == pytest.approx(volts, abs=0.001)
    found = stage(difference(v1, v2, "10k", "100k", "10k", "100k"), device(gain=1e8))
    assert found.output.level == pytest.approx(2.000, abs=0.001)


@pytest.mark.parametrize(
    ("r1", "r2", "share", "decibels", "source"),
    [
        ("10k", "100k", "1 %", 48.8, FRANCO.format("2.9") + ", dB derived"),
        ("10k", "100k", "0.0275 %", 80.0, FRANCO.format("2.9")),
        ("2k", "200k", "1 %", 68.0, "A. S. Sedra, K. C. Smith, Microelectronic Circuits, "
         "exercise 2.15"),
        ("10k", "40k", "0.1 %", 61.94, "Texas Instruments RES11A SLPS785, CMRR of a difference "
         "amplifier"),
    ],
)  # fmt: skip
def test_common_mode_rejection_of_loose_resistors(r1, r2, share, decibels, source):
    """The worst output for 1 V in common against the differential gain."""
    assert source
    settings = device(gain=1e9) + f'[tolerances]\nresistor = "{share}"\n'
    found = stage(difference(1, 1, r1, r2, r1, r2), settings)
    gain = float(r2[:-1]) / float(r1[:-1])
    assert 20 * math.log10(gain / found.output.worst.high) == pytest.approx(decibels, abs=0.1)


NONE = 1e-8
"""V: the least offset a device table takes."""


def errors(cards, vos=NONE, bias=1e-15, difference_of=None, gain=1e8):
    """Return a stage of an amplifier with these errors, resistors exact."""
    figures = {
        "offset_voltage": f"guaranteed = {vos}",
        "bias_current": f"guaranteed = {bias}",
    }
    if difference_of is not None:
        figures["offset_current"] = f"guaranteed = {difference_of}"
    return stage(cards, device(gain=gain, **figures) + EXACT)


def inverting(r1, r2, compensation=None):
    """Return the cards of an inverting stage, its other input at ground or behind a resistor."""
    cards = f"VIN in 0 0\nR1 in n {r1}\nR2 n out {r2}\n"
    if compensation is None:
        return cards + "XU1 0 n vp vn out OPAMP1"
    return cards + f"R3 p 0 {compensation}\nXU1 p n vp vn out OPAMP1"


@pytest.mark.parametrize(
    ("cards", "vos", "bias", "difference_of", "volts", "source"),
    [
        (inverting("470", "47k"), 6e-3, 1e-15, None, 0.606, GAYAKWAD.format("4-4")),
        (inverting("470", "47k"), NONE, 500e-9, None, 23.5e-3, GAYAKWAD.format("4-4")),
        (inverting("1k", "100k"), NONE, 500e-9, None, 50e-3, GAYAKWAD.format("4-5")),
        (inverting("1k", "100k", 990), NONE, 500e-9, 200e-9, 20e-3, GAYAKWAD.format("4-6")),
        (inverting("1k", "10k"), 7.5e-3, 250e-9, 50e-9, 85.0e-3, GAYAKWAD.format("4-7")),
        (inverting("1k", "10k", 909.09), 7.5e-3, 250e-9, 50e-9, 83.0e-3, GAYAKWAD.format("4-7")),
        (inverting("10k", "100k"), NONE, 1.05e-6, 0.1e-6, 0.11,
         "M. S. Sivakumar, Linear Integrated Circuit, ex. 5.5 (companion)"),
        (inverting("10k", "100k", "9.09k"), NONE, 1.05e-6, 0.1e-6, 0.01,
         "M. S. Sivakumar, Linear Integrated Circuit, ex. 5.5 (companion)"),
        # The formula stands for a stage with its compensation resistor.
        (inverting("5k", "500k", 4950.5), 4e-3, 1e-6, 150e-9, 0.479,
         "M. S. Sivakumar, Linear Integrated Circuit, ex. 5.1 (companion)"),
        # Rejection is an offset that follows the common mode: 9.09 V / 90 dB, and / 57 dB.
        (inverting("10k", "100k", 9091), 9.0909 * 10**-4.5, 1e-15, None, 3.16e-3,
         FRANCO.format("5.4")),
        (inverting("10k", "100k", 9091), 9.0909 * 10**-2.85, 1e-15, None, 0.141,
         FRANCO.format("5.4")),
        # 0.1 V of ripple times 30 and 150 uV/V.
        (inverting("100", "100k"), 0.1 * 30e-6, 1e-15, None, 3e-3, FRANCO.format("5.5")),
        (inverting("100", "100k"), 0.1 * 150e-6, 1e-15, None, 15e-3, FRANCO.format("5.5")),
    ],
)  # fmt: skip
def test_published_error_at_the_output(cards, vos, bias, difference_of, volts, source):
    """Offset times the noise gain, bias current times the resistor, what compensation leaves."""
    assert source
    found = errors(cards, vos, bias, difference_of)
    assert found.output.offset == pytest.approx(volts, rel=0.01)


@pytest.mark.parametrize(
    ("r1", "r2", "ohms", "source"),
    [
        ("470", "47k", 465.0, GAYAKWAD.format("4-4")),
        ("1k", "100k", 990.0, GAYAKWAD.format("4-5, 4-6")),
        ("10k", "100k", 9.09e3, "M. S. Sivakumar, Linear Integrated Circuit, ex. 5.5 (companion)"),
    ],
)
def test_compensation_resistor(r1, r2, ohms, source):
    """It equals what the inverting input sees."""
    assert source
    assert stage(inverting(r1, r2)).feedback.seen == pytest.approx(ohms, rel=0.01)


def test_drift_over_ten_degrees():
    """30 uV/K and 300 pA/K: 30.6 mV round -100 mV. Source: R. A. Gayakwad, ex. 4-8 (companion)."""
    cards = "VIN in 0 1m\nR1 in n 1k\nRF n out 100k\nRL out 0 10k\nXU1 0 n vp vn out OPAMP1"
    found = errors(cards, vos=10 * 30e-6, bias=10 * 300e-12)
    assert found.output.offset == pytest.approx(30.6e-3, rel=0.01)
    assert found.output.worst.high == pytest.approx(-69.4e-3, rel=0.01)
    assert found.output.worst.low == pytest.approx(-130.6e-3, rel=0.01)


def test_field_effect_bias_current_doubles_every_ten_degrees():
    """1 pA at 25 degrees is 0.18 nA at 100. Source: S. Franco, ex. 5.3 (companion)."""
    text = device(bias_current="guaranteed = 1e-12").replace("bipolar", "jfet")
    settings = parse(text + "[conditions]\nambient = [0, 100]", "t.toml")
    found = catalogue.load(settings.devices).device("OPAMP1")
    assert bias_current(found, settings) == pytest.approx(0.18e-9, rel=0.01)


def test_extreme_value_against_root_sum_square():
    """885 uV as a sum of worst figures, 145 uV as roots of typical ones. S. Franco, ex. 5.6."""

    def budget(*microvolts):
        count = len(microvolts)
        return Spread(
            parameters=tuple(Parameter(str(k)) for k in range(count)),
            delta=np.array(microvolts, dtype=float),
            stated=np.ones(count, dtype=bool),
            error=np.ones(count, dtype=bool),
            high=np.ones((1, count)),
            low=np.ones((1, count)),
        )

    # 3 uV/K over 45 K; common mode 1 V, supply 1.5 V and 5 V of output, over 80 and 100 dB.
    worst, typical = budget(135, 100, 150, 500), budget(135, 10, 15, 50)
    assert worst.reach(worst.high)[0] == pytest.approx(885.0, rel=1e-3)
    assert typical.root_sum_square(typical.high)[0] == pytest.approx(145.0, rel=0.01)
