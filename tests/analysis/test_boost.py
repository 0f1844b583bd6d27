"""Transistors that outputs drive: base current, gate current and volts against hand calculation."""

import math

import pytest
from msgspec.structs import replace

from railguard.rules.severity import breach

SINK = """
VIN in 0 SIN(1 0.8 10)
XU1 in e vp vn o TL072
RB o b 100
Q1 c b e QN
RE e 0 10
RC vp c 20
"""
NPN = ".model QN NPN(BF=50)\n"


def test_an_emitter_follower_asks_for_its_load_over_its_gain(stage):
    """1.8 V on 10 ohms is 180 mA from the emitter: 180/51 mA from the output."""
    found = stage(SINK + NPN)
    base = 0.18 / 51
    assert found.current.demand_source == pytest.approx(base, rel=1e-3)
    assert found.current.demand_sink == 0.0
    (carrier,) = found.current.carriers
    assert carrier.designators == ("Q1",)
    assert carrier.carries == pytest.approx(50 * base, rel=1e-3)
    assert carrier.takes == pytest.approx(base, rel=1e-3)
    assert carrier.gain_stated
    assert found.current.source.demand_basis == "netlist"


def test_the_output_stands_above_the_load(stage):
    """Emitter, 0.7 V, and the base current through its resistor; 0.1 V more at the worst."""
    found = stage(SINK + NPN)
    assert found.output.level == pytest.approx(1.0 + 0.7 + 100 * 0.1 / 51, abs=2e-3)
    assert found.output.worst.high - found.output.demand.high > 0.1
    assert found.loop.dc == "negative"
    assert not found.unknown


def test_a_gain_nobody_states_is_an_assumption(stage):
    """50 as common practice; the number says that it rests on it, the inputs do not."""
    found = stage(SINK + ".model QN NPN\n")
    assert found.current.demand_source == pytest.approx(0.18 / 51, rel=1e-3)
    assert found.current.source.demand_basis == "assumed"
    assert not found.current.carriers[0].gain_stated
    assert found.inputs.high.demand_basis == "netlist"


def test_the_usual_darlington_is_known_by_its_name(stage):
    """Without a model a TIP120 counts as one: a gain of 1,000 and two junctions."""
    found = stage(SINK.replace("QN", "TIP120"))
    assert found.current.demand_source == pytest.approx(0.18 / 1001, rel=1e-2)
    assert found.output.level == pytest.approx(2.4, abs=0.02)


def test_a_saturation_current_gives_the_junction_its_volts(stage):
    """V = kT/q ln(I/IS): 100 mA over 1e-14 A is 0.774 V."""
    found = stage(SINK + ".model QN NPN(BF=50 IS=1e-14)\n")
    junction = 0.02585 * math.log(0.1 * 50 / 51 / 1e-14)
    assert found.output.level == pytest.approx(1.0 + junction + 100 * 0.1 / 51, abs=2e-3)
    assert found.current.carriers[0].volts_stated


def test_a_follower_outside_the_loop_asks_for_its_base_current_too(stage):
    """The output's level is its own, the load's current over the gain comes on top."""
    cards = SINK.replace("XU1 in e", "XU1 in o").replace("SIN(1 0.8", "SIN(2 0.8")
    found = stage(cards + NPN)
    base = (2.8 - 0.7) / (10 * 51 + 100)
    assert found.current.demand_source == pytest.approx(base, rel=0.02)
    assert found.output.demand.high == pytest.approx(2.8, rel=1e-3)
    assert found.current.carriers[0].designators == ("Q1",)


def test_a_common_emitter_turns_the_loop_round(stage):
    """A PNP from the rail, the load on its collector, feedback to the non-inverting input."""
    cards = """
VIN in 0 SIN(2 1 10)
XU1 in c vp vn o TL072
RB o b 1k
Q1 c b vp QP
RL c 0 100
.model QP PNP(BF=80)
"""
    swapped = cards.replace("XU1 in c", "XU1 c in")
    found = stage(swapped)
    assert found.loop.dc == "negative"
    base = 0.03 / 80
    assert found.current.demand_sink == pytest.approx(base, rel=1e-3)
    assert found.output.demand.low == pytest.approx(15 - 0.7 - 1e3 * base, abs=0.02)
    assert stage(cards).loop.dc == "positive"


def test_two_transistors_multiply_their_gains(stage):
    """Two emitters one behind the other: the load over 51 * 51, and 1.4 V."""
    cards = SINK.replace("Q1 c b e QN", "Q1 vp b m QN\nQ2 c m e QN")
    found = stage(cards + NPN)
    assert found.current.demand_source == pytest.approx(0.18 / 51**2, rel=0.01)
    assert found.output.level == pytest.approx(2.4, abs=0.02)


PAIR = """
VIN in 0 SIN({level} 5 100)
XU1 in out vp vn o TL072
Q1 vp o out QN
Q2 vn o out QP
RL out 0 100
.model QN NPN(BF=100)
.model QP PNP(BF=60)
"""


def test_a_complementary_pair_works_both_ways(stage):
    """5 V on 100 ohms either way, over the smaller gain, 0.7 V further out."""
    found = stage(PAIR.format(level=0))
    assert found.current.demand_source == pytest.approx(0.05 / 61, rel=0.01)
    assert found.current.demand_sink == pytest.approx(0.05 / 61, rel=0.01)
    assert found.output.demand.high == pytest.approx(5.7, abs=0.01)
    assert found.output.demand.low == pytest.approx(-5.7, abs=0.01)
    assert found.current.carriers[0].designators == ("Q1", "Q2")


def test_a_pair_is_no_signal_of_its_own(stage):
    """Behind a capacitor a stage stays one, and its band is that of its signal."""
    cards = PAIR.format(level=0).replace("XU1 in", "CI in p 10u\nRI p 0 100k\nXU1 p")
    found = stage(cards)
    assert found.ac_coupled
    assert found.band.low == found.band.high == 100.0
    assert found.output.frequency == 100.0
    assert found.output.demand.high == pytest.approx(5.7, abs=0.01)


def test_a_pair_outside_the_loop_is_not_followed(design):
    """What the next stage gets of its crossover is no sine and no sum of peaks."""
    cards = PAIR.format(level=0).replace("XU1 in out", "XU1 in o")
    after = "R1 out n 10k\nR2 n o2 10k\nXU2 0 n vp vn o2 TL072\n"
    second = next(s for s in design(cards + after).stages if s.designator == "XU2")
    assert second.output.demand.high is None
    assert "change over" in second.unknown["output"].why


def test_a_pair_of_which_one_rests_is_a_follower(stage):
    """Where the load only sources, the NPN alone conducts, over its own gain."""
    found = stage(PAIR.format(level=6))
    assert found.current.demand_source == pytest.approx(0.11 / 101, rel=0.01)
    assert found.output.demand.low == pytest.approx(1.7, abs=0.05)
    assert found.current.carriers[0].designators == ("Q1",)


def test_a_pair_of_which_one_rests_at_the_end_of_the_range_is_a_follower(stage):
    """From 0 to 10 V the PNP never conducts either: 100 mA over the NPN's own gain."""
    found = stage(PAIR.format(level=5))
    assert found.current.demand_source == pytest.approx(0.1 / 101, rel=0.01)
    assert found.current.carriers[0].designators == ("Q1",)


def test_an_output_that_pulls_an_emitter_drives_no_base(stage):
    """A base on ground: what flows through the emitter resistor is a load like any other."""
    cards = (
        "VIN in 0 SIN(-5 1 10)\nXU1 in o vp vn o TL072\nRE o e 1k\nQ1 c 0 e QN\nRC vp c 1k\n" + NPN
    )
    found = stage(cards)
    assert found.current.carriers == ()
    assert found.current.demand_sink == pytest.approx((6 - 0.7) / 1e3, rel=0.02)


LEFT = {
    "stops conducting": SINK.replace("SIN(1 0.8 10)", "SIN(0 0.8 10)") + NPN,
    "saturates": SINK.replace("RC vp c 20", "RC vp c 200") + NPN,
    "polarity": SINK.replace("QN", "WHAT"),
    "current gain of 0": SINK + ".model QN NPN(BF=0)\n",
    "one of very many": SINK
    + NPN
    + "".join(f"Q{k} vp x{k} y{k} QN\nR{k} y{k} 0 1k\n" for k in range(2, 40)),
}


@pytest.mark.parametrize("why", LEFT)
def test_what_does_not_work_as_a_line_is_not_checked(stage, why):
    """The range stays without a number and says why; the feedback is never called open."""
    found = stage(LEFT[why])
    assert found.output.demand.high is None
    assert found.current.demand_source is None
    assert why in found.unknown["output"].why
    assert "Q1" in found.unknown["output"].why
    assert found.loop.dc == "negative"


LAMP = SINK.replace("RE e 0 10", "RE e 0 100")


@pytest.mark.parametrize(
    "lamps", ["D1 vp c LED", "D1 vp x LED\nRX x y 10\nD2 y c LED", "D1 vp c LED\nD2 vp c LED"]
)
def test_lamps_at_the_collector_leave_the_base_current_alone(stage, lamps):
    """What they drop only says whether enough is left across the transistor."""
    found = stage(LAMP.replace("RC vp c 20", lamps) + NPN + ".model LED D\n")
    assert found.current.demand_source == pytest.approx(0.018 / 51, rel=1e-3)
    assert not found.unknown


def test_lamps_that_may_drop_too_much_leave_it_open(stage):
    """Four of unknown sort may need 16 V of the 15; four of a stated junction do not."""
    string = "D1 vp x LED\nD2 x y LED\nD3 y z LED\nD4 z c LED"
    cards = LAMP.replace("RC vp c 20", string) + NPN
    found = stage(cards + ".model LED D\n")
    assert found.current.demand_source is None
    assert "saturates" in found.unknown["current"].why
    stated = stage(cards + ".model LED D(IS=1e-18 N=1.6)\n")
    assert stated.current.demand_source == pytest.approx(0.018 / 51, rel=1e-3)


def test_a_lamp_the_wrong_way_round_feeds_nothing(stage):
    """Its anode on the collector of an NPN: no current gets there."""
    found = stage(LAMP.replace("RC vp c 20", "D1 c vp LED") + NPN + ".model LED D\n")
    assert found.current.demand_source is None
    assert "Q1, which is fed by nothing that is followed" in found.unknown["current"].why


def test_a_collector_that_leaves_the_sheet_is_not_guessed(stage):
    """Nothing says what stands at the connector, so nothing says that the transistor works."""
    found = stage(SINK.replace("RC vp c 20", "J1 c") + NPN)
    assert found.current.demand_source is None
    stated = '[nets]\n"c" = { volts = 12 }'
    found = stage(SINK.replace("RC vp c 20", "J1 c") + NPN, stated)
    assert found.current.demand_source == pytest.approx(0.18 / 51, rel=1e-3)


def test_an_amplifier_that_saturates_its_transistor_is_still_told(stage):
    """Asked beyond its own rail it is the output that gives out first: the demand has a number."""
    cards = SINK.replace("SIN(1 0.8 10)", "SIN(10 8 10)").replace("RE e 0 10", "RE e 0 1k")
    found = stage(cards + NPN)
    assert found.output.demand.high == pytest.approx(18.7, abs=0.1)


def test_a_transistor_that_only_its_gain_sets_is_not_followed(design):
    """A discrete stage in front of a follower: its level is anybody's guess."""
    cards = """
VIN in 0 SIN(0 5m 100)
CI in b 10u
RB vp b 1meg
Q1 c b 0 QN
RC vp c 5k
XU1 c out vp vn out TL072
RL out 0 10k
.model QN NPN(BF=100)
"""
    (found,) = design(cards).stages
    assert found.output.demand.high is None
    assert "its own gain" in found.unknown["output"].why


def test_nor_is_one_in_front_of_a_virtual_ground(design):
    """There the input stands still, and the output moves with the gain all the same."""
    cards = """
VIN in 0 SIN(0 5m 100)
CI in b 10u
RB vp b 1meg
Q1 c b 0 QN
RC vp c 5k
R1 c n 100k
R2 n out 100k
XU1 0 n vp vn out TL072
.model QN NPN(BF=100)
"""
    (found,) = design(cards).stages
    assert found.output.demand.high is None
    assert "its own gain" in found.unknown["output"].why


MOSFET = """
VIN in 0 SIN(1 0.5 1k)
XU1 in s vp vn o TL072
RG o g 100
M1 d g s 0 MN {size}
RS s 0 10
RD vp d 20
"""


def test_a_gate_stands_above_its_source_by_the_square_law(stage):
    """0.1 A with 2 A/V^2 is 0.316 V beyond the threshold of 2 V; no current at DC."""
    found = stage(MOSFET.format(size="") + ".model MN NMOS(VTO=2 KP=2 CGSO=1u CGDO=0)\n")
    assert found.output.level == pytest.approx(1.0 + 2.0 + math.sqrt(0.2 / 2), abs=2e-3)
    assert found.loop.dc == "negative"


def test_a_gate_takes_c_dv_dt(stage):
    """CGSO and CGDO times the width, at the volts that move across each."""
    model = ".model MN NMOS(VTO=2 KP=2 CGSO=10u CGDO=20u)\n"
    found = stage(MOSFET.format(size="W=1m L=1m") + model)
    (carrier,) = found.current.carriers
    gm = math.sqrt(2 * 0.1 * 2)
    # The source moves 0.5 V, the drain 20/10 of that the other way, the gate 0.05 A / gm more.
    across_source, across_drain = 0.05 / gm, 0.5 + 0.05 / gm + 1.0
    peak = 2 * math.pi * 1e3 * (10e-9 * across_source + 20e-9 * across_drain)
    assert found.current.demand_source == pytest.approx(peak, rel=0.02)
    assert carrier.gain is None
    assert carrier.carries == pytest.approx(0.15, rel=0.01)


def test_a_gate_without_capacitance_counts_only_where_it_is_slow(stage):
    """At 1 kHz 10 nF would take 30 uA: not checked. At 1 Hz it is nothing."""
    cards = MOSFET.format(size="") + ".model MN NMOS(VTO=2 KP=2)\n"
    quick = stage(cards)
    assert quick.current.demand_source is None
    assert "capacitance" in quick.unknown["current"].why
    slow = stage(cards.replace("1k)", "1)", 1))
    assert slow.current.demand_source == pytest.approx(0.0, abs=1e-6)
    assert not slow.unknown


def test_a_model_that_is_no_square_law_is_not_followed(stage):
    """Without VTO and KP, or without a model, nothing says where the gate stands."""
    for model in (".model MN NMOS(LEVEL=8)\n", ".model MN NMOS\n"):
        found = stage(MOSFET.format(size="") + model)
        assert found.output.demand.high is None
        assert "the transistor M1, wh" in found.unknown["output"].why


def test_a_p_channel_source(design):
    """A PMOS from the rail: the output stands below its source by threshold and overdrive."""
    cards = """
VIN top 0 SIN(12 1 0.1)
XU1 top s vp vn o TL072
RS vp s 100
M1 l o s s MP
RL l 0 100
.model MP PMOS(VTO=-2 KP=0.5)
"""
    (found,) = design(cards).stages
    drive = math.sqrt(2 * 0.03 / 0.5)
    assert found.output.level == pytest.approx(12 - 2 - drive, abs=0.01)


@pytest.mark.parametrize("channel", ["N", "P"])
def test_a_junction_fet_stands_on_the_other_side_of_its_source(stage, channel):
    """1 mA with 2 mA/V^2 is 0.707 V beyond the pinch-off of 2 V: 1.293 V against the current."""
    cards = "XU1 in s vp vn o TL072\nJ1 d o s JX\n"
    if channel == "N":
        cards += "VIN in 0 SIN(1 0.5 1)\nRS s 0 1k\nRD vp d 1k\n"
    else:
        cards += "VIN vp in SIN(3 0.5 1)\nRS s vp 3k\nRD 0 d 1k\n"
    found = stage(cards + f".model JX {channel}JF(VTO=-2 BETA=2m)\n")
    against = 2.0 - math.sqrt(1e-3 / 2e-3)
    expected = 1.0 - against if channel == "N" else 12.0 + against
    assert found.output.level == pytest.approx(expected, abs=2e-3)


def test_area_and_number_of_transistors_count(stage):
    """Three of a kind share the current: the junction stands n kT/q ln 3 lower."""
    alone = stage(SINK + ".model QN NPN(BF=50 IS=1e-14)\n").output.level
    three = stage(SINK.replace(" QN", " QN 3") + ".model QN NPN(BF=50 IS=1e-14)\n").output.level
    assert alone - three == pytest.approx(0.02585 * math.log(3), abs=1e-3)


def test_the_largest_input_keeps_the_transistor_working(stage):
    """Below zero the emitter has no current left: that is where the input ends."""
    allowed = stage(SINK + NPN).allowed
    assert allowed.low == pytest.approx(0.0, abs=1e-3)
    assert allowed.limited_by == "Q1, which stops conducting"


NEAR = """
VIN in 0 {volts}
XU1 in e vp 0 o LM358
Q1 vq o e QN
RE e 0 1k
VQ vq 0 30
.model QN NPN(BF=200{junction})
"""


def test_a_limit_passed_by_less_than_a_junction_may_be_off_is_no_proof(stage):
    """0.7 V is practice: 30 mV beyond what an LM358 reaches may lie inside it, 0.5 V does not."""
    free = stage(NEAR.format(volts=8.0, junction=""))
    limit = free.output.high.typical
    assert free.output.high.unsure == pytest.approx(0.1, rel=1e-3)
    for volts, junction, severity in (
        (limit - 0.67, "", "minor"),
        (limit - 0.2, "", "major"),
        (limit - 0.67, " IS=1e-14", "major"),
    ):
        high = stage(NEAR.format(volts=volts, junction=junction)).output.high
        assert high.demand > limit
        broken = breach(replace(high, guaranteed=None, stated=None, default=None))
        assert broken.severity == severity
