"""What has no answer is named by net and element, and the rest is still worked out."""

import pytest

GOOD = "V9 in9 0 SIN(0 1 1k)\nR91 in9 n9 10k\nR92 n9 o9 20k\nXU9 0 n9 vp vn o9 TL072\n"


def both(design, cards):
    """Return the problems, the stage in question, and check that the sound stage is unharmed."""
    found = design(cards + "\n" + GOOD)
    stages = {s.designator: s for s in found.stages}
    assert stages["XU9"].output.demand.high == pytest.approx(2.0, rel=1e-3)
    return found, stages["XU1"]


@pytest.mark.parametrize(
    ("cards", "elements", "net"),
    [
        ("E1 a 0 a 0 1\nR1 a n 1k\nR2 n out 1k\nXU1 0 n vp vn out TL072", {"E1"}, "a"),
        ("E1 a 0 b 0 1\nE2 b 0 a 0 1\nR1 a n 1k\nR2 n out 1k\nXU1 0 n vp vn out TL072",
         {"E1", "E2"}, "b"),
        ("I1 0 a 1u\nG1 a 0 a 0 -1m\nR0 a 0 1k\nXU1 a out vp vn out TL072", {"G1"}, "a"),
    ],
)  # fmt: skip
def test_equations_without_an_answer_name_net_and_element(design, cards, elements, net):
    """A source that repeats itself, two that repeat one another, a resistance cancelled out."""
    found, stage = both(design, cards)
    (problem,) = [p for p in found.problems if p.rule == "netlist-no-solution"]
    assert elements == set(problem.designators)
    assert net in problem.nets
    assert net in problem.message
    assert problem.location is not None
    assert stage.output.demand.high is None
    assert problem.message in stage.unknown["output"].why


@pytest.mark.parametrize(
    ("cards", "element"),
    [
        ("V1 a 0 1\nV2 a 0 2\nXU1 a out vp vn out TL072", "V2"),
        ("V1 a b 1\nV2 b c 1\nV3 c a 1\nR0 a 0 1k\nXU1 a out vp vn out TL072", "V3"),
        ("V1 a 0 1\nL1 a 0 1m\nXU1 a out vp vn out TL072", "L1"),
    ],
)
def test_loops_of_sources_are_named(design, cards, element):
    """Two on one net, three in a ring, an inductor across one."""
    found, stage = both(design, cards)
    (problem,) = [p for p in found.problems if p.rule == "netlist-sources-fight"]
    assert problem.designators == (element,)
    assert stage.output.level is not None


def test_an_inductor_between_equal_levels_is_no_short(design):
    """Two sources of 1 V with a choke between them: no current flows."""
    found, _ = both(design, "V1 a 0 1\nV2 b 0 1\nL1 a b 1m\nXU1 a out vp vn out TL072")
    assert not found.problems


def test_sources_that_fight_are_found_where_no_amplifier_is(design):
    """A part without an amplifier is not solved, but it is looked at."""
    found, _ = both(design, "V1 q 0 1\nV2 q 0 2\nRQ q 0 1k\nV3 a 0 1\nXU1 a out vp vn out TL072")
    assert [p.designators for p in found.problems] == [("V2",)]


def test_capacitors_in_series_are_named(design):
    """The net between them has no level; the stage behind them has its own."""
    cards = "V1 in 0 SIN(0 1 1k)\nC1 in m 1u\nC2 m n 1u\nR2 n out 1k\nXU1 0 n vp vn out TL072"
    found, stage = both(design, cards)
    assert any("C1 and C2" in r.message and "net m" in r.message for r in found.remarks)
    assert stage.output.level == pytest.approx(0.0, abs=1e-6)


def test_a_current_into_a_net_without_dc_path_gives_no_number(design):
    """Its level would be whatever the capacitor has taken up."""
    _, stage = both(design, "I1 0 a 1m\nC1 a 0 1n\nXU1 a out vp vn out TL072")
    assert stage.inputs.plus.state == "floating"
    assert stage.output.demand.high is None
    assert "net a has no DC path" in stage.unknown["output"].why


@pytest.mark.parametrize(
    ("cards", "volts"),
    [
        ("V1 b 0 1\nG1 0 a b 0 1m\nRA a 0 1k", 1.0),
        ("V1 b 0 1\nRB b 0 1k\nF1 0 a V1 2\nRA a 0 1k", -2.0),
        ("V1 b 0 1\nRB b 0 1k\nH1 a 0 V1 2k", -2.0),
        ("V1 b 0 1\nE1 a 0 b 0 2", 2.0),
    ],
)
def test_controlled_sources_are_solved(design, cards, volts):
    """Each of the four by hand; SPICE counts a source's current from its first net through it."""
    _, stage = both(design, cards + "\nXU1 a out vp vn out TL072")
    assert stage.output.level == pytest.approx(volts, rel=1e-4)


@pytest.mark.parametrize(
    "card",
    [
        "E1 a 0 VALUE={V(b)*2}",
        "B1 a 0 V=2*V(b)",
        "G1 0 a VALUE={V(b)*1m}",
        "E1 a 0 b 0 POLY(1) 0 2",
    ],
)
def test_an_expression_is_never_taken_for_zero(design, card):
    """What the solver does not work out has no number."""
    _, stage = both(design, f"V1 b 0 1\nRA a 0 1k\n{card}\nXU1 a out vp vn out TL072")
    assert stage.output.level is None
    assert "an expression" in stage.unknown["output"].why
