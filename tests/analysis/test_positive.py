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
