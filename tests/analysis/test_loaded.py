"""What a stated load gets behind resistors, by hand."""

import math

import numpy as np
import pytest

from railguard.reviewing import review

TITLE = "level amplifier and converter of the river gauge\n"
RAILS = "VP vp 0 12\nC1 vp 0 100n\nC2 vp 0 10u\n"
GAIN = "VIN in 0 SIN(2 1.5 {hertz})\nR1 0 n 10k\nR2 n out 20k\nXU1 in n vp 0 out OPA197\n"
LIMIT = "* railguard: load adc 1meg max-volts=3.3\n"


def reviewed(cards, hertz=10, limit=LIMIT):
    """Review an amplifier of gain three, 1.5 V to 10.5 V, with cards behind its output."""
    text = TITLE + RAILS + GAIN.format(hertz=hertz) + cards + "\n" + limit
    return review(text, plugins=False).designs[0]


def ends(design):
    """Return low, high and drivers of the one load."""
    (load,) = design.design.loads
    return load.volts.low, load.volts.high, load.drivers


def test_a_divider():
    """10 kohm over 10 kohm and a megohm beside it: 1 / 2.01."""
    low, high, drivers = ends(reviewed("R3 out adc 10k\nR4 adc 0 10k"))
    assert (low, high) == (
        pytest.approx(1.5 / 2.01, rel=1e-3),
        pytest.approx(10.5 / 2.01, rel=1e-3),
    )
    assert drivers == ("XU1",)


def test_a_filter_keeps_the_level_and_takes_the_swing():
    """1 kohm and 1 uF cut at 159 Hz: at 1.59 kHz a tenth of the 4.5 V is left round 6 V."""
    hertz = 10 / (2 * math.pi * 1e-3)
    low, high, _ = ends(reviewed("R3 out adc 1k\nC3 adc 0 1u", hertz))
    swing = 4.5 / math.sqrt(1 + 10**2)
    assert high == pytest.approx(6 + swing, abs=0.02)
    assert low == pytest.approx(6 - swing, abs=0.02)


def test_an_output_at_its_limit_gives_no_more():
    """Asked for 18 V on a rail of 12 V: what it reaches is what the load gets."""
    found = reviewed("R3 out adc 1\nR5 n 0 10k")
    (stage,) = found.design.stages
    _, high, _ = ends(found)
    assert stage.output.demand.high > 15
    assert high == pytest.approx(stage.output.available.high, abs=0.02)


def test_two_outputs_over_resistors():
    """Both are named, and half of each arrives."""
    cards = "XU2 out out2 vp 0 out2 OPA197\nR3 out adc 10k\nR4 out2 adc 10k"
    low, high, drivers = ends(reviewed(cards))
    assert drivers == ("XU1", "XU2")
    assert (low, high) == (pytest.approx(1.5, rel=0.01), pytest.approx(10.5, rel=0.01))
    found = reviewed(cards)
    (told,) = [f for f in found.findings if f.rule == "headroom-load"]
    assert "U1 and U2 drive it to 10.4 V" in told.message


@pytest.mark.parametrize(
    ("cards", "judged"),
    [
        ("R3 out adc 10k\nR4 adc 0 3.3k", True),
        ("R3 out adc 10k", True),
        ("R3 out adc 10k\nJ1 adc 0 CONN2", True),
        ("R3 out adc 10k\nD1 adc 0 DZ\n.model DZ D(BV=3.3)", False),
        ("C3 out adc 1u\nR4 adc 0 10k", True),
        ("R3 elsewhere adc 10k\nR4 elsewhere 0 10k", False),
        ("R3 elsewhere adc 10k\nR4 elsewhere 0 10k\nJ1 adc out CONN2", False),
        ("R3 out m 5k\nR5 m adc 5k\nR4 adc 0 3.3k", True),
        ("R3 out adc 10k\nR4 adc 0 10k\nRX n x 10k\nCX x ext 1u\nJX ext 0 CONN2", False),
    ],
)
def test_what_can_be_judged(cards, judged):
    """A clamp at the net bends the way, and a net no output reaches is none of theirs."""
    found = reviewed(cards)
    left = [n for n in found.not_checked if n.rule == "headroom-load"]
    assert bool(found.design.loads) == judged
    assert bool(left) != judged


def test_a_load_on_a_net_nobody_has_hides_no_other():
    """It is left open by itself."""
    cards = "R3 out adc 10k\nR4 adc 0 10k"
    found = reviewed(cards, limit="* railguard: load ghost 1meg max-volts=3.3\n" + LIMIT)
    assert [load.net for load in found.design.loads] == ["adc"]
    assert [n.why for n in found.not_checked if n.rule == "headroom-load"] == [
        "the voltage on net ghost was not worked out"
    ]


def test_two_signals_meet_within_their_period():
    """Out = 5 (1 + 0.2 sin x) - 2 (0.2 sin 2 x), and the divider's 1 / 2.01 of it."""
    cards = "VB b 0 SIN(0 0.2 20)\nR5 b n 10k\nR3 out adc 10k\nR4 adc 0 10k\n"
    text = (TITLE + RAILS + GAIN + cards + LIMIT).replace("SIN(2 1.5 {hertz})", "SIN(1 0.2 10)")
    low, high, _ = ends(review(text, plugins=False).designs[0])
    x = np.linspace(0, 2 * np.pi, 2000)
    out = (5 * (1 + 0.2 * np.sin(x)) - 0.4 * np.sin(2 * x)) / 2.01
    assert high == pytest.approx(out.max(), rel=2e-3)
    assert low == pytest.approx(out.min(), rel=2e-3)


def test_a_load_on_the_output_itself_and_one_without_limit_are_no_such():
    """The first is judged by the output, the second not at all."""
    straight = reviewed("R3 out 0 10k", limit="* railguard: load out 1meg max-volts=3.3\n")
    assert straight.design.loads == ()
    assert [f.rule for f in straight.findings if f.rule == "headroom-load"] == ["headroom-load"]
    assert reviewed("R3 out adc 10k", limit="* railguard: load adc 1meg\n").design.loads == ()


def test_a_load_that_gets_too_much_is_critical_and_gets_a_divider():
    """10.5 V over 1 kohm into an input that stands 3.3 V."""
    (told,) = [f for f in reviewed("R3 out adc 1k").findings if f.rule == "headroom-load"]
    assert told.severity == "critical"
    assert (told.demand, told.limit) == (pytest.approx(10.49, abs=0.01), 3.3)
    assert told.designators == ("XU1",)


def test_an_output_without_a_listed_typical_swing_ends_at_its_rail():
    """A sensor of 10 V at a follower on 5 V: the converter gets no more than the supply."""
    text = (
        f"{TITLE}V5 v5 0 5\nC1 v5 0 100n\nVIN in 0 SIN(5 5 10)\nR1 in p 100k\n"
        "XU1 p out v5 0 out MCP6021\nR2 out adc 100\n* railguard: load adc 1meg max-volts=5.3\n"
    )
    found = review(text, plugins=False).designs[0]
    (stage,) = found.design.stages
    assert stage.output.available.high is None
    assert stage.output.demand.high == pytest.approx(10, rel=1e-4)
    _, high, _ = ends(found)
    assert high == pytest.approx(5.0, rel=1e-3)
    assert "headroom-load" not in {f.rule for f in found.findings}
