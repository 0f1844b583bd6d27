"""What an input meets on its way to a defined potential, on circuits made by hand."""

import pytest

from railguard.analysis.dcpaths import DcMap, DcPath, is_capacitor, is_linear, leaves_sheet
from railguard.analysis.recognise import Amplifier
from railguard.circuit.model import Control, Element
from railguard.devices.model import Match

FACTOR = Control(gain=2.0, nets=("a", "b"))


def part(kind, designator, *nets, **fields):
    """Make an element."""
    return Element(kind=kind, designator=designator, nets=nets, **fields)


def amplifier(designator, plus, minus, output):
    """Make an amplifier without supply pins."""
    return Amplifier(
        designator=designator, schematic=designator, package="", match=Match("", "op-amp"),
        element=part("X", designator, plus, minus, output), plus=plus, minus=minus, output=output,
        positive="", negative="",
    )  # fmt: skip


U1 = amplifier("XU1", "in", "n", "out")
U2 = amplifier("XU2", "p2", "n2", "o2")


def path(*elements, net="in", stated=(), own="XU1"):
    """Search from the input of U1, whose own card and that of U2 are among the elements."""
    every = (*elements, U1.element, U2.element)
    return DcMap(every, (U1, U2), stated).path(net, own)


@pytest.mark.parametrize("kind", ["R", "L", "link", "V", "E", "H", "battery"])
def test_what_conducts_holds_an_input_at_ground(kind):
    """Resistors, inductors, links and whatever sets a voltage."""
    assert path(part(kind, "A1", "in", "0")) == DcPath("held", ("A1",))


def test_the_shortest_way_is_told_in_its_order():
    """Element by element from the input; a longer way and a ring are passed by."""
    found = path(
        part("R", "R1", "in", "a"),
        part("R", "R5", "a", "in"),
        part("L", "L2", "a", "b"),
        part("R", "R3", "b", "0"),
        part("R", "R4", "a", "c"),
        part("R", "R6", "c", "d"),
        part("R", "R7", "d", "0"),
    )
    assert found == DcPath("held", ("R1", "L2", "R3"))


def test_an_input_on_a_potential_itself_needs_no_way():
    """A stated net, or the output of another amplifier."""
    assert path(net="ref", stated=("ref",)) == DcPath("held", ())
    assert path(net="o2") == DcPath("held", ())
    assert path(part("R", "R1", "in", "o2")) == DcPath("held", ("R1",))


def test_only_the_first_two_nets_of_an_element_conduct():
    """What stands behind them on a board's card is a size or a case, as in `FB1 in x 600R 0805`."""
    assert path(part("link", "FB1", "in", "x", "0")) == DcPath("floating", ())
    assert path(part("link", "FB1", "in", "0", "600R")) == DcPath("held", ("FB1",))


def test_capacitors_current_sources_and_inputs_hold_nothing():
    """The net hangs on them, each named once, in the order met."""
    found = path(
        part("C", "C2", "in", "0"),
        part("R", "R1", "in", "a"),
        part("I", "I1", "0", "a"),
        part("C", "C2", "in", "a"),
    )
    assert found == DcPath("floating", ("C2", "I1"))


def test_a_net_on_nothing_floats():
    """Its amplifier's own card does not count."""
    assert path() == DcPath("floating", ())


def test_a_search_through_nets_on_nothing_comes_to_an_end():
    """A chain and a ring of resistors: no net is gone through twice."""
    chain = (part("R", "R1", "in", "a"), part("R", "R2", "a", "b"), part("R", "R3", "b", "c"))
    assert path(*chain, part("C", "C4", "c", "0")) == DcPath("floating", ("C4",))
    assert path(*chain, part("R", "R4", "c", "a")) == DcPath("floating", ())


def test_something_unseen_on_the_way_leaves_it_open():
    """Nearer than where the way ends as well as there."""
    near = (part("open", "J1", "in"), part("R", "R1", "in", "a"), part("C", "C1", "a", "0"))
    assert path(*near) == DcPath("open", ("J1",))
    assert path(*near, part("open", "J2", "a")) == DcPath("open", ("J1", "J2"))


def test_what_is_not_fitted_is_not_there():
    """Neither as a path nor as something the net hangs on."""
    assert path(part("R", "R1", "in", "0", fitted=False)) == DcPath("floating", ())


@pytest.mark.parametrize(
    "kind", ["open", "ic", "opaque", "X", "B", "S", "W", "T", "G", "F", "D", "Q", "J", "M"]
)
def test_what_cannot_be_seen_through_leaves_an_input_open(kind):
    """Not floating: something may come from there. Only those are named."""
    found = path(part("C", "C1", "in", "0"), part(kind, "A1", "in", "z"), part(kind, "A1", "in"))
    assert found == DcPath("open", ("A1",))


@pytest.mark.parametrize("designator", ["TP3", "XTP3", "tp3"])
def test_nothing_comes_from_a_test_point(designator):
    """It is a place to put a probe."""
    probe = part("open", designator, "in")
    assert path(probe) == DcPath("floating", (designator,))
    assert not leaves_sheet(probe)


@pytest.mark.parametrize("designator", ["J3", "T3", "PT1"])
def test_other_open_pins_leave_the_sheet(designator):
    """A connector may bring anything."""
    assert leaves_sheet(part("open", designator, "in"))


def test_a_linear_current_source_is_in_the_equations():
    """It holds nothing, and hides nothing; one of an expression hides what it does."""
    linear = part("G", "G1", "in", "0", control=FACTOR)
    assert path(linear) == DcPath("floating", ("G1",))
    mirror = part("F", "F1", "in", "0", control=Control(gain=1.0, element="V1"))
    assert path(mirror) == DcPath("floating", ("F1",))
    hidden = part("G", "G1", "in", "0", control=Control(gain=None, text="v(a)^2"))
    assert path(hidden) == DcPath("open", ("G1",))


def test_feedback_alone_is_told_from_a_level():
    """Through its own output a net has a path, but no level of its own."""
    back = part("R", "R2", "out", "n")
    assert path(back, net="n") == DcPath("held-by-own-output", ("R2",))
    assert path(back, part("R", "R1", "n", "0"), net="n") == DcPath("held", ("R1",))
    other = path(back, part("D", "D1", "n", "0"), net="n")
    assert other == DcPath("open", ("D1",))


def test_the_search_ends_at_its_own_output():
    """What the output drives beyond does not hold the input."""
    load = part("R", "RL", "out", "0")
    found = path(part("R", "R2", "out", "n"), load, net="n")
    assert found == DcPath("held-by-own-output", ("R2",))


def test_two_outputs_on_one_net_hold_each_other_s_inputs():
    """The other amplifier drives it."""
    twin = amplifier("XU3", "p3", "n3", "out")
    chart = DcMap((part("R", "R2", "out", "n"),), (U1, twin), ())
    assert chart.path("n", "XU1") == DcPath("held", ("R2",))


def test_what_stands_on_a_net_and_what_it_is():
    """Every element once, amplifiers left out; ground, stated nets and outputs are potentials."""
    both = part("R", "R1", "in", "in")
    chart = DcMap((both, U1.element), (U1,), ("ref",))
    assert chart.at("in") == [both]
    assert chart.at("nowhere") == []
    assert [chart.is_potential(net) for net in ("0", "ref", "out", "in")] == [
        True, True, True, False,
    ]  # fmt: skip


@pytest.mark.parametrize(
    ("kind", "control", "linear"),
    [
        ("G", Control(gain=1e-3, nets=("a", "b")), True),
        ("E", Control(gain=2.0, nets=("a", "b")), True),
        ("G", Control(gain=1e-3, nets=("a", "b", "c", "d")), False),  # of two voltages
        ("F", Control(gain=2.0, element="V1"), True),
        ("H", Control(gain=2.0, element="V1"), True),
        ("F", Control(gain=2.0), False),
        ("H", Control(gain=2.0, nets=("a", "b")), False),
        ("G", Control(gain=None, nets=("a", "b")), False),
        ("G", None, False),
    ],
)
def test_a_plain_factor(kind, control, linear):
    """Of one voltage for E and G, of one current for F and H."""
    assert is_linear(part(kind, "A1", "x", "y", control=control)) is linear


@pytest.mark.parametrize(
    ("kind", "designator", "nets", "named"),
    [
        ("C", "C1", "ab", True),
        ("opaque", "C1", "ab", True),
        ("opaque", "XCH1.c12", "ab", True),
        ("opaque", "CN1", "ab", False),
        ("opaque", "U1C1", "ab", False),
        ("opaque", "C1", "abc", False),
        ("C", "C1", "abc", False),
        ("R", "C1", "ab", False),
    ],
)
def test_a_capacitor_is_one_by_its_card_or_by_its_name(kind, designator, nets, named):
    """One without a value is opaque, and still no way for direct current."""
    assert is_capacitor(part(kind, designator, *nets)) is named
