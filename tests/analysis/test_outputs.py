"""The output side of a stage, by hand: what is asked of it, what it can do, what stays open."""

import math

import pytest

from railguard.analysis.solution import Options

FOLLOWER = "VIN in 0 SIN(1 2 100)\nXU1 in out vp vn out TL072\nRL out 0 2k"
"""Between -1 and 3 V into 2 kilohm; the sheet guarantees 10 V and types 12 V at that load."""
SCHMITT = "VIN in 0 SIN(1 2 100)\nR1 p in 10k\nR2 p out 100k\nXU1 p 0 vp vn out TL072\nRL out 0 2k"


def near(*values):
    """Compare as numbers, None as None."""
    return tuple(v if v is None else pytest.approx(v, rel=1e-3, abs=1e-9) for v in values)


def test_what_is_asked_of_a_follower(stage):
    """Level, range, slope and current of a sine on a level."""
    found = stage(FOLLOWER)
    output, current = found.output, found.current
    assert (output.level, output.demand.low, output.demand.high) == near(1.0, -1.0, 3.0)
    assert (output.frequency, output.slew) == near(100.0, 2 * math.pi * 100 * 2.0)
    assert (current.demand_source, current.demand_sink) == near(1.5e-3, 0.5e-3)
    assert (current.load, current.into) == (pytest.approx(2000.0), "RL")
    assert (current.source.level, current.sink.level) == near(0.5e-3, -0.5e-3)
    assert (current.source.span, current.sink.span) == near(2e-3, 2e-3)
    assert (current.source.demand, current.sink.demand) == near(1.5e-3, 0.5e-3)


def test_what_a_follower_can_do(stage):
    """12 and 10 V at 2 kilohm, listed; the current known to be given, the short circuit."""
    found = stage(FOLLOWER)
    output, current = found.output, found.current
    assert (output.available.low, output.available.high) == near(-12.0, 12.0)
    assert (output.guaranteed.low, output.guaranteed.high) == near(-10.0, 10.0)
    assert (output.high.absolute, output.low.absolute) == near(15.0, -15.0)
    assert (output.high.level, output.high.span, output.low.span) == near(1.0, 4.0, 4.0)
    assert output.high.condition.startswith("2 kΩ")
    assert (output.high.demand_basis, output.high.absolute_basis) == ("netlist", "netlist")
    given = found.family
    assert current.available_source == pytest.approx(given.source_current.guaranteed)
    assert current.available_sink == pytest.approx(given.sink_current.guaranteed)
    assert current.short_circuit == given.short_circuit.best
    # one that sinks less than it sources
    other = stage(FOLLOWER.replace("TL072", "LM358")).current
    assert (other.available_source, other.available_sink) == (20e-3, 10e-3)
    assert current.source.absolute is None
    # nothing is assumed of a follower
    assert (output.high.unsure, current.source.unsure, current.sink.unsure) == (0.0, 0.0, 0.0)


def test_the_worst_of_a_follower_is_its_own_error(stage):
    """Offset and bias current alone move it: 10 mV; its rail moves its limit and not its demand."""
    found = stage(FOLLOWER)
    family, output = found.family, found.output
    error = family.offset_voltage.best
    assert output.offset == pytest.approx(error, rel=0.01)
    assert (output.worst.low, output.worst.high) == near(-1 - error, 3 + error)
    assert output.high.default.demand == pytest.approx(3 + error, rel=1e-3)
    assert output.high.default.limit == pytest.approx(10 - 0.05 * 15)
    assert output.low.default.limit == pytest.approx(-10 + 0.05 * 15)
    assert found.current.worst_source == pytest.approx((3 + error) / 2e3 * 1.01, rel=2e-3)
    assert found.current.worst_sink == pytest.approx((1 + error) / 2e3 * 1.01, rel=2e-3)


def test_a_tolerance_of_the_load_moves_the_current_only(stage):
    """One per cent of 1.5 mA, and what the error adds."""
    stated = stage(FOLLOWER, "[tolerances]\nresistor = 0.01")
    assert stated.output.high.stated.demand == pytest.approx(3.0, rel=1e-4)
    assert stated.current.source.stated.demand == pytest.approx(1.5e-3 * 1.01, rel=1e-3)


def test_a_stage_that_stands_at_its_limits_has_no_range(stage):
    """What it can do is known, at the load it works into; what it drives there is followed."""
    found = stage(SCHMITT)
    output = found.output
    assert (output.level, output.demand.high, output.slew, output.offset) == (None,) * 4
    assert (output.high.demand, output.high.level) == (None, None)
    assert (output.high.typical_basis, output.high.guaranteed_basis) == ("memory", "memory")
    assert 11.9 < output.high.typical < 12.0
    assert (output.high.absolute, output.low.absolute) == near(15.0, -15.0)
    assert output.low.typical == pytest.approx(-output.high.typical)
    assert 9.9 < output.high.guaranteed < 10.0
    assert output.high.condition.startswith("carried on beyond 2 kΩ")
    assert (output.worst.low, output.slew_worst.high) == (None, None)
    assert "output" in found.unknown
    assert "at one of its limits" in found.unknown["output"].why
    assert "current" not in found.unknown
    # 13.5 V, a volt and a half from its rail, into 2 kilohm and its own divider
    assert found.current.demand_source == pytest.approx(6.9e-3, rel=0.01)


def test_what_nobody_states_is_told_before_the_limit_it_stands_at(stage):
    """A probe without an amplitude, on an output that no loop holds: the user can state one."""
    own = "VIN in 0 1\nXU1 0 in vp vn out TL072\nRL out m 2k\nJ1 out 0 CONN_2"
    assert "at one of its limits" in stage(own).unknown["output"].why
    diode = "VIN in 0 SIN(1 2 100)\nXU1 in out vp vn o TL072\nD1 o out DX\nRL out 0 2k"
    assert "at one of its limits" not in stage(f"{diode}\n.model DX D").unknown["output"].why


@pytest.mark.parametrize("supply", ["VP vp 0 -15\nVN vn 0 15\n", "VP vp 0 5\nVN vn 0 5\n"])
def test_a_supply_of_nothing_leaves_nothing_to_judge(stage, supply):
    """Neither range nor current; the finding on the supply says the rest."""
    found = stage(FOLLOWER, supply=supply)
    for part in ("output", "current"):
        assert found.unknown[part].why == "its supply pins leave it no supply voltage"
    assert (found.output.available.high, found.output.high.typical) == (None, None)


def test_a_supply_nobody_states_leaves_the_demand(stage):
    """What is asked stands, against no limit."""
    found = stage(FOLLOWER, supply="VP vp 0 15\nJ1 vn 0 CONN\n")
    assert (found.output.high.demand, found.output.low.demand) == near(3.0, -1.0)
    assert (found.output.high.typical, found.output.low.absolute) == (None, None)
    assert (found.output.high.upper, found.output.low.upper) == (True, False)
    assert "supply" in found.unknown


def test_a_cell_of_less_than_a_volt_is_a_supply(stage):
    """0.9 V is more than nothing: the follower's own range is told."""
    cards = "VIN in 0 SIN(0.4 0.2 100)\nXU1 in out vp 0 out TL072\nRL out 0 10k"
    found = stage(cards, supply="VP vp 0 0.9\n")
    assert "output" not in found.unknown
    assert (found.output.demand.low, found.output.demand.high) == near(0.2, 0.6)


@pytest.mark.parametrize("level", [1, 5])
def test_a_connector_beside_the_load_leaves_the_load(stage, level):
    """What hangs outside is not known, the 2 kilohm are: their swing at most."""
    found = stage(f"{FOLLOWER}\nJ1 out 0 CONN_2".replace("SIN(1", f"SIN({level}"))
    assert "J1" in found.unknown["current"].why
    assert (found.output.available.low, found.output.available.high) == near(-12.0, 12.0)
    assert (found.output.guaranteed.low, found.output.guaranteed.high) == near(-10.0, 10.0)
    current = found.current
    assert (current.demand_source, current.demand_sink) == (None, None)
    assert (current.worst_source, current.worst_sink, current.sampled.high) == (None,) * 3
    # what it gives does not hang on what is asked of it
    for side, known in zip(
        (found.current.source, found.current.sink),
        2 * (stage(FOLLOWER).current.source,),
        strict=True,
    ):
        assert side.demand is None
        assert (side.typical, side.guaranteed) == (known.typical, known.guaranteed)
        assert None not in (side.typical, side.guaranteed)


@pytest.mark.parametrize(("hertz", "known"), [(0.2, True), (10, True), (10e3, False)])
def test_what_is_unseen_behind_a_capacitor_counts_at_the_signal_s_frequency(stage, hertz, known):
    """1 nF to 1 kilohm and a connector: a thousandth of its current gets through at 160 Hz."""
    cards = FOLLOWER.replace("2 100)", f"2 {hertz})")
    found = stage(f"{cards}\nC9 out x 1n\nR9 x 0 1k\nJ9 x 0 CONN_2")
    assert ("current" not in found.unknown) is known
    assert "output" not in found.unknown


def test_a_capacitor_takes_from_the_swing_as_its_impedance_does(stage):
    """7.96 nF at 10 kHz are 2 kilohm: the swing is the one listed there, however small the tone."""
    farads = 1 / (2 * math.pi * 10e3 * 2e3)
    found = stage(f"VIN in 0 SIN(0 0.5 10k)\nXU1 in out vp vn out TL072\nCL out 0 {farads}")
    assert (found.output.available.low, found.output.available.high) == near(-12.0, 12.0)


PUSHING = (
    "VIN in 0 SIN(1 0.8 10)\nXU1 in e vp vn o TL072\nQ1 vp o e QN\nRE e 0 10\n.model QN NPN(BF=50)"
)
PULLING = PUSHING.replace("SIN(1", "SIN(-1").replace("Q1 vp", "Q1 vn").replace("NPN", "PNP")


@pytest.mark.parametrize(("cards", "upper"), [(PUSHING, True), (PULLING, False)])
def test_a_base_takes_what_it_takes_and_nothing_the_other_way(stage, cards, upper):
    """180 mA over 51 on one side: the swing of a resistor that takes as much there; 13.5 V free."""
    output = stage(cards).output
    loaded, free = output.available.high, output.available.low
    if not upper:
        loaded, free = free, loaded
    assert abs(free) == pytest.approx(13.5)
    same = FOLLOWER.replace("2k", str(abs(loaded) / (0.18 / 51)))
    assert abs(loaded) == pytest.approx(stage(same).output.available.high, rel=1e-3)
    # 0.1 V either way of what a junction drops is assumed, at an emitter that the loop holds
    assert output.high.unsure == pytest.approx(0.1, rel=0.01)


def test_what_a_transistor_carries_is_not_told_where_the_load_is_not_known(stage):
    """A connector at its emitter."""
    found = stage(f"{PUSHING}\nJ1 e 0 CONN_2")
    assert "J1" in found.unknown["current"].why
    assert found.current.carriers == ()
    assert len(stage(PUSHING).current.carriers) == 1


UNEVEN = """
[nets]
"vp" = { volts = 15, tolerance = "2 %" }
"vn" = { volts = -15, tolerance = "10 %" }
"""
TWICE = "VIN in 0 SIN(1 2 100)\nR1 n 0 10k\nR2 n out 10k\nXU1 in n vp vn out BARE"
BARE = """
[[devices]]
family = "BARE"
technology = "cmos"
names = { 1 = ["BARE"] }
source = { title = "made for this test: neither swing nor errors" }
"""


def test_each_limit_goes_with_its_own_rail(stage):
    """2 % of one, 10 % of the other; who states the rail states the limit."""
    output = stage(FOLLOWER, UNEVEN, supply="").output
    assert (output.high.stated.limit, output.low.stated.limit) == near(10 - 0.3, -10 + 1.5)
    assert output.high.culprits[0] == "rail vp"
    assert output.low.culprits[0] == "rail vn"
    assert (output.high.absolute_basis, output.low.absolute_basis) == ("user", "user")
    forced = stage(SCHMITT, UNEVEN, supply="").output
    assert (forced.high.absolute_basis, forced.low.absolute_basis) == ("user", "user")


@pytest.mark.parametrize(
    ("exact", "high"),
    [(False, 1 + 1.1), (True, 1 + 1.05 / 0.95)],
)
def test_each_end_of_the_range_has_its_own_corner(design, exact, high):
    """A gain of two at 5 %: 3 V and -1 V at the input times the gain, solved anew or followed."""
    options = Options(exact=exact)
    stated = f"{BARE}{UNEVEN}[tolerances]\nresistor = 0.05"
    (found,) = design(TWICE, stated, supply="", options=options).stages
    output = found.output
    assert (output.high.default.demand, output.low.default.demand) == near(3 * high, -high)
    # 13 V is common practice where no swing is listed, the rails at 2 and at 10 %
    assert (output.high.default.limit, output.low.default.limit) == near(12.7, -11.5)
    assert (output.worst.high, output.worst.low) == near(3 * high, -high)
    # what flows is the input over the resistor to ground
    current = found.current
    least = 9.5e3 if exact else 10e3 / 1.05
    assert (current.source.default.demand, current.sink.default.demand) == near(
        3 / least, 1 / least
    )


def test_samples_stand_inside_the_worst(design):
    """Drawn for output and current; a run without them has none."""
    (found,) = design(TWICE, BARE, options=Options(samples=200)).stages
    output, current = found.output, found.current
    assert output.demand.high < output.sampled.high <= 3 * (1 + 1.01 / 0.99)
    assert -(1 + 1.01 / 0.99) <= output.sampled.low < output.demand.low
    assert current.demand_source < current.sampled.high <= output.sampled.high / 19.8e3
    (open_load,) = design(f"{TWICE}\nJ1 out 0 CONN_2", BARE, options=Options(samples=200)).stages
    assert open_load.output.sampled.high > output.demand.high
    assert open_load.current.sampled.high is None
    (plain,) = design(TWICE, BARE).stages
    assert (plain.output.sampled.high, plain.current.sampled.high) == (None, None)


def test_a_level_that_rises_in_minutes_has_a_slope(stage):
    """2 V at a hundredth of a hertz: 0.126 V/s; a level that stands has none, worst or not."""
    slow = stage(FOLLOWER.replace("SIN(1 2 100)", "SIN(1 2 0.01)")).output
    assert slow.slew == pytest.approx(2 * math.pi * 0.01 * 2.0, rel=1e-3)
    twice = stage(TWICE.replace("SIN(1 2 100)", "SIN(1 2 0.01)"), BARE).output
    assert twice.slew_worst.high == pytest.approx(2 * slow.slew * 1.01, rel=1e-3)
    assert twice.slew_worst.low == pytest.approx(2 * slow.slew * 0.99, rel=1e-3)
    standing = stage(FOLLOWER.replace("SIN(1 2 100)", "1")).output
    assert (standing.slew, standing.slew_worst.low, standing.slew_worst.high) == (None,) * 3


def test_a_signal_that_does_not_arrive_leaves_the_slope(design):
    """Two followers with a resistor between their outputs: each has its own, with its ends."""
    cards = (
        "VA a 0 SIN(0 1 100)\nVB b 0 SIN(0 1 150)\nXU1 a out vp vn out TL072\n"
        "XU2 b o2 vp vn o2 TL072\nR1 out o2 10k"
    )
    for found, hertz in zip(design(cards).stages, (100, 150), strict=True):
        slope = pytest.approx(2 * math.pi * hertz, rel=1e-4)
        assert found.output.slew == found.output.slew_worst.low == slope
        assert found.output.slew_worst.high == slope
        assert found.loop.band == hertz


def test_a_resistor_before_the_pin_takes_from_the_swing(stage):
    """100 ohm: 0.14 V for its own 1.4 mA, then 100 ohm in series with 2 kilohm.

    At rest it gives 1 V to them, which takes 0.05 V more from the pin.
    """
    found = stage(FOLLOWER, supply="VP rp 0 15\nRP rp vp 100\nVN vn 0 -15\n")
    plain = stage(FOLLOWER)
    lost = plain.output.available.high - found.output.available.high
    assert found.supply.positive == pytest.approx(14.81, abs=0.001)
    assert lost == pytest.approx(0.14 + 100 * 11.4 / 2e3, rel=0.15)
    assert found.output.available.low == pytest.approx(plain.output.available.low)


def test_a_pin_at_ground_loses_nothing(stage):
    """One supply of 30 V, the load to its middle: 12 V below that, to the millivolt."""
    cards = FOLLOWER.replace("vn out TL072", "0 out TL072").replace("SIN(1", "SIN(15")
    cards = cards.replace("RL out 0", "VM mid 0 15\nRL out mid")
    output = stage(cards, supply="VP vp 0 30\n").output
    assert (output.available.low, output.available.high) == near(3.0, 27.0)


BOTH = "VP rp 0 15\nRP rp vp 100\nVN rn 0 -15\nRN rn vn 100\n"


@pytest.mark.parametrize("level", [5, -5])
@pytest.mark.parametrize("more", ["", "\nJ1 out 0 CONN_2"])
def test_what_flows_at_rest_is_lost_once_on_either_side(stage, level, more):
    """2.5 mA through 100 ohm: the swing is that of the same stage at rest at ground."""
    found = stage(FOLLOWER.replace("SIN(1 2", f"SIN({level} 0.1") + more, supply=BOTH).output
    still = stage(FOLLOWER.replace("SIN(1 2", "SIN(0 0.1"), supply=BOTH).output
    assert (found.available.low, found.available.high) == (
        pytest.approx(still.available.low, abs=1e-3),
        pytest.approx(still.available.high, abs=1e-3),
    )
    assert still.available.high == pytest.approx(-still.available.low)


def test_a_device_nobody_knows_has_practice_and_no_errors(stage):
    """One and two volts from the rails; of offset nothing is known."""
    found = stage(FOLLOWER.replace("TL072", "XQ9981"))
    assert (found.output.available.high, found.output.guaranteed.high) == near(14.0, 13.0)
    assert found.output.offset is None
    assert found.current.short_circuit is None


def test_the_frequency_told_is_that_of_the_largest_tone(stage):
    """2 V at 100 Hz beside 0.5 V at 7 kHz."""
    cards = (
        "VA a 0 SIN(0 2 100)\nVB b 0 SIN(0 0.5 7k)\nR1 a n 10k\nR2 b n 10k\nR3 n out 10k\n"
        "XU1 0 n vp vn out TL072\nRL out 0 10k"
    )
    assert stage(cards).output.frequency == pytest.approx(100.0)
    assert stage(FOLLOWER.replace("SIN(1 2 100)", "1")).output.frequency is None
    # a buffered reference stands still while the other input moves
    steady = "VR r 0 1\nXU2 r ref vp vn ref TL072\nR4 ref p 10k\nR5 p 0 10k"
    assert (
        stage(f"{cards.replace('XU1 0', 'XU1 p')}\n{steady}", name="XU2").output.frequency is None
    )
