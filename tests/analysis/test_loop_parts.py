"""The pieces a loop is worked out from, each by hand."""

import msgspec
import numpy as np
import pytest

from railguard.analysis.loops import (
    BASE_OHMS,
    LoopSweep,
    conducting,
    crossing,
    open_loop,
    phase_margin,
    small_signal,
)
from railguard.analysis.margins import bounding_parasitics, easing_ohms, known_parasitics
from railguard.analysis.network import Network
from railguard.analysis.recognise import Amplifier
from railguard.analysis.stamping import Parasitics
from railguard.circuit.model import Control, Element
from railguard.devices import catalogue
from railguard.devices.model import Figure

DEVICE = msgspec.structs.replace(
    catalogue.load().match("TL072").device,
    open_loop_gain=Figure(1e5),
    gain_bandwidth=Figure(2e6),
    input_capacitance=Figure(7e-12),
    output_resistance=Figure(90.0),
)


def amplifier(designator="XU1", **figures):
    """Make an amplifier of the device above with some figures changed."""
    device = msgspec.structs.replace(DEVICE, **figures)
    match = msgspec.structs.replace(catalogue.load().match("TL072"), device=device)
    element = Element(kind="X", designator=designator, nets=("p", "n", "out"))
    return Amplifier(
        designator=designator, schematic=designator, package="", match=match, element=element,
        plus="p", minus="n", positive="", negative="", output="out",
    )  # fmt: skip


def part(kind, designator, *nets, **fields):
    """Make an element."""
    return Element(kind=kind, designator=designator, nets=nets, **fields)


def test_diodes_conduct_where_only_the_sign_is_asked_for():
    """Those that are fitted; everything else stays, in its order."""
    others = (part("R", "R1", "a", "b", value=1e3), part("D", "D2", "a", "b", fitted=False))
    for nets in (("a", "k"), ("a", "k", "case")):
        made = conducting((others[0], part("D", "D1", *nets), others[1]))
        assert made == (others[0], part("R", "D1", "a", "k", value=BASE_OHMS), others[1])


@pytest.mark.parametrize("kind", ["Q", "J", "M"])
def test_a_transistor_is_its_small_signal(kind):
    """A resistance into its emitter and a current of the voltage there, out of its collector."""
    made, any_found = small_signal((part(kind, "Q1", "c", "b", "e", "bulk"),))
    assert any_found
    assert made == (
        part("R", "Q1 input", "b", "e", value=BASE_OHMS),
        part("G", "Q1 output", "c", "e", control=Control(gain=100.0 / BASE_OHMS, nets=("b", "e"))),
    )


def test_what_is_no_transistor_stays_as_it_is():
    """As does one that is not fitted, or whose card is cut short."""
    plain = (
        part("R", "R1", "a", "b", value=1e3),
        part("Q", "Q1", "c", "b", "e", fitted=False),
        part("Q", "Q2", "c", "b"),
    )
    assert small_signal(plain) == (plain, False)
    made, any_found = small_signal((*plain, part("Q", "Q3", "c", "b", "e")))
    assert (made[:3], any_found) == (plain, True)


def test_a_follower_and_an_inverter_have_their_signs():
    """Collector down, emitter up: the level of each against the base, by solving the model."""
    model, _ = small_signal((part("Q", "Q1", "c", "b", "e"),))
    around = (
        part("V", "VB", "b", "0"),
        part("R", "RC", "c", "0", value=1e3),
        part("R", "RE", "e", "0", value=1e3),
    )
    network = Network([*model, *around], ())
    x = np.linalg.solve(network.g, network.right_hand_side([("VB", 1.0)]).real)
    assert x[network.row("e")] == pytest.approx(1.0, abs=0.02)
    assert x[network.row("c")] == pytest.approx(-1.0, abs=0.02)


def test_the_open_loop_gain_has_one_pole():
    """A0 at rest, GBW/f far above the pole, three decibels down at it."""
    hertz = np.array([1e-3, 20.0, 2e5, 2e6])
    a = open_loop(amplifier(), hertz)
    assert np.abs(a) == pytest.approx(np.array([1e5, 1e5 / np.sqrt(2), 10.0, 1.0]), rel=1e-4)
    assert np.degrees(np.angle(a[1:3])) == pytest.approx(np.array([-45.0, -90.0]), abs=0.01)
    flat = open_loop(amplifier(gain_bandwidth=Figure()), hertz)
    assert flat == pytest.approx(np.full(4, 1e5 + 0j))


@pytest.mark.parametrize(
    ("magnitude", "expected"),
    [
        ([100.0, 10.0, 1.0, 0.1], 100.0),
        ([100.0, 10.0, 0.1, 0.01], 10 * np.sqrt(10)),  # half way on both scales
        ([10.0, 0.1, 10.0, 0.1], 100 * np.sqrt(10)),  # the highest one counts
        ([10.0, 5.0, 2.0, 1.5], None),
        ([0.9, 0.5, 0.2, 0.1], None),
        ([0.5, 2.0, 4.0, 8.0], None),  # it rises through one
        ([100.0, 10.0, 2.0, 0.0], 100.0 * np.exp(np.log(2) / np.log(2e300) * np.log(10))),
    ],
)
def test_where_a_loop_closes(magnitude, expected):
    """Decades from 1 Hz to 1 kHz."""
    found = crossing(np.array([1.0, 10.0, 100.0, 1000.0]), np.array(magnitude))
    assert found == (expected and pytest.approx(expected, rel=1e-6))


def test_a_phase_margin_is_what_is_left_of_half_a_turn():
    """Between two points by the logarithm of the frequency, past a whole turn and all."""
    hertz = np.array([1.0, 100.0, 1e4])
    degrees = np.array([-90.0, -150.0, -210.0])
    a_beta = np.exp(1j * np.radians(degrees))
    assert phase_margin(hertz, a_beta, 10.0) == pytest.approx(60.0)
    assert phase_margin(hertz, a_beta, 1e3) == pytest.approx(0.0)
    assert phase_margin(hertz, a_beta, 1e4) == pytest.approx(-30.0)
    both = LoopSweep(hertz=hertz, a_beta=np.stack([-a_beta, a_beta], axis=1), dc=np.ones(2))
    assert both.margin(1, 10.0) == pytest.approx(60.0)
    assert both.margin(1, 1e3) == pytest.approx(0.0)


def test_what_is_not_listed_of_an_amplifier_is_nothing_or_the_most_there_is():
    """20 pF and 200 ohm by common practice; what is listed stands in both."""
    bare = amplifier("XU2", input_capacitance=Figure(), output_resistance=Figure())
    unknown = msgspec.structs.replace(
        bare, designator="XU3", match=msgspec.structs.replace(bare.match, device=None)
    )
    every = (amplifier(), bare, unknown)
    listed = Parasitics(7e-12, 90.0)
    assert known_parasitics(every) == {"XU1": listed, "XU2": Parasitics(0.0, 0.0)}
    assert bounding_parasitics(every) == {"XU1": listed, "XU2": Parasitics(20e-12, 200.0)}


def test_an_output_resistance_that_is_not_listed_is_at_least_so_much():
    """10 ohm; 26 mV / 2 at 5 mA are 2.6 ohm. What a sheet answers is not guessed."""
    bare = {"output_resistance": Figure(), "load_capacitance": Figure()}
    every = (
        amplifier("XU1"),
        amplifier("XU2", **bare, supply_current=Figure(0.2e-3)),
        amplifier("XU3", **bare, supply_current=Figure(4e-3, 5e-3)),
        amplifier("XU4", **bare, supply_current=Figure()),
        amplifier("XU5", **bare | {"load_capacitance": Figure(float("inf"))}),
    )
    assert easing_ohms(every) == {
        "XU2": 10.0,
        "XU3": pytest.approx(2.6),
        "XU4": 10.0,
    }
