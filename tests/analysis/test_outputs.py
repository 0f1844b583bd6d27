"""The output side of a stage, by hand: what is asked of it, what it can do, what stays open."""

import math

import pytest

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
    assert current.source.absolute is None


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
    assert output.high.absolute == pytest.approx(15.0)
    assert output.low.typical == pytest.approx(-output.high.typical)
    assert "output" in found.unknown
    assert "at one of its limits" in found.unknown["output"].why
    assert "current" not in found.unknown
    # 13.5 V, a volt and a half from its rail, into 2 kilohm and its own divider
    assert found.current.demand_source == pytest.approx(6.9e-3, rel=0.01)


def test_a_reversed_supply_leaves_nothing_to_judge(stage):
    """Neither range nor current; the finding on the supply says the rest."""
    found = stage(FOLLOWER, supply="VP vp 0 -15\nVN vn 0 15\n")
    for part in ("output", "current"):
        assert found.unknown[part].why == "its supply pins leave it no supply voltage"
    assert (found.output.available.high, found.output.high.typical) == (None, None)


def test_a_supply_nobody_states_leaves_the_demand(stage):
    """What is asked stands, against no limit."""
    found = stage(FOLLOWER, supply="VP vp 0 15\nJ1 vn 0 CONN\n")
    assert (found.output.high.demand, found.output.low.demand) == near(3.0, -1.0)
    assert (found.output.high.typical, found.output.low.absolute) == (None, None)
    assert "supply" in found.unknown


def test_a_resistor_before_the_pin_takes_from_the_swing(stage):
    """100 ohm: 0.14 V for its own 1.4 mA, then 100 ohm in series with 2 kilohm."""
    found = stage(FOLLOWER, supply="VP rp 0 15\nRP rp vp 100\nVN vn 0 -15\n")
    plain = stage(FOLLOWER)
    lost = plain.output.available.high - found.output.available.high
    assert found.supply.positive == pytest.approx(14.86, abs=0.01)
    assert lost == pytest.approx(0.14 + 100 * 11.4 / 2e3, rel=0.15)
    assert found.output.available.low == pytest.approx(plain.output.available.low)


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
