"""Gains and levels of more than one resistor: pairs at a bridge, filters, references, dividers."""

import pytest

from railguard.redline import gain
from railguard.redline.propose import proposals, redline
from railguard.redline.scene import Scene
from railguard.redline.source import of_review
from railguard.reviewing import review, review_deck

RAILS = "VP vp 0 5\nC1 vp 0 100n\nC2 vp 0 10u\nVREF ref 0 2.5\n"


def reviewed(cards, title="part of the river gauge"):
    """Review a netlist on 5 V with a reference in the middle."""
    return review(f"{title}\n{RAILS}{cards}\nRL out 0 20k\n", plugins=False).designs[0]


def answer(before, rule="headroom-output"):
    """Return the proposal for a rule, and the review of the deck it makes."""
    found = next(p for p in proposals(before) if p.finding.rule == rule)
    after, _ = review_deck(of_review(before).patched(found.edits).deck(), before.design.settings)
    return found, after


PAIR = """* railguard: signal bridge between=S1,S2 peak=0.0167 common=2.5 ohms=350 to=20
J1 S1 S2 0 CONN3
R1 out n1 10k
RG n1 n2 24
R2 n2 o2 10k
XU1 S1 n1 vp 0 out MCP6002
XU2 S2 n2 vp 0 o2 MCP6002"""


def test_one_resistor_sets_the_gain_of_a_pair():
    """It grows; the two others stay alike. 1 + 2 R / RG is what a difference is multiplied by."""
    before = reviewed(PAIR)
    found, after = answer(before)
    assert found.what.startswith("RG = ")
    ohms = next(e.value for e in after.design.circuit.elements if e.designator == "RG")
    gains = [sum(abs(g) for _, g in stage.gain) for stage in after.design.stages]
    assert gains[0] == pytest.approx((1 + 2 * 10e3 / ohms) / 2, rel=1e-3)
    assert gains[0] == pytest.approx(gains[1], rel=1e-3)
    assert f"falls from {834} to" in found.choice


def test_a_difference_amplifier_gets_its_balance_back():
    """R2 is to R1 as R4 is to R3; nothing was to be seen of its common mode before."""
    before = reviewed(
        "VA a 0 SIN(2.5 0.25 40)\nVB b 0 SIN(2.5 0.25 33)\nR1 a n 10k\nR2 n out 375k\n"
        "R3 b p 10k\nR4 p ref 20k\nXU1 p n vp 0 out MCP6002"
    )
    found, after = answer(before)
    assert found.what == "R2 = 20 kΩ instead of 375 kΩ."
    assert {f.rule for f in found.uncovered} <= {"feedback-matching"}
    assert after.design.stages[0].balance.gain == pytest.approx(2.0)


def test_a_divider_before_a_plain_amplifier_is_no_fellow_of_its_feedback():
    """A ground leg, and a signal divided before the input: four resistors, but no difference."""
    before = reviewed(
        "VA a 0 SIN(1 0.9 40)\nR1 0 n 10k\nR2 n out 100k\nR3 a p 10k\nR4 p 0 10k\n"
        "XU1 p n vp 0 out MCP6002"
    )
    found, _ = answer(before)
    assert "instead of 100 kΩ" in found.what
    assert "is to" not in found.choice


def test_a_reference_that_takes_the_level_out_of_range_is_what_changes():
    """1 + R2 / R1 = 5: the output rests at 5 x 2 V - 4 x 4.9 V, far below ground."""
    before = reviewed(
        "V1 high 0 4.9\nVIN in 0 SIN(2 0.1 10)\nR1 high n 10k\nR2 n out 40k\n"
        "XU1 in n vp 0 out MCP6002"
    )
    found, after = answer(before)
    assert found.what.startswith("V1 = 1.9 V instead of 4.9 V")
    assert after.design.stages[0].output.level == pytest.approx(5 * 2 - 4 * 1.9, rel=1e-3)
    (_, kept), *_ = after.design.stages[0].gain
    assert kept == pytest.approx(5.0, rel=1e-3)


@pytest.mark.parametrize(
    ("cards", "entry"),
    [
        (
            "VIN in 0 SIN(2.5 4 10)\nR1 in a 11.3k\nR2 a p 11.3k\nC3 a out 200n\nC4 p 0 100n\n"
            "XU1 p out vp 0 out MCP6002",
            "R1",
        ),
        (
            "VIN in 0 SIN(0 4 10)\nC3 in a 1u\nC4 a p 1u\nR1 a out 110k\nR2 p ref 220k\n"
            "XU1 p out vp 0 out MCP6002",
            "C3",
        ),
    ],
)
def test_a_signal_is_divided_where_it_enters_a_filter(cards, entry):
    """Two elements that together are the one that was there: corner and quality stay."""
    before = reviewed(cards)
    found, after = answer(before)
    assert found.what.startswith(f"{entry} = ")
    was, now = before.design.stages[0], after.design.stages[0]
    assert now.loop.crossover == pytest.approx(was.loop.crossover, rel=0.02)
    old = {e.designator: e.value for e in before.design.circuit.elements}
    values = {e.designator: e.value for e in after.design.circuit.elements}
    (new,) = [values[name] for name in values if name not in old]
    if entry[0] == "R":
        together = values[entry] * new / (values[entry] + new)
        assert together == pytest.approx(old[entry], rel=0.03)
    else:
        assert values[entry] + new == pytest.approx(old[entry], rel=0.2)  # a series of 10 %
    assert was.output.demand.high - was.output.level > 3.5
    assert now.output.demand.high - now.output.level < 2.5


def test_the_gain_that_sets_a_filter_s_quality_is_left_alone():
    """Equal capacitors: Q = 1 / (3 - K), so a smaller gain would be another filter."""
    before = reviewed(
        "VIN in 0 SIN(2.5 3 10)\nR1 in a 15.8k\nR2 a p 15.8k\nC3 a out 100n\nC4 p 0 100n\n"
        "R3 ref n 10k\nR4 n out 5.9k\nXU1 p n vp 0 out MCP6002"
    )
    found, after = answer(before)
    assert found.what.startswith("R1 = ")
    assert found.what.endswith(" from a to ref.")
    values = {e.designator: e.value for e in after.design.circuit.elements}
    assert (values["R3"], values["R4"]) == (10e3, 5.9e3)


def test_no_resistor_becomes_a_wire():
    """A gain of one is no value of R2: what is proposed for it is a resistor that can be bought."""
    before = reviewed(
        "VIN in 0 SIN(2.5 0.5 40)\nR1 ref n 10k\nR2 n out 10k\nXU1 in n vp 0 out MCP6002\n"
        "* railguard: load out 100k max-volts=1.75"
    )
    finding = next(f for f in before.findings if f.rule == "headroom-load")
    scene = Scene(before.design, of_review(before))
    values = [e.text for c in gain.fitted(finding, scene) for e in c.edits]
    assert values
    assert not [text for text in values if "u" in text.casefold() or "m" in text.casefold()]


def test_a_follower_in_a_filter_has_no_gain_to_lower():
    """The words say what can be done: less of the signal."""
    before = reviewed(
        "VIN in 0 SIN(2.5 4 10)\nR1 in a 11.3k\nR2 a p 11.3k\nC3 a out 200n\nC4 p 0 100n\n"
        "XU1 p out vp 0 out MCP6002"
    )
    (found,) = [f for f in before.findings if f.rule == "headroom-output"]
    assert found.remedy.startswith("Attenuate its signal to at most ")


def test_a_signal_from_zero_to_beyond_the_rail_is_divided():
    """No gain brings zero up from the rail, so that end is left out; a tenth of a volt is minor."""
    before = reviewed(
        "* railguard: signal SENS low=0 high=10 to=10\nJ1 SENS 0 CONN2\nR1 SENS p 100\n"
        "XU1 p out vp 0 out MCP6021"
    )
    found = redline(before)
    eased = next(p for p in found.proposals if p.finding.rule == "headroom-output")
    assert eased.what.startswith("Divide the input of U1 by ")
    assert {f.severity for f in eased.left} == {"minor"}
    assert not found.held


def test_an_input_before_a_gain_gets_a_level_that_the_output_can_show():
    """Twice 1.25 V are the middle of 5 V; twice the middle itself would be the rail."""
    before = reviewed(
        "VIN in 0 SIN(0 0.5 100)\nC3 in p 1u\nR2 n 0 10k\nR3 n out 10k\nXU1 p n vp 0 out MCP6001"
    )
    found, after = answer(before, "bias-no-dc-path")
    assert "a level of 1.2" in found.what
    assert after.design.stages[0].output.level == pytest.approx(2.5, abs=0.1)


def test_no_reference_is_asked_for_beyond_the_rails():
    """A pump into a load on a single supply: -1.4 V is no level that 5 V make."""
    before = reviewed(
        "V1 low 0 2.5\nR1 low n 10k\nR2 n out 10k\nR3 0 p 10k\nR4 p out 10k\nR5 p 0 1k\n"
        "XU1 p n vp 0 out MCP6002"
    )
    assert "headroom-output" in {f.rule for f in before.findings}
    assert not [p for p in proposals(before) if "V1 = -" in p.what]
