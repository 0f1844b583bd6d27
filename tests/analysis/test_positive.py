"""What a positive loop is judged by, by hand: what drives it, what it feeds, its capacitor."""

import pytest

SUPPLY = "VP vp 0 12\nVN vn 0 -12\n"
INVERTING = "VIN in 0 SIN(0 2 100)\nR1 p 0 10k\nR2 p out 100k\nXU1 p in vp vn out TL072"
OTHER_END = "VIN in 0 SIN(1 3 100)\nVR r 0 1\nR1 p in 10k\nR2 p out 100k\nXU1 p r vp vn out TL072"
SUM = (
    "VA a 0 SIN(0 2 100)\nVB b 0 SIN(0 1 100)\nRA a p 10k\nRB b p 10k\nR2 p out 50k\n"
    "XU1 p 0 vp vn out TL072"
)
COUPLED = (
    "VIN in 0 SIN(0 2 1k)\nC1 in m 10u\nRM m 0 100k\nR1 p 0 10k\nR2 p out 100k\n"
    "XU1 p m vp vn out TL072"
)


def judged(stage, cards, **named):
    """Return the loop of a comparator on ±12 V."""
    return stage(f"{cards}\nRL out 0 1meg", supply=SUPPLY, **named).loop


@pytest.mark.parametrize(
    ("cards", "low", "high"),
    [
        (INVERTING, -2.0, 2.0),
        (OTHER_END, -2.0, 4.0),  # in volts of the source, not of the divided pin
        (COUPLED, -2.0, 2.0),  # nothing of it arrives at DC: as at the pin
        # two signals at once have no one source: 5/11 of each arrive at the pin
        (SUM, -3 * 5 / 11, 3 * 5 / 11),
    ],
)
def test_what_drives_it_is_the_signal_s_own_range(stage, cards, low, high):
    """The stage's own swing, which the divider brings back, is no signal."""
    drive = judged(stage, cards).drive
    assert (drive.low, drive.high) == (
        pytest.approx(low, rel=0.01, abs=0.01), pytest.approx(high, rel=0.01),
    )  # fmt: skip


def test_thresholds_of_two_signals_stand_at_the_pin(stage):
    """10.5 V come back through 50 kilohm against 5 kilohm: 1/11 of them, round ground."""
    loop = judged(stage, SUM)
    assert loop.thresholds.high == pytest.approx(10.5 / 11, rel=0.01)
    assert loop.thresholds.low == pytest.approx(-10.5 / 11, rel=0.01)


@pytest.mark.parametrize(
    ("card", "found"),
    [
        ("C9 p out 100p", "C9"),
        ("C9 out p 100p", "C9"),
        ("C9 p 0 100p", ""),
        ("R9 p out 1meg", ""),
        ("C9 in out 100p", ""),
        ("", ""),
    ],
)
def test_a_capacitor_across_the_positive_path(stage, card, found):
    """From the output to the non-inverting input, either way round."""
    assert judged(stage, f"{INVERTING}\n{card}").capacitor_across_plus == found


@pytest.mark.parametrize(
    ("cards", "linear"),
    [
        ("R5 out m 10k\nR6 m o2 10k\nXU2 0 m vp vn o2 TL072", True),
        ("R5 x m 10k\nR6 m o2 10k\nXU2 0 m vp vn o2 TL072\nVX x 0 1", False),
        ("R5 out m 10k\nR6 m o2 10k\nXU2 m 0 vp vn o2 TL072", False),  # it switches as well
        ("", False),
    ],
)
def test_whether_a_linear_stage_stands_behind_it(stage, cards, linear):
    """One that its output reaches and that works as an amplifier."""
    assert judged(stage, f"{INVERTING}\n{cards}").feeds_linear is linear


def test_a_negative_loop_has_none_of_it(stage):
    """Thresholds are of what switches."""
    loop = stage("VIN in 0 SIN(0 1 100)\nXU1 in out vp vn out TL072\nRL out 0 10k").loop
    assert (loop.beta_plus, loop.thresholds.low, loop.drive.high) == (None, None, None)


BARE = """
[[devices]]
family = "BARE"
technology = "cmos"
names = { 1 = ["BARE"] }
source = { title = "made for this test: it swings to a volt from its rails and has no errors" }
"""


@pytest.mark.parametrize(
    ("cards", "low", "high", "low_off", "high_off"),
    [
        # V = 1.1 r - 0.1 out: two resistors of 1 %, and a tenth of what 5 % do to a rail of 12 V
        (
            "VIN in 0 SIN(1 3 100)\nVR r 0 2\nR1 p in 10k\nR2 p out 100k\nXU1 p r vp vn out BARE",
            (2.2 - 1.1), (2.2 + 1.1), (11 - 2) * 0.1 * 0.02 + 0.06, (11 + 2) * 0.1 * 0.02 + 0.06,
        ),
        # V = r + (out - r) / 11: ten elevenths of both resistors, an eleventh of the rail
        (
            "VIN in 0 SIN(1 3 100)\nVR r 0 2\nR1 p r 10k\nR2 p out 100k\nXU1 p in vp vn out BARE",
            2 - 13 / 11, 2 + 9 / 11, 13 / 11 * 0.2 / 11 + 0.6 / 11, 9 / 11 * 0.2 / 11 + 0.6 / 11,
        ),
        # as at the pin: 5 kilohm of two against 50 kilohm
        (SUM.replace("TL072", "BARE"), -1.0, 1.0, 0.2 / 11 + 0.6 / 11, 0.2 / 11 + 0.6 / 11),
    ],
)  # fmt: skip
def test_how_far_each_threshold_may_be_off(stage, cards, low, high, low_off, high_off):
    """By the derivative of the threshold's own formula; 11 V out of a rail of 12 V."""
    loop = judged(stage, cards, settings=BARE)
    for at, worst, volts, off in (
        (loop.thresholds.low, loop.lower_worst, low, low_off),
        (loop.thresholds.high, loop.upper_worst, high, high_off),
    ):
        assert at == pytest.approx(volts, rel=1e-3)
        assert worst.low == pytest.approx(volts - off, rel=1e-3)
        assert worst.high == pytest.approx(volts + off, rel=1e-3)


def test_a_signal_at_the_first_net_is_a_signal(stage):
    """The order of the cards changes nothing."""
    first, second, *rest = OTHER_END.splitlines()[::-1]
    turned = "\n".join([second, first, *rest])
    assert turned.splitlines()[0].startswith("R2 p")
    assert judged(stage, turned) == judged(stage, OTHER_END)


def test_a_device_nobody_knows_has_thresholds_without_an_offset(stage):
    """11 V of 12 by common practice, an eleventh of it comes back."""
    loop = judged(stage, INVERTING.replace("TL072", "XQ9981"))
    assert (loop.thresholds.low, loop.thresholds.high) == (
        pytest.approx(-1.0, rel=1e-3), pytest.approx(1.0, rel=1e-3),
    )  # fmt: skip


def test_without_a_signal_the_thresholds_are_those_of_the_inverting_input(stage):
    """An eleventh of 10.5 V round what the divider stands on, whatever the other input holds."""
    cards = "VR in 0 1\nVD d 0 3\nR1 p d 10k\nR2 p out 100k\nXU1 p in vp vn out TL072"
    loop = judged(stage, cards)
    assert loop.thresholds.low == pytest.approx(3 * 10 / 11 - 10.5 / 11, rel=1e-3)
    assert loop.thresholds.high == pytest.approx(3 * 10 / 11 + 10.5 / 11, rel=1e-3)


def test_what_another_stage_switches_counts_from_the_middle_of_its_range(design):
    """On 5 V, a comparator before a comparator: 1 to 4 V arrive, V = 1.1 r - 0.1 out."""
    cards = (
        "VIN in 0 SIN(2 2 100)\nVR r 0 2.5\nXU1 r in vp 0 a BARE\nR1 p a 10k\nR2 p out 100k\n"
        "XU2 p r vp 0 out BARE\nRL out 0 1meg"
    )
    loop = design(cards, BARE, supply="VP vp 0 5\n").stages[1].loop
    assert (loop.thresholds.low, loop.thresholds.high) == (
        pytest.approx(2.75 - 0.4, rel=1e-3), pytest.approx(2.75 - 0.1, rel=1e-3),
    )  # fmt: skip
    assert (loop.drive.low, loop.drive.high) == (
        pytest.approx(1.0, rel=1e-3), pytest.approx(4.0, rel=1e-3),
    )  # fmt: skip


def test_a_wire_back_to_the_input_is_a_path_without_a_capacitor(stage):
    """Nothing else is on that net."""
    loop = stage("VIN in 0 SIN(0 2 100)\nXU1 out in vp vn out TL072", supply=SUPPLY).loop
    assert (loop.dc, loop.beta_plus, loop.capacitor_across_plus, loop.switched) == (
        "positive", pytest.approx(1.0), "", False,
    )  # fmt: skip


@pytest.mark.parametrize(
    ("level", "peak", "reference", "switched"),
    [
        # thresholds at an eleventh of 10.5 V: 0.955 V either way, cleared by a tenth of 1.909 V
        (0, 1.2, 0, True),
        (0, 1.1, 0, False),
        (0.5, 1.2, 0, False),
        (0.4, 1.2, 0, False),  # -0.8 V
        (-0.5, 1.2, 0, False),
        # the same round ten elevenths of the reference
        (30 / 11, 1.2, 3, True),
        (30 / 11, 1.1, 3, False),
        (-30 / 11, 1.2, -3, True),
    ],
)
def test_a_signal_that_switches_clears_both_thresholds(stage, level, peak, reference, switched):
    """By a tenth of the hysteresis, on either side."""
    cards = INVERTING.replace("SIN(0 2", f"SIN({level} {peak}").replace("R1 p 0", "R1 p d")
    assert judged(stage, f"{cards}\nVD d 0 {reference}").switched is switched


def test_a_pair_of_followers_before_it_is_no_second_signal(design):
    """A boosted follower before it: thresholds in volts of its source, a tenth of 13.5 V."""
    cards = (
        "VIN in 0 SIN(0 3 100)\nXU1 in e vp vn o TL072\nQ1 vp o e QN\nQ2 vn o e QP\nR1 p e 10k\n"
        "R2 p out 100k\nXU2 p 0 vp vn out TL072\nRL out 0 1meg\n"
        ".model QN NPN(BF=100)\n.model QP PNP(BF=60)"
    )
    loop = design(cards).stages[1].loop
    assert (loop.thresholds.low, loop.thresholds.high) == (
        pytest.approx(-1.35, rel=1e-3), pytest.approx(1.35, rel=1e-3),
    )  # fmt: skip
    assert (loop.drive.low, loop.drive.high) == (
        pytest.approx(-3.0, rel=1e-3), pytest.approx(3.0, rel=1e-3),
    )  # fmt: skip
    assert loop.switched
