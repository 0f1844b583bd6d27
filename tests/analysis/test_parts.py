"""Parts of a circuit that are solved by themselves."""

import pytest

from railguard.analysis.parts import independent
from railguard.analysis.recognise import recognise
from railguard.analysis.signals import prepare
from railguard.analysis.supplies import feeds, supply_nets
from railguard.devices import catalogue
from railguard.settings.model import Settings

STAGE = "R{k} in n{k} 10k\nF{k} n{k} o{k} 20k\nXU{k} 0 n{k} {vp} vn o{k} TL072\n".replace(
    "F{", "RF{"
)


def parts(design, cards, supply=None):
    """Return the designators of the amplifiers of each part."""
    found = design(cards) if supply is None else design(cards, supply=supply)
    circuit = found.circuit
    amplifiers = recognise(circuit, catalogue.load(), Settings()).amplifiers
    fed = feeds(supply_nets(amplifiers), circuit.elements, Settings(), amplifiers)
    prepared = prepare(circuit.elements, Settings(), fed)
    return [[a.designator for a in p.amplifiers] for p in independent(prepared, amplifiers)]


def stages(*numbers, vp="vp"):
    """Return inverting stages on one ideal source."""
    return "VIN in 0 SIN(0 1 1k)\n" + "".join(STAGE.format(k=k, vp=vp) for k in numbers)


def test_stages_on_ideal_sources_are_parts_of_their_own(design):
    """They share the source and the rails, and none of them moves these."""
    assert parts(design, stages(1, 2, 3)) == [["XU1"], ["XU2"], ["XU3"]]


@pytest.mark.parametrize(
    "between",
    [
        "RX o1 n2 10k",
        "DX o1 n2 DM\n.model DM D",
        "EX m 0 o1 0 2\nRX m n2 10k",
        "VX o1 m 0\nFX n2 0 VX 1",
    ],
)
def test_what_lies_between_joins(design, between):
    """A resistor, a diode, a controlled source and a sensed current."""
    assert parts(design, stages(1, 2, 3) + between) == [["XU1", "XU2"], ["XU3"]]


def test_a_source_whose_current_is_sensed_is_not_split(design):
    """The current of VIN is the sum over all that hangs on it."""
    cards = stages(1, 2) + "FX n2 0 VIN 0.1\n"
    assert parts(design, cards) == [["XU1", "XU2"]]


def test_a_rail_behind_a_resistor_joins_what_it_feeds(design):
    """Its level hangs on what all of them draw."""
    supply = "VP bat 0 15\nRS bat vp 10\nVN vn 0 -15\n"
    assert parts(design, stages(1, 2), supply) == [["XU1", "XU2"]]
    drop = design(stages(1, 2), supply=supply).rails
    assert next(r.drop for r in drop if r.net == "vp") == pytest.approx(2 * 10 * 1.4e-3, rel=0.5)


def test_stacked_sources_hold_what_they_feed(design):
    """A supply drawn as a source on top of another is as stiff as one to ground."""
    supply = "VA mid 0 6\nVP vp mid 6\nVN vn 0 -12\n"
    assert parts(design, stages(1, 2), supply) == [["XU1"], ["XU2"]]
    assert [s.supply.positive for s in design(stages(1, 2), supply=supply).stages] == [12.0, 12.0]


def test_parts_get_the_numbers_the_whole_had(design):
    """A resistor of 10 gigohm joins the stages to one part and moves nothing."""
    alone = design(stages(1, 2)).stages
    joined = design(stages(1, 2) + "RX o1 o2 10g\n").stages
    for one, other in zip(alone, joined, strict=True):
        assert one.output.demand.high == pytest.approx(other.output.demand.high, rel=1e-9)
        assert one.current.demand_sink == pytest.approx(other.current.demand_sink, rel=1e-5)
        assert one.loop.crossover == pytest.approx(other.loop.crossover, rel=1e-9)
        assert one.output.worst.high == pytest.approx(other.output.worst.high, rel=1e-9)


def test_an_input_that_feeds_two_parts_is_limited_by_the_narrower(design):
    """The stage with more gain stops the input for both."""
    cards = stages(1, 2) + "RY n2 o2 1g\nR3 in n3 1k\nRF3 n3 o3 100k\nXU3 0 n3 vp vn o3 TL072\n"
    found = design(cards).stages
    assert {s.allowed.limited_by for s in found} == {"headroom-output XU3"}
    assert len({s.allowed.high for s in found}) == 1


def test_channels_of_one_package_in_two_parts_share_its_heat(design):
    """A dual package warms with both channels, wherever they are used."""
    cards = (
        "VIN in 0 SIN(0 5 1k)\nXU1A in a vp vn a TL072\nR1 a 0 1k\n"
        "XU1B in b vp vn b TL072\nR2 b 0 1k\n"
    )
    first, second = design(cards).stages
    assert first.package == second.package
    lone = design(cards.partition("XU1B")[0]).stages[0]
    assert first.dissipation == second.dissipation == pytest.approx(2 * lone.dissipation)
