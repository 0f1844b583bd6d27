"""Stated signals: between two nets, as currents, in groups."""

import math

import pytest

INA = """
R1 o1 m 20k
RG m k 2k
R2 k o2 20k
XU1 s+ m vp vn o1 TL072
XU2 s- k vp vn o2 TL072
R3 o1 n 10k
R4 n out 10k
R5 o2 p 10k
R6 p 0 10k
XU3 p n vp vn out TL072
"""
DIFFERENCE = "R1 a n 10k\nR2 n out 10k\nR3 b p 10k\nR4 p 0 10k\nXU1 p n vp vn out TL072"
BRIDGE = (
    '[signals]\n"bridge" = {{ between = ["s+", "s-"], peak = 0.01, ohms = 350, to = 20{more} }}'
)


@pytest.mark.parametrize(("more", "common"), [(", common = 2.5", 2.5), ("", 0.0)])
def test_a_signal_between_two_nets_moves_them_apart(design, more, common):
    """10 mV times 1 + 2 * 20k / 2k = 21 at the third amplifier; the first two share it."""
    returns = "" if more else "RA s+ 0 1meg\nRB s- 0 1meg\n"
    first, second, third = design(INA + returns, BRIDGE.format(more=more)).stages
    assert third.output.demand.high == pytest.approx(0.21, rel=1e-3)
    assert third.output.demand.low == pytest.approx(-0.21, rel=1e-3)
    for stage in (first, second):
        assert stage.output.level == pytest.approx(common, abs=0.01 * common + 1e-3)
        assert stage.output.demand.span == pytest.approx(0.21, rel=1e-3)
        assert stage.inputs.demand.span == pytest.approx(0.01, rel=1e-3)
    assert third.allowed.net == "bridge"
    assert third.allowed.high == pytest.approx(third.output.guaranteed.high / 21, rel=1e-3)


def test_a_current_signal_makes_its_voltage(stage):
    """4 to 20 mA in 250 ohms, doubled; the largest current allowed is in amperes."""
    cards = "RL in 0 250\nR1 n 0 10k\nR2 n out 10k\nXU1 in n vp vn out TL072"
    found = stage(cards, '[signals]\n"in" = { amps = [0.004, 0.020], to = 10 }')
    assert found.inputs.demand.low == pytest.approx(1.0, rel=1e-6)
    assert found.inputs.demand.high == pytest.approx(5.0, rel=1e-6)
    assert found.output.demand.high == pytest.approx(10.0, rel=1e-4)
    assert found.allowed.unit == "A"
    assert found.allowed.high == pytest.approx(found.output.guaranteed.high / 500, rel=1e-3)


def test_signals_of_one_group_happen_at_once(stage):
    """Equal signals on both inputs of a difference amplifier cancel in a group, and add apart."""
    one = "{{ low = -1, high = 1, to = 100{g} }}"
    text = f'[signals]\n"a" = {one}\n"b" = {one}'
    apart = stage(DIFFERENCE, text.format(g=""))
    together = stage(DIFFERENCE, text.format(g=', group = "line"'))
    assert apart.output.demand.high == pytest.approx(2.0, rel=1e-3)
    assert together.output.demand.high == pytest.approx(0.0, abs=1e-3)


FOLLOWER = "XU1 in out vp vn out TL072"


@pytest.mark.parametrize("source", ["VIN in 0 0", "VIN 0 in 0", "J1 in", "BT1 0 in 9V"])
def test_a_signal_moves_its_net_whatever_holds_it(stage, source):
    """A source of the deck either way round, a battery, or one that is made for it."""
    found = stage(
        f"{source}\n{FOLLOWER}\nRL out 0 2k", '[signals]\n"in" = { low = 1, high = 3, to = 100 }'
    )
    assert found.output.demand.low == pytest.approx(1.0, rel=1e-4)
    assert found.output.demand.high == pytest.approx(3.0, rel=1e-4)


@pytest.mark.parametrize(("card", "volts"), [("BT1 in 0 3V", 3.0), ("BT1 0 in 3V", -3.0)])
def test_a_battery_is_a_level(stage, card, volts):
    """As its value says, its first pin positive."""
    assert stage(f"{card}\n{FOLLOWER}\nRL out 0 2k").output.level == pytest.approx(volts, rel=1e-4)


def test_a_stated_load_is_one_of_the_circuit(stage):
    """2 kilohm and a nanofarad at 10 kHz: 0.5 mA and 63 uA at a right angle."""
    settings = '[loads]\n"out" = { ohms = 2e3, farads = 1e-9 }'
    current = stage(f"VIN in 0 SIN(0 1 10k)\n{FOLLOWER}", settings).current
    assert (current.load, current.load_capacitance) == (pytest.approx(2e3), 1e-9)
    assert current.demand_source == pytest.approx(math.hypot(0.5e-3, 2e-5 * math.pi), rel=2e-3)


def test_what_the_user_states_of_nets_that_are_not_there_is_told(design):
    """Each by its sort; the rest of it counts."""
    settings = (
        '[signals]\n"nowhere" = { low = 1, high = 3, to = 100 }\n[loads]\n"gone" = { ohms = 1 }\n'
        '[nets]\n"void" = { volts = 1 }'
    )
    remarks = [r.message for r in design(f"VIN in 0 1\n{FOLLOWER}", settings).remarks]
    assert (
        "railguard.toml states what this deck does not have: load gone, net void, signal nowhere."
        in remarks
    )


def test_half_of_a_source_s_resistance_is_at_either_end(stage):
    """1 kilohm between the inputs of a difference of 9.5 kilohm each: 10 kilohm, so a gain of one.

    Both ends at 2.5 V: a volt of signal is a volt at the output, less for any other share.
    """
    cards = "R1 a n 9.5k\nR2 n out 10k\nR3 b p 9.5k\nR4 p 0 10k\nXU1 p n vp vn out OPAMP"
    settings = (
        '[signals]\n"s" = { between = ["b", "a"], peak = 1, common = 2.5, ohms = 1000, to = 20 }'
    )
    output = stage(cards, settings).output
    assert output.demand.high == pytest.approx(1.0, rel=1e-4)
    assert output.level == pytest.approx(0.0, abs=1e-3)
    # one that stands off its middle moves the level as well
    output = stage(cards, settings.replace("peak = 1", "low = 0, high = 2")).output
    assert output.level == pytest.approx(1.0, rel=1e-4)
    assert output.demand.low == pytest.approx(0.0, abs=1e-3)


def test_a_carrier_that_is_modulated_counts_at_its_highest_frequency(stage):
    """10 kHz, and five times 1 kHz of deviation: 15 kHz of 1 V round 0.5 V."""
    output = stage(f"VIN in 0 SFFM(0.5 1 10k 5 1k)\n{FOLLOWER}\nRL out 0 2k").output
    assert output.frequency == pytest.approx(15e3)
    assert (output.demand.low, output.demand.high) == (
        pytest.approx(-0.5, rel=1e-3), pytest.approx(1.5, rel=1e-3),
    )  # fmt: skip
    assert output.slew == pytest.approx(2 * math.pi * 15e3, rel=3e-3)


def test_a_reference_beside_a_probe_is_no_signal(stage):
    """The gain is that from the probe alone."""
    cards = "VIN in 0 AC 1\nVR ref 0 1\nR1 in n 10k\nR2 n out 100k\nXU1 ref n vp vn out TL072"
    found = stage(cards)
    assert found.gain == (("in", pytest.approx(-10.0, rel=1e-3)),)


def test_a_battery_without_a_value_says_what_to_state(stage):
    """Its net, as a level or as a signal."""
    unknown = stage(f"BT1 in 0 CR2032\n{FOLLOWER}\nRL out 0 2k").unknown["output"]
    assert unknown.why == "BT1 states no value"
    assert unknown.add == '[nets] or [signals] "in"'


def test_a_band_keeps_its_worst_point_with_its_frequency(stage):
    """An inverting stage with a zero: the top of the band asks for most."""
    cards = "R1 in n 10k\nC1 in n 1n\nR2 n out 10k\nXU1 0 n vp vn out TL072"
    found = stage(cards, '[signals]\n"in" = { low = -0.1, high = 0.1, from = 10, to = 30e3 }')
    assert found.output.frequency == pytest.approx(30e3)
    assert found.output.demand.high > 0.2


def test_scipy_stays_away_from_small_circuits():
    """Its import costs more than a review; a ladder of a thousand nets brings it in."""
    import subprocess
    import sys

    script = (
        "import sys; from railguard.reviewing import review; import railguard\n"
        "cards = ['t', 'VP vp 0 15', 'VN vn 0 -15', 'VIN s0 0 1']\n"
        "cards += [f'R{k} s{k} s{k + 1} 10\\nQ{k} s{k + 1} 0 1k'.replace('Q', 'RP') for k in "
        "range(%d)]\n"
        "cards += ['XU1 s%d out vp vn out TL072', '.end', '']\n"
        "found = review('\\n'.join(cards), plugins=False).designs[0].design.stages[0]\n"
        "print('scipy' in sys.modules, found.output.level is not None)"
    )
    for size, loaded in ((200, "False"), (600, "True")):
        done = subprocess.run(
            [sys.executable, "-c", script % (size, size)],
            capture_output=True,
            text=True,
            check=True,
        )
        assert done.stdout.split() == [loaded, "True"]
