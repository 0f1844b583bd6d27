"""Extreme values against sampling and against hand calculation."""

import msgspec
import numpy as np
import pytest

from railguard.analysis.corners import Nuisance, spread, tolerance_of
from railguard.analysis.design import analyse
from railguard.analysis.network import Network
from railguard.analysis.ranges import answer
from railguard.analysis.recognise import keeps_closed, recognise
from railguard.analysis.sampling import exact_corners, monte_carlo
from railguard.analysis.signals import prepare
from railguard.analysis.solution import Options
from railguard.analysis.supplies import feeds, supply_nets
from railguard.circuit.flatten import flatten
from railguard.circuit.model import Element
from railguard.deck.files import deck_from_text
from railguard.devices import catalogue
from railguard.settings.model import Settings, Tolerances

CIRCUITS = {
    "inverting": "VIN in 0 SIN(0 0.5 1k)\nR1 in n 10k\nR2 n out 100k\nXU1 0 n vp vn out TL072",
    "non-inverting": "VIN in 0 SIN(1 0.2 1k)\nR1 n 0 1k\nR2 n out 9k\nXU1 in n vp vn out TL072",
    "difference": (
        "V1 a 0 SIN(2 0.1 1k)\nV2 b 0 2\nR1 a n 10k\nR2 n out 50k\nR3 b p 10k\nR4 p 0 50k\n"
        "XU1 p n vp vn out TL072"
    ),
    "summing": (
        "V1 a 0 SIN(0 1 1k)\nV2 b 0 0.5\nR1 a n 10k\nR2 b n 20k\nRF n out 30k\n"
        "XU1 0 n vp vn out TL072"
    ),
    "low-pass": "VIN in 0 SIN(0 1 1k)\nR1 in n 10k\nR2 n out 20k\nC2 n out 8.2n\n"
    "XU1 0 n vp vn out TL072",
    "Sallen-Key": "VIN in 0 SIN(0 1 9k)\nR1 in a 11.3k\nR2 a p 11.3k\nC1 a out 2n\nC2 p 0 1n\n"
    "XU1 p out vp vn out TL072",
    "divider": "VIN in 0 SIN(2 2 50)\nR1 in p 33k\nR2 p 0 10k\nXU1 p out vp vn out TL072",
    "two-stage": (
        "VIN in 0 SIN(0 0.1 1k)\nR1 n 0 1k\nR2 n a 9k\nXU1 in n vp vn a TL072\nR3 a m 10k\n"
        "R4 m out 30k\nXU2 0 m vp vn out TL072"
    ),
    "rail reference": "R1 vp p 20k\nR2 p 0 10k\nXU1 p out vp vn out TL072",
    "transimpedance": "IIN 0 n SIN(1u 1u 1k)\nR2 n out 1meg\nXU1 0 n vp vn out TL072",
}


def _solved(design, cards):
    circuit = design(cards).circuit
    found = recognise(circuit, catalogue.load(), Settings()).amplifiers
    fed = feeds(supply_nets(found), circuit.elements, Settings(), found)
    prepared = prepare(circuit.elements, Settings(), fed)
    network = Network(prepared.elements, found)
    answers = answer(network, found, prepared, {}, {})
    rails = {"VP": (15.0, 0.05, False), "VN": (-15.0, 0.05, False)}
    return answers, spread(answers, prepared.elements, frozenset(), Tolerances(), rails, {})


@pytest.mark.parametrize("name", CIRCUITS)
def test_no_sample_leaves_the_extreme_value(design, name):
    """10,000 samples stay inside the bound, or leave it by less than 0.5 % of its width."""
    answers, found = _solved(design, CIRCUITS[name])
    sampled = monte_carlo(answers, found, 10_000, seed=1)
    for k in range(len(answers.amplifiers)):
        for quantity in ("output", "current"):
            q = answers.at(k, quantity)
            high = answers.high[q] + np.abs(found.high[q]) @ found.delta
            low = answers.low[q] - np.abs(found.low[q]) @ found.delta
            slack = 0.005 * max(high - low, 1e-12)
            assert sampled.high[:, q].max() <= high + slack
            assert sampled.low[:, q].min() >= low - slack


@pytest.mark.parametrize("name", CIRCUITS)
def test_no_sample_leaves_the_exact_corner(design, name):
    """The re-solved corner bounds every sample."""
    answers, found = _solved(design, CIRCUITS[name])
    sampled = monte_carlo(answers, found, 10_000, seed=2)
    q = answers.at(len(answers.amplifiers) - 1, "output")
    exact = exact_corners(answers, found, [q])
    slack = 1e-9 * (1 + abs(exact.high[0, 0]))
    assert sampled.high[:, q].max() <= exact.high[0, 0] + slack
    assert sampled.low[:, q].min() >= exact.low[0, 0] - slack


@pytest.mark.parametrize("name", CIRCUITS)
def test_reported_bounds_hold_reported_samples(name):
    """The whole path, offset and bias included: output and current of every stage."""
    text = f"title\n{CIRCUITS[name]}\nVP vp 0 15\nVN vn 0 -15\n"
    devices = catalogue.load()
    circuit = flatten(deck_from_text(text), keeps_closed(devices))
    by_slope = analyse(circuit, Settings(), devices, Options(samples=10_000, seed=3)).stages
    solved = analyse(circuit, Settings(), devices, Options(exact=True)).stages
    for stage, exact in zip(by_slope, solved, strict=True):
        worst, sampled = stage.output.worst, stage.output.sampled
        slack = 0.005 * worst.span
        assert worst.low - slack <= sampled.low <= sampled.high <= worst.high + slack
        # Only what moves the sample one way over its whole tolerance is bounded by a corner.
        least = 1e-9 * (1 + abs(exact.output.worst.high))
        assert exact.output.worst.low - least <= sampled.low
        assert sampled.high <= exact.output.worst.high + least
        source, sink = stage.current.worst_source, stage.current.worst_sink
        slack = 0.005 * (source + sink)
        assert sampled.span > 0.1 * worst.span
        assert stage.current.sampled.high <= source + slack
        assert -stage.current.sampled.low <= sink + slack


def test_inverting_gain_spreads_twice_the_tolerance(design):
    """Gain -10 with 1 % resistors: 2 % of 5 V either way, to first order."""
    answers, found = _solved(design, CIRCUITS["inverting"])
    q = answers.at(0, "output")
    assert np.abs(found.high[q]) @ found.delta == pytest.approx(0.02 * 5.0, rel=5e-3)


@pytest.mark.parametrize(
    ("text", "expected"),
    [
        ("5%", (0.05, True)),
        ("tol=0.1 %", (0.001, True)),
        ("0603 1%", (0.01, True)),
        ("", (0.01, False)),
    ],
)
def test_tolerance_is_read_from_the_card(text, expected):
    """A card's own tolerance counts as stated; else the class's default."""
    element = Element(kind="R", designator="R1", nets=("a", "b"), value=1e3, text=text)
    assert tolerance_of(element, Tolerances()) == expected


@pytest.mark.parametrize(
    ("designator", "fields", "expected"),
    [
        # narrower statements go first, whatever the card says, by either spelling, in any case
        ("XCH1.R5", {"text": "5%"}, (0.001, True)),
        ("r7", {}, (0.002, True)),
        ("XCH2.R7", {}, (0.003, True)),
        ("R8", {"text": "5%"}, (0.05, True)),
        # then the card's own parameter, then its text
        ("R8", {"parameters": {"tol": 0.02}, "text": "5%"}, (0.02, True)),
        ("R8", {"parameters": {"tol": 0.0}}, (0.0, True)),
        ("R8", {"parameters": {"tol": 1.0}}, (0.01, False)),  # no share: per cent, or a slip
        ("R8", {"parameters": {"tol": -0.1}}, (0.01, False)),
        ("R8", {"text": "50%"}, (0.5, True)),
        ("R8", {"text": "51%"}, (0.01, False)),  # nothing is sold so loose
        ("C1", {"kind": "C"}, (0.10, False)),
        ("L1", {"kind": "L"}, (0.20, False)),
        ("V1", {"kind": "V"}, (0.0, False)),
    ],
)
def test_whose_tolerance_counts(designator, fields, expected):
    """Statements, card, text, class: the first that speaks."""
    rules = (("ch1.R5", 0.001), ("R7", 0.002), ("XCH2.*", 0.003))
    usual = {"kind": "R", "designator": designator, "nets": ("a", "b"), "value": 1e3}
    element = Element(**{**usual, **fields})
    assert tolerance_of(element, Tolerances(rules=rules)) == expected


def test_a_class_may_be_stated():
    """Each for itself; it counts as stated then."""
    stated = Tolerances(resistor=0.001, capacitor=0.02, inductor=0.05)
    shares = []
    for kind in "RCL":
        element = Element(kind=kind, designator=f"{kind}1", nets=("a", "b"), value=1.0)
        shares.append(tolerance_of(element, stated))
    assert shares == [(0.001, True), (0.02, True), (0.05, True)]


MOVING = {
    **{name: CIRCUITS[name] for name in ("low-pass", "Sallen-Key", "difference", "two-stage")},
    "coil": (
        "VIN in 0 SIN(0.5 1 20k)\nL1 in a 10m\nR1 a p 1k\nC1 p 0 4.7n\nR2 p 0 10k\nR3 n 0 1k\n"
        "R4 n out 2k\nXU1 p n vp vn out TL072"
    ),
    "output at the first net": (
        "C2 out n 8.2n\nR2 n out 20k\nR1 in n 10k\nVIN in 0 SIN(0.2 1 1k)\nXU1 0 n vp vn out TL072"
    ),
    "two tones that meet": (
        "V1 a 0 SIN(0 1 1k)\nV2 b 0 SIN(0 0.5 7.3137k)\nR1 a n 10k\nR2 b n 22k\nR3 n out 15k\n"
        "C3 n out 2.2n\nXU1 0 n vp vn out TL072"
    ),
}


@pytest.mark.parametrize("name", MOVING)
def test_derivatives_are_what_a_small_change_does(design, name):
    """Each element by a hundred-thousandth: both ends of every quantity move as they are said to.

    The circuit with the changed element is solved anew, phase, peak and all.
    """
    answers, found = _solved(design, MOVING[name])
    circuit = design(MOVING[name]).circuit
    stamps = [p.stamp for p in found.parameters if p.stamp is not None]
    assert {stamp.kind for stamp in stamps} >= ({"L"} if name == "coil" else {"R"})
    for column, stamp in enumerate(stamps):
        share = 1e-5
        changed = tuple(
            msgspec.structs.replace(e, value=e.value * (1 + share))
            if e.designator == stamp.designator
            else e
            for e in circuit.elements
        )
        amplifiers = recognise(circuit, catalogue.load(), Settings()).amplifiers
        fed = feeds(supply_nets(amplifiers), changed, Settings(), amplifiers)
        prepared = prepare(changed, Settings(), fed)
        moved = answer(Network(prepared.elements, amplifiers), amplifiers, prepared, {}, {})
        scale = np.abs(answers.high).max()
        for ends, before, said in (
            (moved.high, answers.high, found.high),
            (moved.low, answers.low, found.low),
        ):
            seen = (ends - before) / share
            assert said[:, column] == pytest.approx(seen, rel=2e-3, abs=2e-4 * scale)


def test_an_exact_part_leaves_those_after_it(design):
    """A bridge's own resistor has no tolerance; each other parameter keeps its name."""
    answers, _ = _solved(design, CIRCUITS["inverting"])
    elements = design(CIRCUITS["inverting"]).circuit.elements
    made = spread(
        answers, elements, frozenset({"R1"}), Tolerances(), {"VP": (15.0, 0.05, True)}, {}
    )
    assert made.names == ("R2", "CP", "CN", "VP")
    assert made.shares == {"R2": 0.01, "CP": 0.1, "CN": 0.1}
    assert made.stated.tolist() == [False, False, False, True]
    assert made.error.tolist() == [False] * 4


TIED = "VIN in 0 1\nXU1 in out vp vn out TL072\nXU2 in out vp vn out TL072"
LATER = (
    "VIN in 0 SIN(0 1 100)\nXU1 in 0 vp vn a TL072\nR1 a n 10k\nR2 n out 10k\n"
    "XU2 0 n vp vn out TL072"
)
HANGING = "VIN in 0 SIN(0 1 1k)\nC1 in p 100n\nXU1 p out vp vn out TL072"


@pytest.mark.parametrize(
    ("cards", "names"),
    [
        # an output that something else holds moves nothing
        (TIED, ["offset of XU1"] + ["bias current of XU1"] * 2),
        # each of two that work
        (
            LATER.replace("in 0 vp", "in a vp"),
            ["offset of XU1"] + ["bias current of XU1"] * 2
            + ["offset of XU2", "bias current of XU2"],
        ),
        # into a net that nothing leads away from no current flows
        (HANGING, ["offset of XU1", "bias current of XU1"]),
    ],
)  # fmt: skip
def test_whose_errors_count(design, cards, names):
    """One entry for the offset and one for each input that is no ground."""
    answers, _ = _solved(design, cards)
    wrong = {a.designator: Nuisance(1e-3, 1e-6) for a in answers.amplifiers}
    every = frozenset(e.designator for e in design(cards).circuit.elements)
    made = spread(answers, design(cards).circuit.elements, every, Tolerances(), {}, wrong)
    assert list(made.names) == names


def test_nothing_that_may_be_off_moves_nothing(design):
    """No parameter, a derivative to none for each of an amplifier's six quantities."""
    answers, _ = _solved(design, CIRCUITS["inverting"])
    made = spread(answers, (), frozenset(), Tolerances(), {}, {})
    assert (made.names, made.high.shape, made.low.shape) == ((), (6, 0), (6, 0))
    assert (made.stated.dtype, made.error.dtype) == (bool, bool)
    assert not made.any_stated


def test_a_comparator_before_a_stage_leaves_it_its_errors(design):
    """At a noise gain of two; what switches has no offset to pass on."""
    found = design(LATER).stages[1]
    bias = found.family.bias_current.best * 10e3
    expected = 2 * found.family.offset_voltage.best + bias
    assert found.output.offset == pytest.approx(expected, rel=0.01)


def test_a_band_that_does_not_begin_at_rest_has_its_ends(stage):
    """Behind a capacitor nothing arrives at DC; at the top of the band both resistors count."""
    settings = '[signals]\n"in" = { low = -0.5, high = 0.5, to = 1e3 }'
    cards = "J1 in\nC1 in m 100u\nR1 m n 10k\nR2 n out 100k\nXU1 0 n vp vn out BARE"
    output = stage(cards, BARE + settings).output
    assert output.demand.high == pytest.approx(5.0, rel=1e-3)
    assert output.worst.high == pytest.approx(5.0 * 1.02, rel=1e-3)


BARE = """
[[devices]]
family = "BARE"
technology = "cmos"
names = { 1 = ["BARE"] }
source = { title = "made for this test: it has no errors" }
"""


def test_the_offset_told_is_the_amplifiers_alone(stage):
    """At a noise gain of eleven; what the resistors do to the level of 5 V is not in it."""
    cards = CIRCUITS["inverting"].replace("SIN(0 0.5 1k)", "0.5")
    assert stage(cards.replace("TL072", "BARE"), BARE).output.offset == 0.0
    found = stage(cards)
    bias = found.family.bias_current.best * 100e3
    assert found.output.offset == pytest.approx(
        11 * found.family.offset_voltage.best + bias, rel=0.01
    )


@pytest.mark.parametrize("lower", ["V1 mid 0 6", "V1 0 mid -6"])
def test_both_of_two_stacked_sources_move_a_rail(stage, lower):
    """Whichever way round the lower one is drawn: 5 % of 12 V off a limit 2 V below them."""
    cards = "VIN in 0 SIN(6 1 100)\nXU1 in out vp 0 out BARE\nRL out 0 10k"
    high = stage(cards, BARE, supply=f"V2 vp mid 6\n{lower}\n").output.high
    assert high.default.limit == pytest.approx(10.0 - 0.6)
    assert set(high.culprits) == {"V1", "V2"}


def test_a_bias_current_into_the_first_net_counts(stage):
    """The order of the cards changes nothing: what a megohm makes of it is in the offset."""
    cards = ["RS p in 1meg", "VIN in 0 1", "XU1 p out vp vn out LM358", "RL out 0 10k"]
    found = stage("\n".join(cards))
    assert found.output.offset == pytest.approx(stage("\n".join(cards[::-1])).output.offset)
    assert found.output.offset > 1e6 * found.family.bias_current.best


def _disturbed(design, cards, nuisance, stated=False):
    """Return the spread of a circuit whose elements are exact, its amplifier's errors given."""
    circuit = design(cards).circuit
    found = recognise(circuit, catalogue.load(), Settings()).amplifiers
    fed = feeds(supply_nets(found), circuit.elements, Settings(), found)
    prepared = prepare(circuit.elements, Settings(), fed)
    network = Network(prepared.elements, found)
    answers = answer(network, found, prepared, {}, {})
    exact = frozenset(e.designator for e in circuit.elements)
    rails = {"VP": (15.0, 0.05, stated), "VN": (-15.0, 0.0, stated), "VX": (1.0, 0.1, False)}
    made = spread(answers, prepared.elements, exact, Tolerances(), rails, {"XU1": nuisance})
    return answers, network, made


@pytest.mark.parametrize(
    ("name", "difference", "sizes"),
    [
        # 1 mV times eleven; 1 uA through 100 kohm, its fellow flows into ground
        ("inverting", None, (11e-3, 0.1)),
        # what the currents may differ by is in either of them
        ("inverting", 0.2e-6, (11e-3, 0.11)),
        # 10 kohm at either input: apart they add up, together they cancel but for the rest
        ("equal", None, (11e-3, 0.11, 0.1)),
        ("equal", 0.2e-6, (11e-3, 0.01, 0.021)),
    ],
)
def test_offset_and_bias_current_move_the_output(design, name, difference, sizes):
    """By hand at a noise gain of eleven, each error named by its amplifier."""
    equal = "RS in p 10k\nVIN in 0 0\nR1 n 0 10k\nR2 n out 100k\nXU1 p n vp vn out TL072"
    cards = CIRCUITS["inverting"] if name == "inverting" else equal
    answers, _, made = _disturbed(design, cards, Nuisance(1e-3, 1e-6, difference))
    q = answers.at(0, "output")
    assert made.names == (
        "VP", "offset of XU1", *["bias current of XU1"] * (len(sizes) - 1),
    )  # fmt: skip
    assert np.abs(made.high[q, 1:] * made.delta[1:]) == pytest.approx(np.array(sizes), rel=1e-3)
    assert list(made.error) == [False] + [True] * len(sizes)


@pytest.mark.parametrize("stated", [True, False])
def test_a_rail_moves_what_stands_on_it(design, stated):
    """A third of the rail at the input: 5 % of 5 V; the entry of b it moves is told for re-solving.

    A rail that is exact, or that no source of the deck holds, is no parameter.
    """
    answers, network, made = _disturbed(
        design, CIRCUITS["rail reference"], Nuisance(0.0, 0.0), stated
    )
    q = answers.at(0, "output")
    assert made.high[q, 0] * made.delta[0] == pytest.approx(0.25, rel=1e-3)
    assert list(made.stated) == [stated, False, False, False]
    rail, offset, *bias = made.parameters
    assert rail.entries == ((network.injections["VP"].row, 15.0),)
    assert offset.entries == ((network.outputs["XU1"], 1.0),)
    assert [p.entries for p in bias] == [((network.row(net), 1.0),) for net in ("p", "out")]
