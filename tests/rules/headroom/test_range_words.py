"""What the two range rules say and propose, sentence by sentence."""

import pytest

from railguard.analysis.bound import Pair, Range
from railguard.analysis.loop import Loop
from railguard.analysis.rail import Supply
from railguard.analysis.stage import Carrier, Current, Output
from railguard.devices.model import SwingPoint
from railguard.reviewing import review
from railguard.rules.headroom.ranges import INPUT, OUTPUT
from tests.rules.stages import (
    ELEMENTS,
    FAMILY,
    bound,
    changed,
    design,
    findings,
    high,
    inputs,
    low,
    open_points,
    pin,
    resistor,
    single,
    stage,
)

TO_THE_RAILS = changed(FAMILY, rail_to_rail_output=True, rail_to_rail_input=True)
STUCK = "All of its range lies beyond, so it is stuck there and passes no signal."
# What is sure to be reached is 9.5 V, 2.5 V below the rail: a gain of 11 * 9.5 / 11, so R2 of
# 8.5 kΩ, the next below; a rail of 11 V + 2.5 V.
GAIN = "Lower the gain from 11 to at most 9.5 (R2 = 8.2 kΩ instead of 10 kΩ)"
CLOSER = "fit a device whose output comes closer to the rail"


def asked(most, least, level=0.0, upper=None, lower=None, **fields):
    """Make a stage whose output is asked for a range; 10.5 V typical, 9.5 V guaranteed."""
    common = {"level": level, "span": most - least}
    return stage(
        output=Output(
            net="out",
            level=level,
            demand=Range(least, most),
            high=high(most, **{**common, **(upper or {})}),
            low=low(least, **{**common, **(lower or {})}),
        ),
        **fields,
    )


def single_supply(most, least, level, gain, plus, topology="non-inverting"):
    """Make a stage on 5 V from ground that reaches 0 V and 4.9 V and takes no more supply."""
    side = {"level": level, "span": most - least}
    return stage(
        topology=topology,
        supply=single(),
        family=changed(TO_THE_RAILS, supply_high=5.0),
        gain=(("in", gain),),
        inputs=inputs(plus=pin("in", level=plus)),
        loop=Loop(dc="negative", noise_gain_dc=gain, beta_dc=1 / gain),
        output=Output(
            net="out",
            level=level,
            demand=Range(least, most),
            high=bound(True, demand=most, typical=4.9, guaranteed=4.9, absolute=5.0, **side),
            low=bound(False, demand=least, typical=0.0, guaranteed=0.0, absolute=0.0, **side),
        ),
    )


@pytest.mark.parametrize(
    ("one", "message"),
    [
        (
            asked(11.0, -3.0),
            "U1 is asked for 11 V at its output; a TL072 on ±12 V reaches 10.5 V (typical, data "
            "sheet), so 500 mV is missing.",
        ),
        (
            asked(3.0, -11.0, lower={"condition": "10 kΩ load", "typical_basis": "memory"}),
            "U1 is asked for -11 V at its output; a TL072 on ±12 V reaches down to -10.5 V "
            "(typical, 10 kΩ load, data sheet from memory), so 500 mV is missing.",
        ),
        (
            asked(10.0, -3.0),
            "U1 is asked for 10 V at its output; a TL072 on ±12 V is sure to reach 9.5 V "
            "(guaranteed, data sheet), so 500 mV is not covered.",
        ),
        (
            asked(3.0, -10.0, lower={"condition": "10 kΩ load"}),
            "U1 is asked for -10 V at its output; a TL072 on ±12 V is sure to reach down to -9.5 V "
            "(guaranteed, 10 kΩ load, data sheet), so 500 mV is not covered.",
        ),
        (
            asked(9.48, -3.0),
            "U1 is asked for 9.48 V at its output; a TL072 on ±12 V reaches 9.5 V (guaranteed, "
            "data sheet), so only 20 mV is left.",
        ),
        (
            asked(10.48, -3.0, upper={"guaranteed": None}),
            "U1 is asked for 10.5 V at its output; a TL072 on ±12 V reaches 10.5 V (typical, data "
            "sheet), so only 20 mV is left.",
        ),
        (
            asked(9.0, -3.0, upper={"stated": Pair(10.6, 10.4), "guaranteed": None}),
            "At the worst corner of the stated tolerances U1 is asked for 10.6 V at its output; a "
            "TL072 on ±12 V is sure to reach 10.4 V (typical, data sheet), so 200 mV is not "
            "covered.",
        ),
        (
            asked(14.0, 13.0, level=13.5),
            "U1 is asked for 14 V at its output; its positive rail is at 12 V, so 2 V is missing "
            f"for any device. {STUCK}",
        ),
        (
            asked(-13.0, -14.0, level=-13.5),
            "U1 is asked for -14 V at its output; its negative rail is at -12 V, so 2 V is "
            f"missing for any device. {STUCK}",
        ),
        (
            asked(11.5, 11.0, level=11.2),
            "U1 is asked for 11.5 V at its output; a TL072 on ±12 V reaches 10.5 V (typical, data "
            f"sheet), so 1 V is missing. {STUCK}",
        ),
        (
            asked(11.0, -10.0),
            "U1 is asked for 11 V at its output; a TL072 on ±12 V reaches 10.5 V (typical, data "
            "sheet), so 500 mV is missing. At the lower end -10 V is asked for and -9.5 V reached.",
        ),
        (
            asked(9.48, -11.0),
            "U1 is asked for -11 V at its output; a TL072 on ±12 V reaches down to -10.5 V "
            "(typical, data sheet), so 500 mV is missing. At the upper end 20 mV is left.",
        ),
    ],
)
def test_what_is_said_of_an_output(one, message):
    """Demand, device and rails, limit with its source, what is missing; then the other end."""
    (found,) = findings(OUTPUT, one)
    assert found.message == message


@pytest.mark.parametrize(
    ("one", "remedy"),
    [
        (
            asked(11.0, -3.0),
            f"{GAIN}, or raise the positive rail to at least 13.5 V, or {CLOSER}.",
        ),
        (
            asked(3.0, -11.0),
            f"{GAIN}, or take the negative rail down to at least -13.5 V, or {CLOSER}.",
        ),
        (
            asked(11.0, -11.0),
            f"{GAIN}, or move the rails out to at least ±13.5 V, or {CLOSER}.",
        ),
        (
            asked(11.0, -3.0, family=TO_THE_RAILS),
            f"{GAIN}, or raise the positive rail to at least 13.5 V.",
        ),
        (asked(9.48, -3.0), f"{CLOSER.capitalize()}."),
        (asked(3.0, -9.48), f"{CLOSER.capitalize()}."),
        # the level itself is outside: it is moved, or scaled where a gain makes it
        (
            asked(11.5, 11.0, level=11.2, inputs=inputs(plus=pin("in", level=11.2 / 11))),
            "Lower the gain from 11 to at most 9.09 (R2 = 7.5 kΩ instead of 10 kΩ), or move the "
            "output's level (11.2 V) below 10.5 V, or raise the positive rail to at least 14 V, "
            f"or {CLOSER}.",
        ),
        (
            asked(-11.0, -11.5, level=-11.2, gain=(("a", 1.0), ("b", 2.0))),
            "Move the output's level (-11.2 V) above -10.5 V, or take the negative rail down to "
            f"at least -14 V, or {CLOSER}.",
        ),
        (
            asked(
                -11.0,
                -11.5,
                level=-11.2,
                gain=(("a", 1.0), ("b", 2.0)),
                family=changed(TO_THE_RAILS, supply_high=24.0),
            ),
            "Move the output's level (-11.2 V) above -10.5 V.",
        ),
        # what a reference under the ground leg gives of the level is no gain's: 8.5 V of 10.5 V
        (
            asked(
                11.5,
                -3.0,
                level=1.0,
                family=TO_THE_RAILS,
                inputs=inputs(plus=pin("in", level=1.0)),
            ),
            "Lower the gain from 11 to at most 8.9 (R2 = 7.5 kΩ instead of 10 kΩ), or raise the "
            "positive rail to at least 14 V.",
        ),
        # a level on the limit is not outside, but no gain helps there
        (
            asked(11.5, 10.0, level=10.5, inputs=inputs(plus=pin("in", level=10.5))),
            "Move the output's level (10.5 V) below 9.5 V, or raise the positive rail to at least "
            f"14 V, or {CLOSER}.",
        ),
        # no device comes past its rail
        (
            asked(12.0, -3.0, family=changed(FAMILY, supply_high=24.0)),
            "Lower the gain from 11 to at most 8.71 (R2 = 7.5 kΩ instead of 10 kΩ).",
        ),
        (
            asked(3.0, -12.0, family=changed(FAMILY, supply_high=24.0)),
            "Lower the gain from 11 to at most 8.71 (R2 = 7.5 kΩ instead of 10 kΩ).",
        ),
        # 13 V and what is lost of a typical rail of 12 V: 1.5 V
        (
            asked(13.0, -3.0, upper={"guaranteed": None}),
            "Lower the gain from 11 to at most 8.88 (R2 = 7.5 kΩ instead of 10 kΩ), or raise the "
            "positive rail to at least 14.5 V.",
        ),
    ],
)
def test_what_is_proposed_for_an_output(one, remedy):
    """Less gain, another level, another rail, another device: what applies, and nothing else."""
    (found,) = findings(OUTPUT, one)
    assert found.remedy == remedy


@pytest.mark.parametrize(
    ("one", "words"),
    [
        # Gain of 2 from ground, 0 V to 7 V asked of 4.9 V: 2 * 4.9 / 7.
        (
            single_supply(7.0, 0.0, 3.5, 2.0, plus=1.75),
            "Lower the gain from 2 to at most 1.4.",
        ),
        # The same round 2.5 V: 2 V of swing where 2.4 V is room; a level moved with its gain.
        (
            single_supply(5.5, 2.5, 2.5, 2.0, plus=2.5),
            "Lower the gain from 2 to at most 1.6.",
        ),
        # A follower has no gain to lower.
        (
            single_supply(5.6, 0.0, 2.8, 1.0, plus=2.8, topology="follower"),
            "Attenuate its signal to at most 87.5 % of what it is.",
        ),
        # A signal that swings round ground on one supply: no gain helps, a reference does.
        (
            single_supply(1.0, -1.0, 3e-14, 2.0, plus=1.5e-14),
            "Move the output's level (0 V) above 1 V.",
        ),
    ],
)
def test_a_gain_that_makes_the_level_as_well(one, words):
    """What the gain multiplies counts from where its ground leg goes."""
    (found,) = findings(OUTPUT, one, design(one, elements=()))
    assert found.remedy == words


NOWHERE = single_supply(1.0, -1.0, 3e-14, 2.0, plus=1.5e-14)


@pytest.mark.parametrize("unknown", [{"typical": None, "guaranteed": None}, {"span": None}])
def test_where_the_range_would_fit_is_not_known_without_both_limits(unknown):
    """What swings round ground on one supply could be moved, if there were room for it."""
    output = NOWHERE.output
    end = {"low": changed(output.low, span=None)} if "span" in unknown else {
        "high": changed(output.high, **unknown)
    }  # fmt: skip
    one = changed(NOWHERE, output=changed(output, **end))
    (found,) = findings(OUTPUT, one, design(one, elements=()))
    assert found.remedy == "Attenuate or shift its signal so that the output stays above 0 V."


def test_below_ground_the_same_is_said_of_the_other_side():
    """On -5 V alone a signal round ground has to stay below it."""
    side = {"level": -3e-14, "span": 2.0}
    one = changed(
        NOWHERE,
        supply=Supply(positive=0.0, negative=-5.0, positive_net="0", negative_net="-5V"),
        inputs=inputs(plus=pin("in", level=-1.5e-14)),
        output=Output(
            net="out",
            level=-3e-14,
            demand=Range(-1.0, 1.0),
            high=bound(True, demand=1.0, typical=0.0, guaranteed=0.0, absolute=0.0, **side),
            low=bound(False, demand=-1.0, typical=None, absolute=-5.0, **side),
        ),
    )
    (found,) = findings(OUTPUT, one, design(one, elements=()))
    assert found.remedy == "Attenuate or shift its signal so that the output stays below 0 V."


def test_what_a_transistor_takes_of_the_swing_is_told():
    """A volt between base and emitter that nobody states is common practice."""
    carrier = Carrier(designators=("Q1",), carries=0.3, gain=50, volts=0.7, volts_stated=False)
    one = asked(11.0, -3.0)
    (found,) = findings(OUTPUT, changed(one, current=Current(carriers=(carrier,))))
    assert found.message.endswith(
        "so 500 mV is missing. That counts 700 mV from base to emitter of Q1 (common practice)."
    )


def test_a_level_that_a_capacitor_would_keep_out_of_the_gain():
    """11 V of 1 V at its input, all of it level: the leg to ground wants a capacitor."""
    one = asked(11.5, 10.5, level=11.0, ac_coupled=True, inputs=inputs(plus=pin("in", level=1.0)))
    (found,) = findings(OUTPUT, one)
    assert found.remedy.startswith(
        "Put a capacitor in series with R1, so that the level is not amplified, or "
    )


def test_a_divider_before_the_input_stays_as_it_is():
    """A third of the signal times 11: of 3.67 the resistor makes only the 11, 11 * 9.5 / 11."""
    (found,) = findings(OUTPUT, asked(11.0, -3.0, gain=(("in", 3.67),), family=TO_THE_RAILS))
    assert "from 3.67 to at most 3.17 (R2 = 8.2 kΩ instead of 10 kΩ)" in found.remedy


def test_a_current_pump_names_no_resistor():
    """What leads back to both inputs keeps its ratios, or it is no current source any more."""
    one = asked(11.0, -3.0, family=TO_THE_RAILS)
    pump = design(one, elements=(*ELEMENTS, resistor("R3", 1e3, "out", "load"),
                                 resistor("R4", 10e3, "load", "in")))  # fmt: skip
    (found,) = findings(OUTPUT, one, pump)
    assert found.remedy.startswith("Lower the gain from 11 to at most 9.5, or ")


def test_an_inverting_stage_wants_a_reference_where_ground_is_one():
    """On a single supply what is inverted about ground goes below it."""
    one = single_supply(1.0, -1.0, 0.0, 2.0, plus=0.0, topology="inverting")
    one = changed(one, inputs=inputs(plus=pin("0")), ac_coupled=True)
    (found,) = findings(OUTPUT, one, design(one, elements=()))
    assert found.remedy == (
        "Move the output's level (0 V) above 1 V, by a reference at its non-inverting input "
        "instead of ground."
    )


def test_what_offset_moves_wants_a_better_device():
    """No gain and no level is wrong where the corner is the device's own offset."""
    pair = {"default": Pair(11.0, 9.4), "culprits": ("offset of XU1", "VP")}
    (found,) = findings(OUTPUT, asked(5.0, -5.0, upper=pair, family=TO_THE_RAILS))
    assert found.remedy.startswith("Fit a device of less offset voltage, or ")


def test_a_lighter_load_is_proposed_where_it_would_do():
    """The data sheet lists a swing at a lighter load that reaches the demand."""
    light = changed(FAMILY, swing_high=(SwingPoint(amps=0.0, typical=0.5),))
    (found,) = findings(OUTPUT, asked(11.0, -3.0, family=light))
    assert found.remedy.startswith("Lighten its load, or lower the gain")
    (far,) = findings(OUTPUT, asked(11.8, -3.0, family=light))
    assert "load" not in far.remedy
    (reserve,) = findings(OUTPUT, asked(9.48, -3.0, family=light))
    assert "load" not in reserve.remedy


def into(most, least, upper=None, lower=None, **fields):
    """Make a stage whose inputs cover a range; ±10 V typical, ±9 V guaranteed, ±12 V at most."""
    common = {"level": 0.0, "span": most - least}
    limits = {"typical": 10.0, "guaranteed": 9.0, "absolute": 12.0}
    return stage(
        inputs=inputs(
            demand=Range(least, most),
            high=bound(True, demand=most, **{**common, **limits, **(upper or {})}),
            low=bound(
                False,
                demand=least,
                **{**common, **{k: -v for k, v in limits.items()}, **(lower or {})},
            ),
        ),
        **fields,
    )


@pytest.mark.parametrize(
    ("one", "message"),
    [
        (
            into(11.0, -1.0),
            "U1's inputs go up to 11 V; a TL072 on ±12 V takes inputs up to 10 V (typical, data "
            "sheet), so they are 1 V beyond it.",
        ),
        (
            into(1.0, -9.5, lower={"condition": "at 25 °C"}),
            "U1's inputs go down to -9.5 V; a TL072 on ±12 V takes inputs down to -9 V "
            "(guaranteed, at 25 °C, data sheet), so they are 500 mV beyond it.",
        ),
        (
            into(8.95, -1.0),
            "U1's inputs go up to 8.95 V; a TL072 on ±12 V takes inputs up to 9 V (guaranteed, "
            "data sheet), so only 50 mV is left.",
        ),
        (
            into(9.95, -1.0, upper={"guaranteed": None}),
            "U1's inputs go up to 9.95 V; a TL072 on ±12 V takes inputs up to 10 V (typical, data "
            "sheet), so only 50 mV is left.",
        ),
        (
            into(13.0, -1.0, upper={"typical": None, "guaranteed": 12.5}),
            "U1's inputs go up to 13 V; the absolute limit there is 12 V, so they are 1 V beyond "
            "it.",
        ),
        (
            into(8.5, -1.0, upper={"default": Pair(9.5, 9.2), "culprits": ("A", "B", "C", "D")}),
            "At the worst corner of the default tolerances (A, B and C move it most) U1's inputs "
            "may go up to 9.5 V; a TL072 on ±12 V takes inputs up to 9.2 V (guaranteed, data "
            "sheet), so they are 300 mV beyond it.",
        ),
        (
            into(9.5, -11.0),
            "U1's inputs go down to -11 V; a TL072 on ±12 V takes inputs down to -10 V (typical, "
            "data sheet), so they are 1 V beyond it. At the upper end they go to 9.5 V, and 9 V "
            "is the limit.",
        ),
        (
            into(11.0, -9.5),
            "U1's inputs go up to 11 V; a TL072 on ±12 V takes inputs up to 10 V (typical, data "
            "sheet), so they are 1 V beyond it. At the lower end they go to -9.5 V, and -9 V is "
            "the limit.",
        ),
    ],
)
def test_what_is_said_of_the_inputs(one, message):
    """Demand, device and rails, limit with its source, how far beyond; then the other end."""
    (found,) = findings(INPUT, one)
    assert found.message == message


@pytest.mark.parametrize(
    ("one", "remedy"),
    [
        (
            into(11.0, -1.0),
            "Keep the inputs below 10 V by attenuating or shifting the signal, or raise the "
            "positive rail to at least 13 V, or fit a device whose inputs reach the positive rail.",
        ),
        (
            into(1.0, -11.0),
            "Keep the inputs above -10 V by attenuating or shifting the signal, or take the "
            "negative rail down to at least -13 V, or fit a device whose inputs reach the negative "
            "rail.",
        ),
        (
            into(11.0, -1.0, topology="inverting", family=TO_THE_RAILS),
            "Put the reference at the non-inverting input below 10 V, or raise the positive rail "
            "to at least 13 V.",
        ),
        (
            into(1.0, -11.0, topology="inverting", family=None),
            "Put the reference at the non-inverting input above -10 V, or fit a device whose "
            "inputs reach the negative rail.",
        ),
    ],
)
def test_what_is_proposed_for_the_inputs(one, remedy):
    """The signal, the reference of an inverting stage, another rail, another device."""
    (found,) = findings(INPUT, one)
    assert found.remedy == remedy


@pytest.mark.parametrize("rule", [OUTPUT, INPUT])
@pytest.mark.parametrize("figure", ["typical", "guaranteed"])
def test_one_figure_of_a_device_is_enough_to_judge_by(rule, figure):
    """Typical or guaranteed; where one side has neither, that is listed."""
    bare = {"typical": None, "guaranteed": None, "absolute": None}
    one, other = {**bare, figure: 10.0}, {**bare, figure: -10.0}
    sides = {"high": bound(True, demand=1.0, **one), "low": bound(False, demand=-1.0, **other)}
    made = stage(output=Output(net="out", **sides), inputs=inputs(**sides))
    assert open_points(rule, made) == []
    half = {**sides, "low": bound(False, demand=-1.0, **bare)}
    (point,) = open_points(rule, stage(output=Output(net="out", **half), inputs=inputs(**half)))
    what = "output swing" if rule is OUTPUT else "input common-mode range"
    fields = "swing_high and swing_low" if rule is OUTPUT else "input_low and input_high"
    assert point.why == f"the {what} of TL072 is not in the catalogue"
    assert point.add == f"add {fields} to a [[devices]] table of railguard.toml"


@pytest.mark.parametrize("rule", [OUTPUT, INPUT])
def test_what_does_not_move_wants_no_reserve(rule):
    """The reserve is a share of the span: a level on its limit is inside."""
    sides = {"high": high(9.5, span=None), "low": low(None)}
    one = stage(output=Output(net="out", **sides), inputs=inputs(**sides))
    assert findings(rule, one) == []


@pytest.mark.parametrize("rule", [OUTPUT, INPUT])
def test_one_end_that_was_worked_out_is_enough_to_judge_by(rule):
    """The other one is no gap where its limits are known."""
    sides = {"high": high(11.0, span=16.0), "low": low(None)}
    one = stage(output=Output(net="out", **sides), inputs=inputs(**sides))
    assert len(findings(rule, one)) == 1


def test_a_level_is_moved_by_what_its_three_digits_do_not_show():
    """Zero asked of an output that reaches down to 5 mV: 1 V and 1.005 V are written alike."""
    text = (
        "level output of the gauge\nVP vp 0 15\nC1 vp 0 100n\nVIN in 0 SIN(1 1 10)\n"
        "XU1 in out vp 0 out LM358\nRL out 0 10k\n"
    )
    (found,) = [
        f for f in review(text, plugins=False).designs[0].findings if f.rule == "headroom-output"
    ]
    assert "Move the output's level (1 V) up by 5 mV" in found.remedy
