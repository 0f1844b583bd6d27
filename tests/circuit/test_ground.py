"""Which net is ground, and what is said where none is."""

import pytest

from railguard.circuit.flatten import flatten
from railguard.deck.files import deck_from_text
from railguard.reviewing import review

AMPLIFIER = (
    "board\nJ1 +12V {0} SUPPLY_2\nJ2 IN {0} SENSOR_2\nU1 OUT OUT IN {0} REF REF B +12V LM358B\n"
    "R1 B {0} 10k\nR2 REF {0} 10k\nR3 REF +12V 10k\nC1 +12V {0} 100n\nR4 OUT {0} 10k\n.end\n"
)


@pytest.mark.parametrize("name", ["AGND", "GNDA", "gnd!", "00", "/GND", "0V", "VSS", "Earth"])
def test_likely_ground_is_proposed_once(name):
    """The net that is plainly meant is taken for ground, and one finding says so."""
    found = flatten(deck_from_text(AMPLIFIER.format(name)))
    (problem,) = [p for p in found.problems if p.rule == "netlist-ground"]
    assert problem.nets == (name,)
    assert f"The net {name}, which 7 elements touch" in problem.message
    assert not any(name in e.nets for e in found.elements)
    meant, plain = (review(AMPLIFIER.format(n)).designs[0] for n in (name, "0"))
    others = [f.rule for f in meant.findings if f.rule != "netlist-ground"]
    assert others == [f.rule for f in plain.findings]
    assert meant.not_checked == plain.not_checked


def test_circuit_without_any_likely_ground():
    """Nothing is guessed from an automatic name."""
    found = flatten(deck_from_text(AMPLIFIER.format("N007")))
    (problem,) = [p for p in found.problems if p.rule == "netlist-ground"]
    assert problem.nets == ()
    assert "no level can be told" in problem.message


def test_nets_beside_ground_are_their_own():
    """An analog ground with a net tie is a net, and no complaint."""
    found = flatten(deck_from_text("b\nV1 +5V 0 5\nNT1 AGND 0 TIE\nR1 +5V AGND 1k\n"))
    assert found.problems == ()
    assert found.elements[2].nets == ("+5V", "AGND")
