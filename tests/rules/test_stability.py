"""Noise gain, phase margin, capacitive load, transimpedance stages."""

import pytest

from railguard.analysis.bound import Range
from railguard.analysis.loop import Feedback, Loop
from railguard.analysis.stage import Current, Unknown
from railguard.reviewing import review
from railguard.rules.feedback.size import HIGH
from railguard.rules.stability.load import LOAD_CAPACITANCE, TRANSIMPEDANCE
from railguard.rules.stability.logarithmic import amplifying
from railguard.rules.stability.margin import PHASE_MARGIN
from railguard.rules.stability.noise_gain import NOISE_GAIN
from tests.rules.stages import (
    FAMILY,
    changed,
    figure,
    findings,
    open_points,
    outcomes,
    stage,
)

DECOMPENSATED = changed(FAMILY, stable_gain=figure(5.0))


def closing_at(gain, family=DECOMPENSATED, **fields):
    """Make a stage whose loop closes with some noise gain."""
    loop = Loop(dc="negative", crossover=1e6, noise_gain_crossover=gain)
    return stage(family=family, loop=loop, **fields)


@pytest.mark.parametrize(
    ("gain", "severity"), [(11.0, None), (4.8, None), (4.7, "critical"), (1.0, "critical")]
)
def test_noise_gain_where_the_loop_closes(gain, severity):
    """Five are needed, with a twentieth for the coarseness of the figure."""
    assert [f.severity for f in findings(NOISE_GAIN, closing_at(gain))] == (
        [severity] if severity else []
    )


def test_a_gain_from_memory_weighs_less():
    """A figure from memory is major."""
    vague = changed(FAMILY, stable_gain=figure(5.0, typical_basis="memory"))
    assert [f.severity for f in findings(NOISE_GAIN, closing_at(1.0, vague))] == ["major"]


def test_noise_gain_names_the_capacitor_and_a_cure():
    """The capacitor across the feedback is what brings it down; a resistor brings it up."""
    network = Feedback(elements=("R2",), resistance=10e3, capacitance=100e-12)
    (found,) = findings(NOISE_GAIN, closing_at(1.0, feedback=network))
    assert "The 100 pF across the feedback bring it down there." in found.message
    assert "2.4 kΩ or less" in found.remedy
    tee = changed(network, resistance=None)
    (found,) = findings(NOISE_GAIN, closing_at(1.0, feedback=tee))
    assert found.remedy.endswith("between the inputs, small against the feedback resistor.")


def test_a_gain_bandwidth_product_nobody_lists_says_what_to_add():
    """Without it nobody knows where the loop closes."""
    slow = changed(DECOMPENSATED, gain_bandwidth=figure())
    (point,) = open_points(NOISE_GAIN, closing_at(None, slow))
    assert point.why == "the gain-bandwidth product of TL072 is not in the catalogue"
    assert point.add == "add gain_bandwidth to a [[devices]] table of railguard.toml"


def test_a_unity_gain_stable_device_is_quiet():
    """One is enough for most."""
    assert outcomes(NOISE_GAIN, closing_at(1.0, FAMILY)) == []


def test_noise_gain_of_what_is_not_known_is_listed():
    """An unlisted least gain, an unknown crossover or device are not checked."""
    bare = changed(FAMILY, stable_gain=figure())
    assert "stable_gain" in open_points(NOISE_GAIN, closing_at(1.0, bare))[0].add
    slow = changed(FAMILY, gain_bandwidth=figure())
    assert "gain_bandwidth" in open_points(NOISE_GAIN, closing_at(None, slow))[0].add
    assert len(open_points(NOISE_GAIN, closing_at(1.0, None))) == 1
    assert outcomes(NOISE_GAIN, closing_at(1.0, use="comparator")) == []


def with_margin(degrees, **fields):
    """Make a stage with some phase margin."""
    loop = Loop(dc="negative", crossover=1e6, phase_margin=degrees)
    return stage(**{"loop": loop, **fields})


@pytest.mark.parametrize(
    ("degrees", "severity"),
    [(60.0, None), (45.0, None), (44.0, "minor"), (19.0, "major"), (-5.0, "critical")],
)
def test_phase_margin(degrees, severity):
    """Forty-five degrees are wanted; below twenty it rings long, below none it oscillates."""
    assert [f.severity for f in findings(PHASE_MARGIN, with_margin(degrees))] == (
        [severity] if severity else []
    )


@pytest.mark.parametrize(
    ("nominal", "low", "severity"),
    [
        (60.0, 40.0, None),  # the reserve is there for tolerances
        (60.0, 19.0, "minor"),
        (30.0, 10.0, "minor"),
        (30.0, 25.0, "minor"),
        (10.0, 5.0, "major"),
        (80.0, None, None),
    ],
)
def test_phase_margin_at_a_corner(nominal, low, severity):
    """Tolerances may use up what is wanted, but not go below the least."""
    loop = Loop(
        dc="negative", crossover=1e6, phase_margin=nominal, phase_margin_worst=Range(low, 90.0)
    )
    found = findings(PHASE_MARGIN, stage(loop=loop))
    assert [f.severity for f in found] == ([severity] if severity else [])
    at_corner = nominal >= 20.0 and low is not None and low < 20.0
    for one in found:
        assert one.corner == ("worst-case" if at_corner else "nominal")
        assert one.limit == (low if at_corner else nominal)
        assert ("at a corner of the tolerances" in one.message) == at_corner


@pytest.mark.parametrize("rule", [NOISE_GAIN, PHASE_MARGIN])
def test_a_loop_that_is_not_followed_blames_no_data_sheet(rule):
    """With its figures listed the device is not what is missing."""
    why = Unknown("it rests on the transistor Q1", "--engine ngspice")
    blind = stage(loop=Loop(dc="negative"), unknown={"output": why})
    assert [p.why for p in open_points(rule, blind)] == [why.why]
    (point,) = open_points(rule, stage(loop=Loop(dc="negative")))
    assert "catalogue" not in point.why
    assert "listed" not in point.why


def test_the_remedy_fits_the_cause():
    """A capacitive load wants a resistor, a large feedback resistor a capacitor."""
    load = Current(load_capacitance=10e-9)
    (loaded,) = findings(PHASE_MARGIN, with_margin(10.0, current=load))
    assert "Fit 47 Ω between the output of U1" in loaded.remedy
    (plain,) = findings(PHASE_MARGIN, with_margin(10.0))
    assert plain.remedy == "Fit 7.5 pF across R2."


@pytest.mark.parametrize(
    ("low", "high", "severities", "points"),
    [(50.0, 80.0, [], 0), (10.0, 40.0, ["minor"], 0), (30.0, 60.0, [], 1)],
)
def test_bounds_may_settle_what_is_not_listed(low, high, severities, points):
    """Enough at the worst is sound, too little at the best is not, between is not checked."""
    one = stage(loop=Loop(dc="negative", crossover=1e6, margins=Range(low, high)))
    assert [f.severity for f in findings(PHASE_MARGIN, one)] == severities
    assert len(open_points(PHASE_MARGIN, one)) == points


def test_an_unknown_margin_is_listed():
    """Where something that matters is not listed the margin is not checked."""
    (point,) = open_points(PHASE_MARGIN, with_margin(None))
    assert "output_resistance" in point.add
    assert outcomes(PHASE_MARGIN, with_margin(5.0, use="oscillator")) == []


def charging(farads, family=FAMILY, gain=1.0, margin=None, **fields):
    """Make a stage with a capacitor at its output, its phase margin not known."""
    loop = Loop(dc="negative", noise_gain_crossover=gain, phase_margin=margin)
    return stage(family=family, loop=loop, current=Current(load_capacitance=farads), **fields)


@pytest.mark.parametrize(
    ("farads", "gain", "severity"),
    [(100e-12, 1.0, None), (101e-12, 1.0, "major"), (1e-9, 11.0, None), (0.0, 1.0, None)],
)
def test_capacitance_straight_at_the_output(farads, gain, severity):
    """What the device stands counts times the noise gain."""
    assert [f.severity for f in findings(LOAD_CAPACITANCE, charging(farads, gain=gain))] == (
        [severity] if severity else []
    )


@pytest.mark.parametrize("use", ["unused", "comparator"])
def test_the_load_of_what_no_loop_holds_is_no_matter(use):
    """A channel that is not used, and one that switches."""
    assert outcomes(LOAD_CAPACITANCE, charging(10e-9, use=use)) == []
    assert len(findings(LOAD_CAPACITANCE, charging(10e-9))) == 1


@pytest.mark.parametrize(
    ("degrees", "ohms", "severities", "words"),
    [
        (46.0, 10.0, ["minor"], "is known to stand 100 pF (common practice)"),
        (44.0, 10.0, ["major"], "the least it may have, 10 Ω by common practice, its loop keeps"),
        (12.0, 2.6, ["major"], "2.6 Ω which emitters make at its supply current, its loop"),
        (44.0, None, ["minor"], "U1's loop closes at 1 MHz with a phase margin of 44°"),
    ],
)
def test_a_capacitor_rings_with_the_least_output_resistance(degrees, ohms, severities, words):
    """Below the margin wanted with the least resistance there can be; else what is usual counts."""
    bare = changed(FAMILY, load_capacitance=figure(), output_resistance=figure())
    loop = Loop(dc="negative", crossover=1e6, margins=Range(3.0, degrees), least_ohms=ohms)
    one = stage(family=bare, loop=loop, current=Current(load_capacitance=100e-9))
    found = [*findings(PHASE_MARGIN, one), *findings(LOAD_CAPACITANCE, one)]
    assert [f.severity for f in found] == severities
    assert words in found[0].message
    assert ("practice" in found[0].basis) == (ohms is not None)
    assert "Fit 47 Ω between the output of U1" in found[0].remedy


def test_an_unlisted_capacitance_is_common_practice():
    """A hundred picofarads by common practice make a minor finding."""
    bare = changed(FAMILY, load_capacitance=figure())
    assert [f.severity for f in findings(LOAD_CAPACITANCE, charging(1e-9, bare))] == ["minor"]


def test_a_known_phase_margin_is_judged_instead():
    """The margin has the load in it already; an unknown device is listed."""
    assert outcomes(LOAD_CAPACITANCE, charging(1e-6, margin=50.0)) == []
    assert len(open_points(LOAD_CAPACITANCE, charging(1e-9, None))) == 1


def converting(ohms, capacitance=0.0, margin=None, **fields):
    """Make a transimpedance stage."""
    return stage(
        topology="transimpedance",
        feedback=Feedback(elements=("RF",), resistance=ohms, capacitance=capacitance),
        loop=Loop(dc="negative", phase_margin=margin),
        **fields,
    )


def test_a_transimpedance_stage_wants_a_capacitor():
    """Without one it is minor, and the capacitor's value is given."""
    (found,) = findings(TRANSIMPEDANCE, converting(100e3))
    assert found.severity == "minor"
    assert found.remedy == "Fit 3.3 pF across RF."


def test_the_capacitance_of_the_source_counts():
    """1 nF at 1 Mohm and 3 MHz: sqrt(3e6 / 2 pi 1e6 1e-9) = 21.9 kHz, so 1 / (2 pi 1e6 21.9e3).

    That is 7.3 pF; the 10 pF of the input alone would ask for 0.7 pF.
    """
    one = converting(1e6)
    loop = Loop(dc="negative", crossover=21.9e3, phase_margin=0.5)
    (found,) = findings(PHASE_MARGIN, changed(one, loop=loop))
    assert found.remedy == "Fit 7.5 pF across RF."
    solved = changed(one.feedback, seen=1e6)
    assert outcomes(HIGH, changed(one, loop=loop, feedback=solved)) == []


def test_compensated_small_or_known_to_be_stable_stages_are_quiet():
    """With a capacitor, below 10 kΩ, or with a known margin nothing is said."""
    assert outcomes(TRANSIMPEDANCE, converting(100e3, 1e-12)) == []
    assert outcomes(TRANSIMPEDANCE, converting(9.9e3)) == []
    assert len(findings(TRANSIMPEDANCE, converting(10e3))) == 1
    assert outcomes(TRANSIMPEDANCE, converting(100e3, margin=50.0)) == []
    assert outcomes(TRANSIMPEDANCE, stage()) == []


def test_an_unknown_device_still_wants_a_capacitor():
    """Without figures no value is named."""
    (found,) = findings(TRANSIMPEDANCE, converting(100e3, family=None))
    assert found.remedy == "Fit a few picofarads across RF."


@pytest.mark.parametrize(
    ("degrees", "severity", "does"),
    [
        (44.0, "minor", "rings"),
        (20.0, "minor", "rings"),
        (19.0, "major", "rings long"),
        (0.0, "critical", "oscillates"),
        (-5.0, "critical", "oscillates"),
    ],
)
def test_what_a_phase_margin_does(degrees, severity, does):
    """From twenty degrees on it rings; at none it oscillates."""
    load = Current(load_capacitance=10e-9)
    (found,) = findings(PHASE_MARGIN, with_margin(degrees, current=load))
    assert found.severity == severity
    assert found.message == (
        f"U1's loop closes at 1 MHz with a phase margin of {degrees:g}° with 10 nF at its output, "
        f"so it {does}; 45° is wanted."
    )


def test_what_keeps_a_phase_margin_from_being_known():
    """The figures that make it."""
    (point,) = open_points(PHASE_MARGIN, with_margin(None))
    assert point.why == (
        "what a TL072 does to the phase here is not listed: gain-bandwidth product, output "
        "resistance or input capacitance"
    )


def test_the_resistor_between_the_inputs_is_the_next_one_down():
    """10 kilohm over 3.9 are 2.56: 2.7 would leave too little noise gain."""
    network = Feedback(elements=("R2",), resistance=10e3)
    (found,) = findings(NOISE_GAIN, closing_at(1.1, feedback=network))
    assert "2.4 kΩ or less" in found.remedy


LOGARITHM = """logarithm of the turbidity meter's current
VP vp 0 12
VN vn 0 -12
C1 vp 0 100n
C2 vn 0 100n
VIN in 0 SIN(2 1.9 10)
R1 in n 10k
{feedback}
C3 n {across} 47p
XU1 0 n vp vn out {device}
RL out 0 10k
.model QN NPN(BF=200 IS=1e-14)
"""
STRAIGHT = "Q1 n 0 out QN"


def logarithmic(feedback=STRAIGHT, device="OPA2134", across="out"):
    """Review a logarithmic amplifier."""
    text = LOGARITHM.format(feedback=feedback, device=device, across=across)
    return review(text, plugins=False).designs[0]


def test_a_transistor_that_amplifies_in_the_loop_wants_an_emitter_resistor():
    """3.3 / (2 pi 8 MHz 47 pF) = 1.4 kilohm: with it the loop closes at a noise gain of 0.96.

    Resistor and capacitor between the inputs would slow it at every current.
    """
    found = {f.rule: f for f in logarithmic().findings}
    told = found["stability-noise-gain"]
    assert told.message.endswith("Q1 in its feedback amplifies there.")
    for finding in (told, found["stability-phase-margin"]):
        assert finding.remedy == (
            "Fit 1.5 kΩ between the output of U1 and the emitter of Q1, and the 47 pF from the "
            "output itself to the inverting input."
        )
    there = logarithmic("Q1 n 0 e QN\nRE e out 100")
    assert there.findings[0].remedy.startswith("Fit 1.5 kΩ in place of RE (100 Ω), and the 47 pF")
    mended = logarithmic("Q1 n 0 e QN\nRE e out 1.5k")
    assert not [f for f in mended.findings if f.family == "stability"]
    assert mended.design.stages[0].loop.noise_gain_crossover == pytest.approx(0.96, abs=0.015)


def test_a_decompensated_device_is_none_for_a_logarithm():
    """No emitter resistor makes five of a gain of one."""
    (found,) = [f for f in logarithmic(device="OP37").findings if f.family == "stability"]
    assert found.remedy == "Fit a device stable at a gain of one."


@pytest.mark.parametrize("feedback", ["Q1 n n out QN", "R9 n out 10k\nQ1 vp 0 n QN"])
def test_a_transistor_that_divides_is_no_such_case(feedback):
    """One wired as a diode, and one that only stands near."""
    (stage_,) = logarithmic(feedback).design.stages
    assert amplifying(stage_, logarithmic(feedback).design) is None


@pytest.mark.parametrize("device", ["AD847", "LT1357", "LM8261"])
def test_a_device_made_for_any_load_is_taken_at_its_word(device):
    """No least output resistance is held against it."""
    text = (
        "buffer before a cable\nVP vp 0 12\nVN vn 0 -12\nC1 vp 0 100n\nC2 vn 0 100n\n"
        f"VIN in 0 SIN(0 1 1k)\nXU1 in out vp vn out {device}\nCL out 0 100n\nRL out 0 10k\n"
    )
    found = review(text, plugins=False).designs[0].findings
    assert not [f for f in found if f.family == "stability"]
