"""Feedback networks too small for the output, or too large for the input."""

import math

import pytest

from railguard.analysis.bound import Pair, Range
from railguard.analysis.loop import Feedback, Loop
from railguard.analysis.stage import Current, Output
from railguard.rules.feedback.size import HIGH, LOW
from tests.rules.stages import (
    FAMILY,
    amps,
    changed,
    design,
    figure,
    findings,
    inputs,
    open_points,
    outcomes,
    pin,
    resistor,
    stage,
    unknown_device,
)


def taking(network_current, **fields):
    """Make a stage whose feedback network takes a current of its output's 5 mA."""
    return stage(feedback=changed(stage().feedback, current=network_current), **fields)


def test_a_light_network_is_quiet():
    """Half of what the output is known to give may go into its feedback."""
    assert outcomes(LOW, taking(0.45e-3)) == []
    assert outcomes(LOW, taking(2.5e-3)) == []


@pytest.mark.parametrize(
    ("current", "severity"), [(2.6e-3, "minor"), (6e-3, "major"), (12e-3, "critical")]
)
def test_a_heavy_network(current, severity):
    """Beyond half minor, beyond what is known major, beyond typical critical."""
    (found,) = findings(LOW, taking(current))
    assert (found.severity, found.demand) == (severity, current)


def test_the_remedy_keeps_the_gain():
    """All resistors of the network are scaled by the same decade, each by name."""
    one = taking(12e-3)
    small = (resistor("R1", 100.0, "n", "0"), resistor("R2", 1e3, "out", "n"))
    (found,) = findings(LOW, one, design(one, elements=small))
    assert found.remedy == (
        "Multiply by 10 the feedback network, which keeps the gain: R1 = 1 kΩ and R2 = 10 kΩ."
    )


def test_without_a_signal_the_full_swing_is_assumed():
    """Where no current is known the rails' swing over the network stands in: minor at most."""
    network = changed(stage().feedback, current=None, load=100.0)
    (found,) = findings(LOW, stage(feedback=network))
    assert found.severity == "minor"
    assert "at full swing" in found.message
    assert "assumed" in found.basis


def test_low_is_silent_for_wires_and_broken_loops():
    """A follower's wire takes no current; a broken loop has no demand."""
    assert outcomes(LOW, stage(feedback=Feedback(resistance=0.0))) == []
    assert outcomes(LOW, taking(1.0, loop=Loop(dc="positive"))) == []
    assert outcomes(LOW, taking(1.0, use="comparator")) == []


def test_low_for_an_unknown_device_is_minor_and_listed():
    """Common practice's few milliamperes make minor findings."""
    practice = {"typical_basis": "practice", "guaranteed_basis": "practice"}
    current = Current(source=amps(**practice), sink=amps(**practice))
    one = unknown_device(current=current, feedback=changed(stage().feedback, current=0.1))
    assert [f.severity for f in findings(LOW, one)] == ["minor"]
    assert len(open_points(LOW, one)) == 1


def test_low_without_current_figures_or_network_is_listed():
    """What is not known is listed, not judged."""
    bare = amps(typical=None, guaranteed=None)
    (point,) = open_points(LOW, taking(1e-3, current=Current(source=bare, sink=bare)))
    assert "output current of TL072" in point.why
    unsolved = changed(stage().feedback, current=None, load=None)
    assert len(open_points(LOW, stage(feedback=unsolved))) == 1


BIPOLAR = changed(
    FAMILY,
    technology="bipolar",
    bias_current=figure(guaranteed=1e-6),
    offset_voltage=figure(guaranteed=1e-3),
    voltage_noise=figure(),
)


def seeing(ohms, family=BIPOLAR, capacitance=0.0, topology="inverting", **loop):
    """Make an inverting stage with a gain of one and some resistance at its inverting input."""
    usual = {"dc": "negative", "noise_gain_dc": 2.0, "crossover": None}
    return stage(
        family=family,
        topology=topology,
        output=Output(net="out", demand=Range(-5.0, 5.0)),
        inputs=inputs(plus=pin("0", resistance=0.0), minus=pin("n", resistance=ohms)),
        loop=Loop(**{**usual, **loop}),
        feedback=Feedback(
            elements=("R2",), resistance=2 * ohms, seen=ohms, capacitance=capacitance
        ),
    )


@pytest.mark.parametrize(
    ("ohms", "severity"),
    [(10e3, None), (50e3, None), (51e3, "minor"), (1e6, "critical")],
)
def test_bias_current_through_the_network(ohms, severity):
    """One microampere times 50 kΩ times two is 1 % of 10 V."""
    assert [f.severity for f in findings(HIGH, seeing(ohms))] == ([severity] if severity else [])


def test_bias_says_its_numbers_and_scales_the_network():
    """The error, its share, and values to fit at the same gain stand in the finding."""
    one = seeing(1e6)
    network = (resistor("R1", 2e6, "in", "n"), resistor("R2", 2e6, "out", "n"))
    (found,) = findings(HIGH, one, design(one, elements=network))
    assert "a bias current of 1 µA (guaranteed) moves the output by 2 V, 20 % of its span" in (
        found.message
    )
    assert "Divide by 100 the feedback network" in found.remedy
    assert "R1 = 20 kΩ and R2 = 20 kΩ" in found.remedy
    assert (found.unit, found.demand) == ("Ω", 1e6)
    assert found.limit == pytest.approx(50e3)


def test_ohms_alone_are_no_fault():
    """A hundred megohms are sound with a femtoampere, no noise figure and no known speed."""
    quiet = changed(BIPOLAR, bias_current=figure(guaranteed=1e-15))
    assert findings(HIGH, seeing(100e6, quiet)) == []


POLE = changed(BIPOLAR, bias_current=figure(), input_capacitance=figure(10e-12))


def at_ratio(ratio, family=POLE, **fields):
    """Make a stage whose loop closes at a multiple of its input pole (318 kHz)."""
    return seeing(50e3, family, crossover=ratio / (2 * math.pi * 50e3 * 10e-12), **fields)


@pytest.mark.parametrize(
    ("ratio", "severity"), [(0.5, None), (0.99, None), (1.01, "minor"), (11.0, "major")]
)
def test_the_pole_with_input_capacitance(ratio, severity):
    """Below the crossover it is told, far below it like a guaranteed limit."""
    assert [f.severity for f in findings(HIGH, at_ratio(ratio))] == ([severity] if severity else [])


def test_a_known_phase_margin_decides():
    """Where the margin is known to be enough the pole is harmless."""
    assert findings(HIGH, at_ratio(5.0, phase_margin=60.0)) == []
    assert len(findings(HIGH, at_ratio(5.0, phase_margin=30.0))) == 1


def test_a_capacitor_across_the_feedback_undoes_the_pole():
    """Neutral compensation, Cin * RG / RF, is enough; a tenth of it is not."""
    assert findings(HIGH, at_ratio(5.0, capacitance=10e-12)) == []
    assert len(findings(HIGH, at_ratio(5.0, capacitance=0.1e-12))) == 1


def test_the_pole_proposes_a_capacitor():
    """The remedy names what to fit across which resistor."""
    (found,) = findings(HIGH, at_ratio(5.0))
    assert "F across R2" in found.remedy


def test_an_unlisted_input_capacitance_is_assumed_and_weighs_less():
    """Ten picofarads by common practice make a remark of a minor finding."""
    vague = changed(POLE, input_capacitance=figure())
    assert [f.severity for f in findings(HIGH, at_ratio(5.0, vague))] == ["remark"]
    assert [f.severity for f in findings(HIGH, at_ratio(11.0, vague))] == ["minor"]


NOISY = changed(BIPOLAR, bias_current=figure(), voltage_noise=figure(4e-9))


def test_noise_of_the_network_is_a_remark():
    """Thermal noise beyond five times the device's own wastes a quiet device."""
    assert findings(HIGH, seeing(24e3, NOISY)) == []
    (found,) = findings(HIGH, seeing(25e3, NOISY))
    assert found.severity == "remark"
    assert "nV/√Hz" in found.message


def test_noise_of_a_transimpedance_stage_is_its_signal():
    """There the large resistor is the point."""
    assert findings(HIGH, seeing(1e6, NOISY, topology="transimpedance")) == []


def test_high_is_silent_for_followers_and_lists_what_is_unknown():
    """A wire has no resistance; an unsolved network and an unknown device are listed."""
    assert outcomes(HIGH, stage(feedback=Feedback(resistance=0.0, seen=0.0))) == []
    unsolved = stage(feedback=Feedback(elements=("R2",), resistance=1e4))
    assert len(open_points(HIGH, unsolved)) == 1
    assert findings(HIGH, unknown_device()) == []
    assert len(open_points(HIGH, unknown_device())) == 1


def test_high_is_silent_where_a_source_holds_the_input():
    """Feedback to an input that a source holds has no resistance there, and so no pole."""
    held = Feedback(elements=("C2",), seen=0.0)
    loop = changed(stage().loop, crossover=1e6, phase_margin=20.0)
    assert outcomes(HIGH, stage(feedback=held, loop=loop)) == []


def test_a_corner_of_the_whole_current_is_not_the_network_s():
    """What the load does at a corner is drive-current's matter."""
    source = amps(1e-3, stated=Pair(9e-3, 5e-3), default=Pair(9e-3, 5e-3))
    assert outcomes(LOW, taking(0.45e-3, current=Current(source=source, sink=amps()))) == []


def test_a_share_of_what_is_taken_by_practice_is_a_remark():
    """As the row of used-up reserve has it for an assumed figure."""
    practice = {"typical_basis": "practice", "guaranteed_basis": "practice"}
    current = Current(source=amps(**practice), sink=amps(**practice))
    (found,) = findings(LOW, taking(2.6e-3, current=current))
    assert (found.severity, found.basis) == ("remark", ("netlist", "practice"))


@pytest.mark.parametrize(("load", "words"), [(11e3, " (11 kΩ)"), (0.0, ""), (None, "")])
def test_what_the_network_is_to_the_output_is_said_where_it_is_known(load, words):
    """In ohms, behind its name."""
    network = changed(stage().feedback, current=2.6e-3, load=load)
    (found,) = findings(LOW, stage(feedback=network))
    assert found.message == (
        f"U1's own feedback network{words} takes 2.6 mA, 52 % of the 5 mA a TL072 gives (data "
        "sheet), before anything reaches the load."
    )
    assert found.margin == pytest.approx(2.4e-3)


def test_a_solved_network_leaves_nothing_open():
    """Neither its current nor what its inverting input sees."""
    assert open_points(HIGH, seeing(10e3)) == []
    assert open_points(LOW, stage()) == []


@pytest.mark.parametrize(
    ("offset", "gain", "severities"),
    [
        (None, 2.0, ["minor"]),  # 1.2 uA x 100 kohm x 2 is 240 mV, 1 % of 10 V is 100 mV
        (100e-3, 2.0, ["minor"]),
        (121e-3, 2.0, []),  # no more than the offset voltage does
    ],
)
def test_bias_that_does_no_more_than_the_offset_is_no_matter(offset, gain, severities):
    """Both come out times the noise gain."""
    family = changed(
        BIPOLAR, bias_current=figure(guaranteed=1.2e-6), offset_voltage=figure(guaranteed=offset)
    )
    one = seeing(100e3, family, noise_gain_dc=gain)
    assert [f.severity for f in findings(HIGH, one)] == severities


@pytest.mark.parametrize(
    ("margin", "margins", "count"),
    [
        (45.0, Range(), 0),
        (44.0, Range(), 1),
        (None, Range(45.0, 80.0), 0),  # enough at the least
        (None, Range(30.0, 80.0), 1),
        (None, Range(), 1),
    ],
)
def test_a_margin_that_is_sure_to_be_enough(margin, margins, count):
    """From 45 degrees on the pole is harmless, whatever it is; the rule's limit can be moved."""
    one = at_ratio(5.0, phase_margin=margin, margins=margins)
    assert len(findings(HIGH, one)) == count
    assert len(findings(HIGH, one, phase_margin=0.5)) == (margin is None and margins.low is None)


@pytest.mark.parametrize(
    ("guaranteed", "basis", "severity"), [(10e-12, "memory", "minor"), (None, "practice", "remark")]
)
def test_the_pole_is_as_well_known_as_the_input_capacitance(guaranteed, basis, severity):
    """The guaranteed figure's basis where there is one."""
    listed = figure(10e-12, guaranteed, typical_basis="practice", guaranteed_basis="memory")
    (found,) = findings(HIGH, at_ratio(5.0, changed(POLE, input_capacitance=listed)))
    assert (found.severity, found.basis) == (severity, ("netlist", basis))


@pytest.mark.parametrize(("farads", "count"), [(9.9e-12, 1), (10e-12, 0)])
def test_neutral_compensation_is_enough_and_a_little_less_is_not(farads, count):
    """Cin x RG / RF with RG = RF: 10 pF; where the gain-bandwidth product is not listed."""
    slow = changed(POLE, gain_bandwidth=figure())
    assert len(findings(HIGH, at_ratio(5.0, slow, capacitance=farads))) == count


def test_a_network_without_a_single_resistor_back_is_not_compensated():
    """A T of resistors has no one resistance to set its capacitor against."""
    one = at_ratio(5.0, capacitance=1e-9)
    tee = changed(one, feedback=changed(one.feedback, resistance=None))
    (found,) = findings(HIGH, tee)
    assert found.remedy == (
        "Divide by 10 the feedback network, which keeps the gain: R1 = 100 Ω and R2 = 1 kΩ."
    )


def test_the_capacitor_that_leaves_65_degrees_is_enough_as_well():
    """2.30 pF, less than the 10 pF that undo the pole."""
    assert findings(HIGH, at_ratio(5.0, capacitance=2.4e-12)) == []
    assert len(findings(HIGH, at_ratio(5.0, capacitance=2.2e-12))) == 1


def test_an_equal_resistance_at_the_other_input_takes_the_bias_current_away():
    """Of 1 megohm against 0.96 megohm 40 kilohm count, of which 50 do no harm."""
    for ohms, count in ((1e6, 0), (0.96e6, 0), (0.94e6, 1)):
        both = inputs(plus=pin("p", resistance=ohms), minus=pin("n", resistance=1e6))
        assert len(findings(HIGH, changed(seeing(1e6), inputs=both))) == count


@pytest.mark.parametrize("missing", ["typical", "guaranteed"])
def test_one_figure_of_an_output_is_enough_for_its_network(missing):
    """Twice either of them is too much."""
    side = amps(**{missing: None})
    (found,) = findings(LOW, taking(20e-3, current=Current(source=side, sink=side)))
    assert found.limit == (10e-3 if missing == "guaranteed" else 5e-3)


@pytest.mark.parametrize(
    ("farads", "fitting"),
    [(10e-12, "2.4 pF"), (10.5e-12, "2.4 pF"), (12e-12, "2.7 pF"), (0.1e-12, "1 pF")],
)
def test_the_capacitor_proposed_is_the_next_one_up(farads, fitting):
    """sqrt(10 pF / (2 pi 100 kohm 3 MHz)) is 2.30 pF; none below a picofarad is fitted."""
    family = changed(POLE, input_capacitance=figure(farads))
    one = seeing(50e3, family, crossover=5 / (2 * math.pi * 50e3 * farads))
    (found,) = findings(HIGH, one)
    assert found.remedy.endswith(f"fit {fitting} across R2.")


def test_noise_says_by_how_much_and_what_would_do():
    """Of 4kTR at 300 K: 25 kohm make 20.35 nV; 24.1 kohm are five times 4 nV."""
    (found,) = findings(HIGH, seeing(25e3, NOISY))
    assert "its thermal noise of 20.4 nV/√Hz is 5.09 times the device's own 4 nV/√Hz" in (
        found.message
    )
    assert found.limit == pytest.approx(24.14e3, rel=1e-3)
    assert found.basis == ("netlist", "catalogue")
