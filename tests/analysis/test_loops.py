"""Loop sign, noise gain, bandwidth and phase margin against hand calculation."""

import cmath
import itertools
import math

import pytest


def test_noise_gain_of_an_inverting_stage(stage):
    """Gain -10 has a noise gain of 11; the bandwidth is GBW over it."""
    found = stage("VIN in 0 AC 1\nR1 in n 10k\nR2 n out 100k\nXU1 0 n vp vn out TL072")
    assert found.loop.dc == "negative"
    assert found.loop.noise_gain_dc == pytest.approx(11.0, rel=1e-6)
    gbw = found.family.gain_bandwidth.typical
    assert found.loop.crossover == pytest.approx(gbw / 11.0, rel=0.01)


def test_swapped_inputs_are_positive_feedback(stage):
    """The feedback divider on the non-inverting input."""
    found = stage("VIN in 0 SIN(0 0.1 1k)\nR1 in p 10k\nR2 p out 100k\nXU1 p 0 vp vn out TL072")
    assert found.loop.dc == "positive"
    assert found.loop.beta_plus == pytest.approx(1 / 11, rel=1e-3)
    assert found.output.demand.high is None


def test_no_feedback_is_open(stage):
    """Nothing but the input on the inverting pin."""
    found = stage("VIN in 0 SIN(0 0.1 1k)\nR1 in n 10k\nXU1 0 n vp vn out TL072")
    assert found.loop.dc == "open"


def test_integrator_is_open_at_dc_by_itself(stage):
    """A capacitor alone gives no feedback at DC."""
    found = stage("VIN in 0 SIN(0 0.1 1k)\nR1 in n 10k\nC2 n out 10n\nXU1 0 n vp vn out TL072")
    assert found.loop.dc == "open"


def test_outer_loop_holds_an_integrator(design):
    """An integrator whose output comes back through an inverter is held at DC."""
    cards = """
VIN in 0 SIN(0 0.1 1k)
R1 in n 10k
C2 n a 10n
XU1 0 n vp vn a TL072
R3 a m 10k
R4 m b 10k
XU2 0 m vp vn b TL072
R5 a n 1meg
"""
    assert [s.loop.dc for s in design(cards).stages] == ["negative", "negative"]


def test_current_pump_is_negative(stage):
    """A balanced current pump with a load has more negative than positive feedback."""
    cards = """
VIN in 0 SIN(0 1 100)
R1 0 n 10k
R2 n out 10k
R3 in p 10k
R4 p out 10k
RL p 0 1k
XU1 p n vp vn out TL072
"""
    assert stage(cards).loop.dc == "negative"


def test_transistor_inside_the_loop_keeps_its_sign(design):
    """An emitter follower inside the loop leaves the feedback negative."""
    cards = """
VIN in 0 SIN(2 0.5 100)
XU1 in e vp vn b TL072
Q1 vp b e QN
RE e 0 1k
.model QN NPN
"""
    assert design(cards).stages[0].loop.dc == "negative"


def test_common_emitter_inside_the_loop_turns_the_sign(design):
    """Feedback over a common-emitter stage to the inverting input is positive."""
    cards = """
VIN in 0 SIN(2 0.5 100)
XU1 in c vp vn b TL072
RB b bb 10k
Q1 c bb 0 QN
RC vp c 1k
.model QN NPN
"""
    assert design(cards).stages[0].loop.dc == "positive"


INVERTING = "VIN in 0 AC 1\nR1 in n 10k\nR2 n out 100k\nXU1 0 n vp vn out TL072"


def test_the_points_of_a_drawing(stage):
    """Hertz, 1/beta of eleven, |A| of the one pole, and its phase: by hand below and above it."""
    found = stage(INVERTING)
    assert found.loop.noise_gain == pytest.approx(11.0, rel=1e-6)
    rest, gbw = found.family.open_loop_gain.typical, found.family.gain_bandwidth.typical
    for hertz, noise_gain, a, phase in found.loop.points:
        lag = hertz * rest / gbw
        assert noise_gain == pytest.approx(11.0, rel=1e-6)
        assert a == pytest.approx(rest / math.hypot(1, lag), rel=1e-6)
        # what its input adds to it is under a degree below 100 kHz
        if hertz < 1e5:
            assert phase == pytest.approx(-math.degrees(math.atan(lag)), abs=0.5)


def test_a_noise_gain_that_falls_before_the_first_hertz_counts_at_rest(stage):
    """A millifarad across 100 kilohm has no share in the eleven at DC, where offsets count."""
    loop = stage(f"{INVERTING}\nC2 n out 1m").loop
    assert loop.noise_gain == loop.noise_gain_dc == pytest.approx(11.0, rel=1e-6)
    assert loop.noise_gain_worst.low == pytest.approx(1 + 10 * 0.99 / 1.01, rel=1e-3)


def test_the_ends_of_a_noise_gain_stand_where_it_is_largest(stage):
    """It rises to a hundred and falls again before the loop closes: 1 kilohm, 100 nF, 100 pF."""
    cards = INVERTING.replace("R1 in n 10k", "C1 in a 100n\nR1 a n 1k") + "\nC2 n out 100p"
    loop = stage(cards).loop
    # by hand where both corners, 1.592 kHz and 15.92 kHz, are passed alike: 1 + Z2 / Z1 there
    s = 2j * math.pi * loop.points[20][0]
    by_hand = abs(1 + 100e3 / (1 + s * 100e3 * 100e-12) / (1e3 + 1 / (s * 100e-9)))
    assert loop.noise_gain == pytest.approx(by_hand, rel=1e-3)
    worst = loop.in_band_worst
    assert 0.9 * loop.noise_gain < worst.low < 0.99 * loop.noise_gain
    assert 1.01 * loop.noise_gain < worst.high < 1.1 * loop.noise_gain


def test_a_margin_that_hangs_on_what_is_not_listed_has_no_ends(stage):
    """A nanofarad at an output of unknown resistance: between the least and the most there is."""
    loop = stage("VIN in 0 SIN(0 1 100)\nXU1 in out vp vn out TL072\nCL out 0 1n").loop
    assert loop.phase_margin is None
    assert (loop.phase_margin_worst.low, loop.phase_margin_worst.high) == (None, None)
    # a pole of 200 ohm and 1 nF at 796 kHz, where the loop then closes at some 1.46 MHz
    assert loop.margins.low == pytest.approx(28.7, abs=1.0)
    # and one of 5.2 ohm, 26 mV over twice 2.5 mA, at 30.6 MHz, where it closes at 3 MHz
    assert loop.margins.high == pytest.approx(84.4, abs=0.1)


def test_a_stage_that_halves_the_feedback_is_in_the_ends(design):
    """Three equal resistors, half of the output turned round on one: (1 - 1/2) / 3, so six.

    Its own network would say three; its five resistors of 1 % move it by some 5 %.
    """
    cards = (
        "VIN in 0 SIN(0 1 100)\nR1 n 0 10k\nR2 n out 10k\nR3 n s 10k\nXU1 in n vp vn out TL072\n"
        "RA out m 10k\nRB m s 5k\nXU2 0 m vp vn s TL072"
    )
    loop = design(cards).stages[0].loop
    assert loop.noise_gain_dc == pytest.approx(6.0, rel=1e-4)

    def noise_gain(a, b, c, d, e):
        return (1 / a + 1 / b + 1 / c) / (1 / b - e / d / 2 / c)

    corners = [noise_gain(*signs) for signs in itertools.product((0.99, 1.01), repeat=5)]
    assert loop.noise_gain_worst.low == pytest.approx(min(corners), rel=2e-3)
    assert loop.noise_gain_worst.high == pytest.approx(max(corners), rel=2e-3)


FAST = """
[[devices]]
family = "FAST50"
technology = "cmos"
gain_bandwidth = { typical = 50e6 }
input_capacitance = { typical = 0.01e-12 }
output_resistance = { typical = 0.1 }
names = { 1 = ["FAST50"] }
source = { title = "made for this test" }
"""


def test_phase_margin_of_a_transimpedance_stage(stage):
    """RF 100 kilohm, 20 pF, GBW 50 MHz, CF 1.1 pF: about 65 degrees.

    Source: Texas Instruments OPA607 data sheet SBOS981J, transimpedance example (the 20 pF is the
    whole input capacitance, so the device here adds none).
    """
    cards = (
        "IPD 0 n SIN(0 1u 1k)\nRF n out 100k\nCF n out 1.1p\nCT n 0 20p\nXU1 0 n vp vn out FAST50"
    )
    found = stage(cards, FAST)
    assert found.loop.phase_margin == pytest.approx(65.0, abs=2.0)
    assert found.loop.noise_gain_crossover == pytest.approx(1 + 20 / 1.1, rel=0.2)


COMPOSITE = """
VIN in 0 SIN(0 0.1 1k)
R1 n 0 1k
R2 n out 9k
XU1 in n vp vn a TL072
{inner}
RL out 0 2k
"""
GAIN_OF_FIVE = "RA m 0 1k\nRB m out 4k\nXU2 a m vp vn out NE5532"


@pytest.mark.parametrize(
    ("inner", "local", "outer"),
    [
        # first of all cards: its divider is the first net
        (f"{GAIN_OF_FIVE}\n* first", 5.0, 2.0),
        # The outer one's loop has the inner one's gain in it: five of the divider's ten.
        (GAIN_OF_FIVE, 5.0, 2.0),
        ("XU2 a out vp vn out NE5532", 1.0, 10.0),
    ],
)
def test_local_and_composite_loop_are_told_apart(design, inner, local, outer):
    """The inner amplifier has its own network's noise gain, the outer one is held by the inner."""
    cards = COMPOSITE.format(inner=inner)
    if "* first" in inner:
        cards = inner + COMPOSITE.format(inner="")
    found = {s.designator: s for s in design(cards).stages}
    assert found["XU2"].loop.noise_gain_dc == pytest.approx(local, rel=1e-3)
    assert found["XU2"].loop.noise_gain == pytest.approx(local, rel=1e-3)
    assert found["XU2"].loop.holds == ()
    # one plus a ratio of two resistors of 1 %
    worst = found["XU2"].loop.noise_gain_worst
    assert worst.span / 2 == pytest.approx(0.02 * (local - 1), rel=1e-2)
    assert found["XU1"].loop.noise_gain_dc == pytest.approx(outer, rel=1e-3)
    assert found["XU1"].loop.holds == ("XU2",)
    assert found["XU1"].topology == "non-inverting"
    gbw = found["XU1"].family.gain_bandwidth.typical
    # The inner amplifier's own bandwidth of 2 MHz and more takes its share.
    assert found["XU1"].loop.crossover == pytest.approx(gbw / outer, rel=0.2)


def test_a_servo_leaves_the_stages_own_noise_gain(design):
    """An integrator that takes the level out of a stage multiplies its loop at DC only."""
    cards = """
VIN in 0 SIN(0 0.1 1k)
R1 n 0 1k
R2 n out 9k
RS s n 100k
XU1 in n vp vn out TL072
R3 out m 1meg
C3 m s 1u
XU2 0 m vp vn s2 TL072
R4 s2 x 10k
R5 x s 10k
XU3 0 x vp vn s TL072
"""
    main = next(s for s in design(cards).stages if s.designator == "XU1")
    assert main.loop.noise_gain_dc == pytest.approx(1 + 9 + 9 / 100, rel=0.01)


@pytest.mark.parametrize(
    ("cards", "low", "high"),
    [
        # +-12 V and 1.5 V of drop: 10.5 V and a divider of eleven.
        ("VIN in 0 SIN(0 2 100)\nR1 p 0 10k\nR2 p out 100k\nXU1 p in vp vn out TL072",
         -10.5 / 11, 10.5 / 11),
        ("VIN in 0 SIN(0 5 100)\nVR r 0 3\nR1 p r 10k\nR2 p out 100k\nXU1 p in vp vn out TL072",
         (30 - 10.5) / 11, (30 + 10.5) / 11),
        # The signal at the other end of the divider: a tenth of 10.5 V.
        ("VIN in 0 SIN(0 2 100)\nR1 p in 10k\nR2 p out 100k\nXU1 p 0 vp vn out TL072", -1.05, 1.05),
        ("VIN in 0 SIN(1 3 100)\nVR r 0 1\nR1 p in 10k\nR2 p out 100k\nXU1 p r vp vn out TL072",
         1.1 - 1.05, 1.1 + 1.05),
    ],
)  # fmt: skip
def test_thresholds_are_volts_of_the_signal(stage, cards, low, high):
    """By hand for both kinds of hysteresis, with and without a reference."""
    supply = "VP vp 0 12\nVN vn 0 -12\n"
    loop = stage(cards + "\nRL out 0 1meg", supply=supply).loop
    assert loop.thresholds.low == pytest.approx(low, rel=0.01, abs=0.01)
    assert loop.thresholds.high == pytest.approx(high, rel=0.01)


def test_a_capacitor_at_an_output_whose_resistance_is_not_listed(stage):
    """A follower's loop is GBW / f and a pole at 1 / 2 pi R C: the least R leaves the most margin.

    The least that a TL072 of 2.5 mA may have is 26 mV / 5 mA = 5.2 ohm.
    """
    found = stage("VIN in 0 AC 1\nXU1 in out vp vn out TL072\nCL out 0 22n")
    gbw = found.family.gain_bandwidth.typical
    assert found.family.supply_current.guaranteed == 2.5e-3
    assert found.loop.least_ohms == pytest.approx(5.2)
    pole = 1 / (2 * math.pi * 5.2 * 22e-9)
    # f sqrt(1 + (f / pole)^2) = GBW
    square = (math.sqrt(1 + 4 * (gbw / pole) ** 2) - 1) / 2 * pole**2
    expected = 90 - math.degrees(math.atan(math.sqrt(square) / pole))
    assert found.loop.margins.high == pytest.approx(expected, abs=0.5)
    assert found.loop.margins.low < 10


@pytest.mark.parametrize(
    "cards",
    [
        "XU1 in out vp vn out TL072\nR1 out a 100\nCL a 0 22n",
        "XU1 in out vp vn out OP1177\nCL out 0 22n",
    ],
)
def test_nothing_is_taken_behind_a_resistor_or_where_a_load_is_listed(stage, cards):
    """Nothing of it leaves all the margin there is."""
    found = stage("VIN in 0 AC 1\n" + cards)
    assert found.loop.least_ohms is None
    assert found.loop.margins.high > 80


def test_nothing_is_taken_where_only_the_input_makes_it_unsure(stage):
    """Megohms at an input whose capacitance is not listed leave the margin open: no load does."""
    loop = stage("VIN in 0 AC 1\nR1 in n 1meg\nR2 n out 1meg\nXU1 0 n vp vn out TL072").loop
    assert loop.phase_margin is None
    assert loop.least_ohms is None


def test_a_margin_below_nothing_is_told_as_such(stage):
    """Two sections of 10 kilohm and 100 pF in a row behind the one pole: by hand, past half a turn.

    H = 1 / (1 + 3 x + x^2) with x = s R C, where |GBW / f| |H| is one.
    """
    cards = (
        "VIN in 0 SIN(0 1m 100)\nXU1 in m vp vn out FAST50\nR1 out a 10k\nC1 a 0 100p\n"
        "R2 a m 10k\nC2 m 0 99.99p"
    )

    def transmission(hertz):
        x = 2j * math.pi * hertz * 10e3 * 100e-12
        return 50e6 / (1j * hertz) / (1 + 3 * x + x**2)

    low, high = 1e5, 1e7
    while high / low > 1 + 1e-9:
        middle = math.sqrt(low * high)
        low, high = (middle, high) if abs(transmission(middle)) > 1 else (low, middle)
    loop = stage(cards, FAST).loop
    lag = math.degrees(cmath.phase(transmission(low)))
    assert lag > 0  # it has turned by more than half
    assert loop.crossover == pytest.approx(low, rel=1e-3)
    assert loop.phase_margin == pytest.approx(lag - 180, abs=0.1)


def test_a_trigger_in_an_outer_loop_amplifies_nothing(design):
    """Its output stands at a limit: ten times its gain would turn the other's loop round.

    What is left of the other's feedback is the divider of three equal resistors.
    """
    cards = (
        "VIN in 0 SIN(0 1 100)\nXU1 r 0 vp vn o1 TL072\nRB o1 r 100k\nRA o2 r 10k\nRF o2 n 10k\n"
        "RI in n 10k\nRX o1 n 10k\nXU2 0 n vp vn o2 TL072"
    )
    trigger, amplifier = (s.loop for s in design(cards).stages)
    assert (trigger.dc, amplifier.dc) == ("positive", "negative")
    assert amplifier.noise_gain_dc == pytest.approx(3.0, rel=1e-4)
    # 13.5 V through 100 kilohm against 10 kilohm
    assert trigger.thresholds.high == pytest.approx(1.35, rel=1e-3)


@pytest.mark.parametrize("device", ["XQ9981", "OPAMP"])
def test_a_device_without_a_figure_closes_its_loop_nowhere_known(stage, device):
    """However much the network takes, so that a gain of 200,000 alone would fall through one."""
    cards = f"VIN in 0 SIN(0 1m 100)\nXU1 in m vp vn out {device}\nR1 out m 1meg\nC1 m 0 1u"
    loop = stage(cards).loop
    assert (loop.crossover, loop.phase_margin) == (None, None)
    assert (loop.margins.low, loop.margins.high) == (None, None)


def test_the_capacitance_of_an_input_counts_at_the_first_net_too(stage):
    """10 pF of its own at the input of 100 kilohm: the order of the cards changes nothing."""
    own = FAST.replace("0.01e-12", "10e-12")
    cards = ["RF n out 100k", "CF n out 1.1p", "IPD 0 n SIN(0 1u 1k)", "XU1 0 n vp vn out FAST50"]
    first, last = (stage("\n".join(cards[::way]), own).loop for way in (1, -1))
    assert first.phase_margin == pytest.approx(last.phase_margin, abs=1e-6)
    # without it the loop would close at nearly 50 MHz with all of its margin
    assert first.noise_gain_crossover == pytest.approx(1 + 10 / 1.1, rel=0.05)
