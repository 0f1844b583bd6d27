"""Output and input ranges against what rails and device allow."""

import pytest

from railguard.analysis.bound import Pair, Range
from railguard.analysis.loop import Loop
from railguard.analysis.stage import Output, Unknown
from railguard.rules.headroom.ranges import INPUT, OUTPUT
from tests.rules.stages import (
    bound,
    changed,
    design,
    findings,
    high,
    inputs,
    low,
    open_points,
    single,
    stage,
    unknown_device,
)


def asked(demand_high, demand_low=-5.0, **fields):
    """Make the usual stage with another output range."""
    span = None if demand_high is None else demand_high - demand_low
    return stage(
        output=Output(
            net="out",
            level=0.0,
            demand=Range(demand_low, demand_high),
            high=high(demand_high, span=span),
            low=low(demand_low, span=span),
        ),
        **fields,
    )


def test_an_output_inside_its_range_is_quiet():
    """Five volts where 9.5 V are guaranteed draw nothing."""
    assert findings(OUTPUT, stage()) == []


def test_an_output_beyond_typical_says_its_numbers():
    """Demand, limit and what is missing stand in the sentence and in the fields."""
    (found,) = findings(OUTPUT, asked(11.8, -11.0 + 1.0))
    assert found.severity == "major"
    assert (found.demand, found.limit, found.unit) == (11.8, 10.5, "V")
    assert found.margin == pytest.approx(-1.3)
    assert found.message.startswith(
        "U1 is asked for 11.8 V at its output; a TL072 on ±12 V reaches 10.5 V "
        "(typical, data sheet), so 1.3 V is missing."
    )
    assert found.source == "A maker, XYZ1, Dual JFET op-amp"
    assert found.designators == ("XU1",)
    assert found.location is not None


def test_both_ends_make_one_finding():
    """The worse end leads, the other is told behind it."""
    (found,) = findings(OUTPUT, asked(12.5, -11.0))
    assert "12.5 V at its output; its positive rail is at 12 V" in found.message
    assert "At the lower end -11 V is asked for and -10.5 V reached." in found.message


def test_exactly_at_the_guaranteed_limit_only_the_reserve_is_used():
    """At 9.5 V of 9.5 V nothing is broken, and nothing is left: minor."""
    (found,) = findings(OUTPUT, asked(9.5))
    assert found.severity == "minor"
    assert "so only 0 V is left" in found.message
    assert found.margin == pytest.approx(0.0)


def test_the_reserve_is_a_share_of_the_demanded_span():
    """One percent of 14.3 V is 143 mV: 9.3 V leave 200 mV, which is enough."""
    assert findings(OUTPUT, asked(9.3)) == []
    assert len(findings(OUTPUT, asked(9.3), reserve_share=0.05)) == 1


def test_between_guaranteed_and_typical_it_is_major():
    """A demand only the typical figure covers may fail within the device's spread."""
    (found,) = findings(OUTPUT, asked(10.4, -3.0))
    assert found.severity == "major"
    assert "is sure to reach 9.5 V (guaranteed, data sheet)" in found.message


def test_a_corner_names_the_tolerances_and_what_moves_it():
    """A finding at a corner says so, with the elements that move it most."""
    at_corner = changed(
        stage().output,
        high=high(9.0, default=Pair(9.9, 9.2), span=14.0, culprits=("R2", "R1")),
    )
    (found,) = findings(OUTPUT, stage(output=at_corner))
    assert (found.corner, found.severity) == ("worst-case", "minor")
    assert found.message.startswith(
        "At the worst corner of the default tolerances (R2 and R1 move it most) U1 is asked"
    )


def test_zero_scale_on_a_single_supply_is_minor():
    """A sensor at zero on a single supply loses millivolts, not its function."""
    output = Output(
        net="out",
        level=0.0,
        demand=Range(0.0, 4.0),
        high=bound(True, demand=4.0, level=0.0, span=4.0, typical=4.9, absolute=5.0),
        low=bound(False, demand=0.0, level=0.0, span=4.0, typical=0.02, absolute=0.0),
    )
    (found,) = findings(OUTPUT, stage(output=output, supply=single()))
    assert found.severity == "minor"


def test_an_ac_coupled_stage_resting_on_ground_is_no_zero_scale():
    """What takes its signal through a capacitor cannot follow it from the rail."""
    output = Output(
        net="out",
        level=0.0,
        high=bound(True, demand=0.0, level=0.0, typical=4.9, absolute=5.0),
        low=bound(False, demand=0.0, level=0.0, typical=0.02, absolute=0.0),
    )
    (found,) = findings(OUTPUT, stage(output=output, supply=single(), ac_coupled=True))
    assert found.severity == "critical"


def test_the_remedy_names_a_resistor_to_buy():
    """A non-inverting stage with one feedback resistor gets its new value, from E24."""
    one = asked(11.8)
    (found,) = findings(OUTPUT, one, design(one))
    assert "lower the gain from 11 to at most 8.86 (R2 = 7.5 kΩ instead of 10 kΩ)" in (
        found.remedy[0].lower() + found.remedy[1:]
    )
    assert "raise the positive rail to at least 14.5 V" in found.remedy


def test_no_rail_beyond_the_device_is_proposed():
    """A rail the device cannot be run on is no remedy."""
    narrow = changed(stage().family, supply_high=25.0)
    (found,) = findings(OUTPUT, asked(11.8, family=narrow))
    assert "raise the positive rail" not in found.remedy


def test_a_level_outside_is_moved_not_scaled():
    """Where the DC level is beyond the limit the remedy moves the level."""
    output = changed(stage().output, level=11.0, high=high(11.5, level=11.0, span=1.0))
    (found,) = findings(OUTPUT, stage(output=output))
    assert found.severity == "critical"
    assert "ove the output's level (11 V) below 10.5 V" in found.remedy


def test_there_is_always_a_remedy():
    """Where no gain, rail or device would do, the signal has to be moved."""
    output = Output(
        net="out",
        level=0.0,
        high=bound(True, demand=4.0, level=0.0, span=12.0, typical=4.9, absolute=5.0),
        low=bound(False, demand=-8.0, level=0.0, span=12.0, typical=0.02, absolute=0.0),
    )
    (found,) = findings(OUTPUT, stage(output=output, supply=single()))
    assert found.remedy == ("Attenuate or shift its signal so that the output stays above 0 V.")


def test_an_unknown_device_is_minor_and_not_checked():
    """Common practice judges what nobody knows, minor at most, and the stage stays open."""
    one = unknown_device(
        output=Output(
            net="out",
            high=high(11.9, typical_basis="practice", guaranteed_basis="practice"),
            low=low(-5.0),
        )
    )
    (found,) = findings(OUTPUT, one)
    assert found.severity == "minor"
    (point,) = open_points(OUTPUT, one)
    assert (point.subject, point.rule) == ("XU1", "headroom-output")
    assert "does not know MYAMP" in point.why


def test_no_device_comes_past_its_rail_known_or_not():
    """20 V on 12 V is no question of the device; its inputs may be made for more."""
    basis = {"typical_basis": "practice", "guaranteed_basis": "practice"}
    one = unknown_device(output=Output(net="out", high=high(20.0, **basis), low=low(-5.0)))
    assert [f.severity for f in findings(OUTPUT, one)] == ["major"]
    side = {"level": 0.0, "span": 40.0, **basis}
    wide = unknown_device(
        inputs=inputs(
            high=bound(True, demand=20.0, typical=11.0, absolute=12.0, **side),
            low=bound(False, demand=-1.0, typical=-11.0, absolute=-12.0, **side),
        )
    )
    assert [f.severity for f in findings(INPUT, wide)] == ["minor"]


@pytest.mark.parametrize(("coupled", "severity"), [(False, "minor"), (True, "major")])
def test_an_unknown_device_at_zero_scale(coupled, severity):
    """50 mV below the rail a sensor rests on are 1 % of 5 V: little, if it may rest there."""
    side = {"level": 0.0, "span": 0.0, "typical_basis": "practice", "guaranteed_basis": "practice"}
    output = Output(
        net="out",
        level=0.0,
        demand=Range(-0.05, -0.05),
        high=bound(True, demand=0.0, typical=4.0, guaranteed=3.0, absolute=5.0, **side),
        low=bound(False, demand=-0.05, typical=1.0, guaranteed=2.0, absolute=0.0, **side),
    )
    (found,) = findings(OUTPUT, unknown_device(output=output, supply=single(), ac_coupled=coupled))
    assert found.severity == severity
    assert "its negative rail is at 0 V" in found.message


def test_an_unknown_signal_is_not_checked():
    """A stage whose range was not worked out is listed, with what to state."""
    one = asked(None, None)
    assert findings(OUTPUT, one) == []
    (point,) = open_points(OUTPUT, one)
    assert "[signals]" in point.add


def test_a_reason_the_analysis_gives_is_passed_on():
    """Why a part was not worked out comes from the analysis, once."""
    one = stage(unknown={"output": Unknown("a diode conducts", "run ngspice")})
    assert [(p.why, p.add) for p in open_points(OUTPUT, one)] == [
        ("a diode conducts", "run ngspice")
    ]


def test_missing_figures_are_named():
    """A device without swing figures says which field to add."""
    bare = stage(output=Output(net="out", high=bound(demand=1.0), low=bound(False, demand=-1.0)))
    (point,) = open_points(OUTPUT, bare)
    assert "swing_high" in point.add


@pytest.mark.parametrize("use", ["comparator", "oscillator", "unused"])
@pytest.mark.parametrize("rule", [OUTPUT, INPUT])
def test_outputs_meant_to_hit_their_limits_are_not_judged(rule, use):
    """Comparators, oscillators and unused channels draw neither findings nor open points."""
    one = asked(20.0, use=use, inputs=inputs(high=bound(demand=99.0, typical=1.0)))
    assert findings(rule, one) == []
    assert open_points(rule, one) == []


@pytest.mark.parametrize("rule", [OUTPUT, INPUT])
def test_a_broken_loop_has_no_range(rule):
    """Where feedback is positive or open the range means nothing: not checked."""
    one = asked(20.0, loop=Loop(dc="positive"))
    assert findings(rule, one) == []
    assert len(open_points(rule, one)) == 1
    held = asked(20.0, loop=Loop(dc="open", holds=("XU2",)))
    assert len(findings(OUTPUT, held)) == 1


def test_inputs_inside_their_range_are_quiet():
    """Half a volt where 9 V are guaranteed draws nothing."""
    assert findings(INPUT, stage()) == []


def test_inputs_beyond_their_range():
    """Demand, limit and how far beyond stand in the sentence."""
    one = stage(
        inputs=inputs(high=bound(demand=4.2, level=2.0, span=2.4, typical=3.5, absolute=5.0)),
        supply=single(),
    )
    (found,) = findings(INPUT, one)
    assert found.severity == "critical"
    assert found.message == (
        "U1's inputs go up to 4.2 V; a TL072 on 5 V takes inputs up to 3.5 V "
        "(typical, data sheet), so they are 700 mV beyond it."
    )
    assert "raise the positive rail to at least 6 V" in found.remedy
    assert found.nets == ("in",)


def test_inputs_at_their_limit_use_up_the_reserve():
    """At the limit itself nothing is left: minor, and just inside the reserve quiet."""
    at = inputs(high=bound(demand=9.0, level=0.0, span=10.0, guaranteed=9.0))
    (found,) = findings(INPUT, stage(inputs=at))
    assert found.severity == "minor"
    inside = inputs(high=bound(demand=8.9, level=0.0, span=10.0, guaranteed=9.0))
    assert findings(INPUT, stage(inputs=inside)) == []


def test_both_ends_of_the_inputs_make_one_finding():
    """The worse end leads."""
    one = stage(
        inputs=inputs(
            high=bound(demand=10.0, level=0.0, span=20.0, guaranteed=9.0, absolute=12.0),
            low=bound(False, demand=-13.0, level=0.0, span=20.0, guaranteed=-9.0, absolute=-12.0),
        )
    )
    (found,) = findings(INPUT, one)
    assert "down to -13 V; the absolute limit there is -12 V" in found.message
    assert "At the upper end they go to 10 V, and 9 V is the limit." in found.message


def test_inputs_of_an_unknown_device_stay_open():
    """No common-mode range is known of an unknown device: it is listed."""
    one = unknown_device(inputs=inputs(high=bound(demand=1.0), low=bound(False, demand=0.0)))
    assert findings(INPUT, one) == []
    assert len(open_points(INPUT, one)) == 1
