"""What cards, models and names say of transistors."""

import pytest

from railguard.analysis.transistors import (
    DARLINGTON_GAIN,
    OXIDE_PERMITTIVITY,
    PRACTICE_GAIN,
    area_of,
    transistors_of,
)
from railguard.circuit.flatten import flatten
from railguard.deck.files import deck_from_text


def read(card, model=""):
    """Return the one transistor of a deck, or why it is none to work with."""
    text = f"title\n{card}\nR1 c 0 1k\n{model}\n.end\n"
    circuit = flatten(deck_from_text(text), lambda *_: False)
    found, left = transistors_of(circuit.elements, circuit.models)
    return found[0] if found else next(iter(left.values()))


@pytest.mark.parametrize(
    ("name", "sign", "gain"),
    [
        ("2N3904", 1, PRACTICE_GAIN),
        ("BC557B", -1, PRACTICE_GAIN),
        ("TIP122", 1, DARLINGTON_GAIN),
        ("TIP127", -1, DARLINGTON_GAIN),
        ("TIP31C", 1, PRACTICE_GAIN),
    ],
)
def test_a_name_says_polarity_and_sort(name, sign, gain):
    """Usual order codes without a model: the gain is one of practice."""
    found = read(f"Q1 c b e {name}")
    assert (found.sign, found.gain, found.gain_stated) == (sign, gain, False)
    assert found.volts == (1.4 if gain == DARLINGTON_GAIN else 0.7)


def test_a_model_says_more_than_a_name():
    """A TIP122 as one transistor of a gain of 2,000 has one junction."""
    found = read("Q1 c b e TIP122", ".model TIP122 NPN(BF=2000 IS=1e-12)")
    assert (found.gain, found.gain_stated, found.volts) == (2000.0, True, 0.7)
    assert found.saturation == 1e-12


def test_a_mos_channel_of_level_one():
    """KP times W over L; overlap per width, and two thirds of the oxide at the source."""
    model = ".model MP PMOS(VTO=-1 KP=20u CGSO=1n CGDO=2n TOX=1e-7)"
    found = read("M1 c b e 0 MP W=1m L=10u", model)
    assert (found.sign, found.threshold) == (-1, 1.0)
    assert found.factor == pytest.approx(20e-6 * 100)
    oxide = OXIDE_PERMITTIVITY / 1e-7 * 1e-3 * 10e-6
    assert found.to_source == pytest.approx(1e-12 + 2 / 3 * oxide)
    assert found.to_drain == pytest.approx(2e-12)


def test_a_power_mosfet_gives_its_capacitances_whole():
    """CGS and the largest CGD of a VDMOS; its KP has no width. Its channel is its threshold's."""
    model = ".model MV VDMOS(VTO=-3 KP=4 CGS=900p CGDMAX=400p CGDMIN=30p)"
    found = read("M1 c b e MV", model)
    assert (found.sign, found.threshold, found.factor) == (-1, 3.0, 4.0)
    assert (found.to_source, found.to_drain) == (900e-12, 400e-12)


def test_what_a_model_does_not_give_is_none():
    """No capacitance is none stated, not zero."""
    found = read("M1 c b e 0 MN", ".model MN NMOS(VTO=2 KP=1)")
    assert (found.to_source, found.to_drain) == (None, None)


def test_a_model_of_a_subcircuit_is_found_from_inside():
    """Its name counts where it stands."""
    cards = "XA c b e CELL\n.subckt CELL x y z\nQ1 x y z QL\n.model QL PNP(BF=77)\n.ends"
    found = read(cards)
    assert (found.sign, found.gain) == (-1, 77.0)


@pytest.mark.parametrize(
    ("tail", "area"), [("", 1.0), (" 3", 3.0), (" area=2", 2.0), (" 2.5", 2.5)]
)
def test_area_by_name_or_place(tail, area):
    """A number behind the model is an area."""
    text = f"title\nQ1 c b e QN{tail}\nR1 c 0 1k\n.model QN NPN\n.end\n"
    circuit = flatten(deck_from_text(text), lambda *_: False)
    assert area_of(next(e for e in circuit.elements if e.kind == "Q")) == area


def test_a_junction_fet_in_numbers_and_areas():
    """SPICE's law of a JFET is beta (vgs - vto)^2, without a half; area and M multiply it."""
    found = read("J1 c b e JN 3 m=2", ".model JN NJF(VTO=-2 BETA=1m CGS=4p CGD=1p)")
    assert found.factor == pytest.approx(2 * 1e-3 * 3 * 2)
    assert (found.to_source, found.to_drain) == (4e-12, 1e-12)
    assert read("J1 c b e JN", ".model JN NJF(VTO=-2 BETA=1m CGS=4p)").to_drain == 0.0


@pytest.mark.parametrize(
    ("card", "model"),
    [
        ("J1 c b e JN", ".model JN NJF(VTO=-2)"),
        ("M1 c b e 0 MN W=1m L=0", ".model MN NMOS(VTO=2 KP=1m)"),
    ],
)
def test_a_channel_without_its_factor_is_not_worked_with(card, model):
    """No BETA; a length of nothing."""
    assert read(card, model) == "whose model gives no VTO and KP"


def test_an_oxide_alone_has_no_overlap():
    """Two thirds of it at the source, nothing at the drain."""
    found = read("M1 c b e 0 MN W=1m L=10u", ".model MN NMOS(VTO=1 KP=20u TOX=1e-7)")
    assert found.to_source == pytest.approx(2 / 3 * OXIDE_PERMITTIVITY / 1e-7 * 1e-8)
    assert found.to_drain == 0.0
