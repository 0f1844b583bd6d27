"""Every number of a stage at the ends of its tolerances, by hand."""

import itertools
import math

import msgspec
import pytest

from railguard.reviewing import review
from tests.faults.generated import designs

INVERTING = "VIN in 0 SIN(0 0.5 1k)\nR1 in n 10k\nR2 n out 100k\nXU1 0 n vp vn out TL072"
SALLEN_KEY = (
    "VIN in 0 SIN(0 1 1k)\nR1 in a 11.25k\nR2 a p 11.25k\nC1 a out 2n\nC2 p 0 1n\n"
    "XU1 p out vp vn out TL072"
)


def test_gain_of_two_resistors(stage):
    """-10 with 1 % resistors: the quotient of what each can be."""
    found = stage(INVERTING)
    (net, worst), (_, nominal) = found.gain_worst[0], found.gain[0]
    assert net == "in"
    assert worst.low == pytest.approx(nominal * 1.01 / 0.99, rel=1e-5)
    assert worst.high == pytest.approx(nominal * 0.99 / 1.01, rel=1e-5)


def test_gain_of_coarse_resistors(stage):
    """1 + R2/R1 with 20 %: 1 + 0.8/1.2 to 1 + 1.2/0.8, which no derivative at 2 tells."""
    cards = "VIN in 0 SIN(0 0.5 1k)\nR1 n 0 10k tol=20%\nR2 n out 10k tol=20%\n"
    (_, worst), *_ = stage(cards + "XU1 in n vp vn out TL072").gain_worst
    assert worst.low == pytest.approx(1 + 0.8 / 1.2, rel=1e-4)
    assert worst.high == pytest.approx(1 + 1.2 / 0.8, rel=1e-4)


def test_gain_behind_a_capacitor_counts_in_mid_band(stage):
    """A coupling that is short at 1 kHz adds nothing to the resistors' 2 %."""
    cards = INVERTING.replace("R1 in n 10k", "C1 in m 10u\nR1 m n 10k")
    found = stage(cards)
    (_, worst), (_, nominal) = found.gain_worst[0], found.gain[0]
    assert worst.span / 2 == pytest.approx(0.02 * nominal, rel=0.01)


def test_noise_gain_and_bandwidth(stage):
    """11 = 1 + 10: the ten moves by 2 %, the bandwidth with it."""
    loop = stage(INVERTING).loop
    assert loop.noise_gain_worst.low == pytest.approx(1 + 10 * 0.99 / 1.01, rel=5e-5)
    assert loop.noise_gain_worst.high == pytest.approx(1 + 10 * 1.01 / 0.99, rel=5e-5)
    assert loop.crossover_worst.high == pytest.approx(loop.crossover * 11 / 10.8, rel=2e-3)
    assert loop.crossover_worst.low == pytest.approx(loop.crossover * 11 / 11.2, rel=2e-3)


def test_least_gain_bandwidth_product_counts(stage):
    """2 MHz at least of 4 MHz typical: half the bandwidth."""
    own = """
[[devices]]
family = "HALF"
technology = "cmos"
gain_bandwidth = { typical = 4e6, guaranteed = 2e6 }
names = { 1 = ["HALF"] }
source = { title = "made for this test" }
[tolerances]
resistor = "0 %"
"""
    loop = stage(INVERTING.replace("TL072", "HALF"), own).loop
    assert loop.crossover_worst.low == pytest.approx(loop.crossover / 2, rel=1e-6)
    assert loop.crossover_worst.high == pytest.approx(loop.crossover, rel=1e-6)


def test_filter_of_two_equal_resistors(stage):
    """Frequency ~ (R1 R2 C1 C2)^-1/2, Q ~ (C1 / C2)^1/2 and flat in equal resistors: exact ends."""
    found = stage(SALLEN_KEY).filter
    assert found.frequency_worst.low == pytest.approx(found.frequency / (1.01 * 1.1), rel=1e-3)
    assert found.frequency_worst.high == pytest.approx(found.frequency / (0.99 * 0.9), rel=1e-3)
    assert found.q_worst.low == pytest.approx(found.q * math.sqrt(0.9 / 1.1), rel=1e-3)
    assert found.q_worst.high == pytest.approx(found.q * math.sqrt(1.1 / 0.9), rel=1e-3)


def test_q_follows_the_resistors_that_set_the_gain(stage):
    """Equal parts and a gain K: Q = 1 / (3 - K), so dQ/Q = Q dK; K = 1.6 moves by 0.6 * 2 %."""
    cards = SALLEN_KEY.replace("2n", "1n").replace(
        "XU1 p out vp vn out", "RA n 0 10k\nRB n out 6k\nXU1 p n vp vn out"
    )
    found = stage(cards, '[tolerances]\ncapacitor = "0 %"').filter
    assert found.q == pytest.approx(1 / 1.4, rel=1e-3)
    gain_part = found.q * 0.6 * 0.02
    # dQ/dR of the two filter resistors: 0.5 - Q and Q - 0.5 per relative change, 1 % each.
    resistors = 2 * 0.01 * abs(found.q * 1.0 - 0.5)
    assert found.q_worst.span / 2 / found.q == pytest.approx(gain_part + resistors, rel=0.05)


def test_a_filter_behind_a_gain_has_its_own(design):
    """The follower in a Sallen-Key filter makes one of it, whatever stands in front."""
    cards = "VIN i 0 SIN(0 0.1 1k)\nRA i n 10k\nRB n in 100k\nXU0 0 n vp vn in TL072"
    behind = SALLEN_KEY.replace("VIN in 0 SIN(0 1 1k)\n", "")
    found = next(s.filter for s in design(f"{cards}\n{behind}").stages if s.designator == "XU1")
    assert found.gain == pytest.approx(1.0, rel=1e-3)
    assert found.gain_worst.span == pytest.approx(0.0, abs=1e-9)


def test_transfer_of_a_transimpedance_stage(stage):
    """1 V/uA of one resistor: 1 %."""
    found = stage("IIN 0 n SIN(0 1u 1k)\nR2 n out 1meg\nXU1 0 n vp vn out TL072")
    (net, nominal), (same, worst) = found.transfer[0], found.transfer_worst[0]
    assert net == same
    assert abs(nominal) == pytest.approx(1e6, rel=1e-3)
    assert worst.span / 2 == pytest.approx(0.01 * abs(nominal), rel=1e-3)


def test_slew_rate_of_a_gain(stage):
    """5 V at 1 kHz: 31.4 V/ms, and two resistors of 1 %."""
    output = stage(INVERTING).output
    assert output.slew == pytest.approx(2 * math.pi * 1e3 * 5, rel=1e-3)
    assert output.slew_worst.low == pytest.approx(output.slew * 0.99 / 1.01, rel=1e-5)
    assert output.slew_worst.high == pytest.approx(output.slew * 1.01 / 0.99, rel=1e-5)


def test_slew_rate_of_an_edge_that_is_turned_round(stage):
    """1 V in 10 us, ten times, downwards: the slope has no sign."""
    cards = INVERTING.replace("SIN(0 0.5 1k)", "PULSE(-0.5 0.5 0 10u 10u 50u 200u)")
    output = stage(cards).output
    assert output.slew == pytest.approx(1e6, rel=0.01)
    assert output.slew_worst.low == pytest.approx(output.slew * 0.99 / 1.01, rel=1e-3)
    assert output.slew_worst.high == pytest.approx(output.slew * 1.01 / 0.99, rel=1e-3)


def test_slew_rate_behind_a_low_pass_counts_where_it_is_steepest(stage):
    """A band up to five times the corner: the swing is largest at DC, the slope at the top."""
    cards = "R1 in p 10k\nC1 p 0 10n\nXU1 p out vp vn out TL072"
    top = 5 / (2 * math.pi * 1e-4)
    output = stage(cards, f'[signals]\n"in" = {{ peak = 1.0, to = {top} }}').output
    assert output.slew == pytest.approx(2 * math.pi * top / math.sqrt(26), rel=1e-3)
    low, high = (math.sqrt(26 / (1 + (5 * rc) ** 2)) for rc in (1.01 * 1.10, 0.99 * 0.90))
    assert output.slew_worst.low == pytest.approx(output.slew * low, rel=1e-4)
    assert output.slew_worst.high == pytest.approx(output.slew * high, rel=1e-4)


def test_slew_rate_of_two_tones(design):
    """1 V at 1 kHz times ten, 1 V at 10 kHz times one: each by its own resistor."""
    cards = (
        "V1 a 0 SIN(0 0.1 1k)\nV2 b 0 SIN(0 0.1 10k)\nR1 a n 10k tol=5%\nR2 b n 100k tol=1%\n"
        "RF n out 100k tol=0%\nXU1 0 n vp vn out TL072"
    )
    output = design(cards).stages[0].output
    first, second = 2 * math.pi * 1e3 * 1.0, 2 * math.pi * 1e4 * 0.1
    assert output.slew == pytest.approx(first + second, rel=1e-2)
    assert output.slew_worst.low == pytest.approx(first / 1.05 + second / 1.01, rel=1e-3)
    assert output.slew_worst.high == pytest.approx(first / 0.95 + second / 0.99, rel=1e-3)


def test_dissipation_at_the_ends_of_the_rails(stage):
    """An idle follower: quiescent current times the supply, 5 % either way."""
    found = stage("R1 p 0 10k\nXU1 p out vp vn out TL071")
    for figure, worst in (
        (found.dissipation, found.dissipation_worst),
        (found.junction - 25, msgspec.structs.replace(
            found.junction_worst, low=found.junction_worst.low - 25,
            high=found.junction_worst.high - 25,
        )),
    ):  # fmt: skip
        assert worst.low == pytest.approx(0.95 * figure, rel=1e-3)
        assert worst.high == pytest.approx(1.05 * figure, rel=1e-3)


def test_corner_of_a_coupling(stage):
    """1 / (2 pi RC): exact ends."""
    found = stage("VIN in 0 SIN(0 1 1k)\nC1 in p 100n\nR1 p 0 100k\nXU1 p out vp vn out TL072")
    assert found.high_pass == pytest.approx(1 / (2 * math.pi * 1e-2), rel=1e-3)
    assert found.high_pass_worst.low == pytest.approx(found.high_pass / (1.01 * 1.1), rel=2e-3)
    assert found.high_pass_worst.high == pytest.approx(found.high_pass / (0.99 * 0.9), rel=2e-3)


@pytest.mark.parametrize(
    ("cards", "of"),
    [
        # The divider holds beta of the output; the signal is on the other input.
        ("VIN in 0 SIN(0 2 100)\nR1 p 0 10k\nR2 p out 100k\nXU1 p in vp vn out TL072",
         lambda r1, r2, out: out * r1 / (r1 + r2)),
        # The signal comes through R1 against the output through R2.
        ("VIN in 0 SIN(0 2 100)\nR1 p in 10k\nR2 p out 100k\nXU1 p 0 vp vn out TL072",
         lambda r1, r2, out: -out * r1 / r2),
    ],
)  # fmt: skip
def test_thresholds_at_the_ends(stage, cards, of):
    """Schmitt triggers: every corner of 1 % resistors and 5 % rails, the offset beside it."""
    found = stage(cards)
    loop = found.loop
    offset = found.family.offset_voltage.best
    ends = []
    for limit, rail in ((13.5, 15.0), (-13.5, -15.0)):  # 1.5 V of drop without load
        values = [
            of(10e3 * a, 100e3 * b, limit + c * rail)
            for a in (0.99, 1.01) for b in (0.99, 1.01) for c in (-0.05, 0.05)
        ]  # fmt: skip
        ends.append((of(10e3, 100e3, limit), min(values), max(values)))
    scale = abs(of(10e3, 100e3, 1.0)) / abs(loop.beta_plus)
    for nominal, low, high in ends:
        threshold, worst = min(
            ((loop.thresholds.low, loop.lower_worst), (loop.thresholds.high, loop.upper_worst)),
            key=lambda pair: abs(pair[0] - nominal),
        )
        assert threshold == pytest.approx(nominal, rel=0.02)
        span = high - low + 2 * offset * scale
        assert worst.span == pytest.approx(span, rel=0.03)
        assert worst.low < threshold < worst.high


@pytest.mark.parametrize("cards", [INVERTING, SALLEN_KEY])
def test_every_number_has_its_ends(stage, cards):
    """Supply, output, current, inputs, gain, noise gain, bandwidth: low, nominal, high in order."""
    found = stage(cards)
    triples = [
        (found.supply.positive_worst.low, found.supply.positive, found.supply.positive_worst.high),
        (found.supply.negative_worst.low, found.supply.negative, found.supply.negative_worst.high),
        (found.output.worst.low, found.output.demand.low, found.output.demand.high),
        (found.output.demand.low, found.output.demand.high, found.output.worst.high),
        (found.inputs.worst.low, found.inputs.demand.low, found.inputs.demand.high),
        (found.inputs.demand.low, found.inputs.demand.high, found.inputs.worst.high),
        (0.0, found.current.demand_source, found.current.worst_source),
        (0.0, found.current.demand_sink, found.current.worst_sink),
        (found.gain_worst[0][1].low, found.gain[0][1], found.gain_worst[0][1].high),
        (found.loop.noise_gain_worst.low, found.loop.noise_gain_dc,
         found.loop.noise_gain_worst.high),
        (found.loop.crossover_worst.low, found.loop.crossover, found.loop.crossover_worst.high),
        (found.output.worst.low, found.output.rss.low, found.output.demand.low),
    ]  # fmt: skip
    for low, nominal, high in triples:
        assert low <= nominal * (1 + math.copysign(1e-9, nominal)) + 1e-12
        assert nominal <= high + 1e-9 * abs(high) + 1e-12


def test_a_multiple_feedback_band_pass_has_the_gain_of_its_middle(stage):
    """S. Franco's sizing: H0 = R3 / 2 R1 where both capacitors are one.

    At 20.4 kHz with a Q of 10.2; far below, where a signal of 1 kHz would be, it passes 0.05.
    """
    cards = (
        "VIN in 0 SIN(0 0.1 20k)\nR1 in a 7.87k\nR2 a {leg} 402\nC1 a out 1n\nC2 a n 1n\n"
        "R3 out n 160k\nXU1 0 n vp vn out TL072"
    )
    one = stage(cards.format(leg="0"))
    assert one.filter.gain == pytest.approx(160 / (2 * 7.87), rel=1e-3)
    assert one.gain == (("in", pytest.approx(160 / (2 * 7.87), rel=1e-3)),)
    # A reference under the small resistor brings no signal.
    two = stage(cards.format(leg="ref") + "\nVR ref 0 1")
    assert two.filter.gain == pytest.approx(160 / (2 * 7.87), rel=1e-3)


def test_a_multiple_feedback_low_pass_has_its_gain_at_dc(stage):
    """20 kilohm over 10 kilohm."""
    found = stage(
        "VIN in 0 SIN(0 1 1k)\nR1 in a 10k\nR2 a out 20k\nR3 a n 5k\nC1 a 0 10n\nC2 n out 1n\n"
        "XU1 0 n vp vn out TL072"
    ).filter
    assert (found.kind, found.gain) == ("low-pass", pytest.approx(2.0, rel=1e-6))


def test_what_no_signal_moves_has_no_corner(recwarn):
    """A reference's buffer under a coupled electrode: its output moves by 1e-20 V at most."""
    (made,) = designs(1, 70025)
    stages = review(made.text, plugins=False).designs[0].design.stages
    assert next(s.high_pass for s in stages if s.designator == "XU1A") is None
    assert not [w for w in recwarn if issubclass(w.category, RuntimeWarning)]


VERTICES = {
    "a tee in the feedback": (
        "VIN in 0 SIN(0 1m 1k)\nR1 in n {}\nR2 n t {}\nR3 t 0 {}\nR4 t out {}\n"
        "XU1 0 n vp vn out TL072",
        (10e3, 100e3, 1e3, 9e3),
    ),
    "a difference": (
        "VIN a 0 SIN(0 0.1 1k)\nR1 a n {}\nR2 n out {}\nR3 a p {}\nR4 p 0 {}\n"
        "XU1 p n vp vn out TL072",
        (10e3, 40e3, 10e3, 5e3),
    ),
    "a coupling near its corner": (
        "VIN in 0 SIN(0 0.1 1k)\nC1 in m {}\nR1 m n {}\nR2 n out {}\nXU1 0 n vp vn out TL072",
        (15e-9, 10e3, 100e3),
    ),
}


@pytest.mark.parametrize("name", VERTICES)
def test_ends_of_a_gain_and_a_slope_are_those_of_its_vertices(stage, name):
    """Every combination of elements 20 % off, each solved as a circuit of its own."""
    cards, values = VERTICES[name]
    share = 0.2
    gains, slopes = [], []
    for signs in itertools.product((-1, 1), repeat=len(values)):
        moved = (v * (1 + s * share) for v, s in zip(values, signs, strict=True))
        found = stage(cards.format(*moved))
        gains.append(found.gain[0][1])
        slopes.append(found.output.slew)
    stated = "[tolerances]\nresistor = 0.2\ncapacitor = 0.2"
    nominal = stage(cards.format(*values), stated)
    worst = nominal.gain_worst[0][1]
    assert (worst.low, worst.high) == pytest.approx((min(gains), max(gains)), rel=1e-3)
    slew = nominal.output.slew_worst
    assert (slew.low, slew.high) == pytest.approx((min(slopes), max(slopes)), rel=1e-3)


def test_ends_of_a_gain_near_a_resonance(stage):
    """A band of 1 kHz and a Q of 2 with capacitors of 10 %: nominal is near its peak.

    Derivatives at nominal say 1.92 to 2.09, and their corner 1.75 to 1.92.
    """
    values = {"R6": 15.8e3, "C3": 10e-9, "R7": 15.8e3, "C4": 10e-9, "R5": 50e3}
    cards = (
        "VIN in 0 SIN(0 1 1k)\nR1 in s 10k tol=0%\nR2 s hp 10k tol=0%\nR3 lp s 10k tol=0%\n"
        "R4 h 0 10k tol=0%\n"
        "R5 bp h {R5}\nXU1 h s vp vn hp TL072\nR6 hp i1 {R6}\nC3 i1 bp {C3}\n"
        "XU2 0 i1 vp vn bp TL072\nR7 bp i2 {R7}\nC4 i2 lp {C4}\nXU3 0 i2 vp vn lp TL072"
    )
    shares = {name: 0.1 if name[0] == "C" else 0.01 for name in values}
    found = []
    for signs in itertools.product((-1, 0, 1), repeat=len(values)):
        moved = {
            n: v * (1 + s * shares[n]) for (n, v), s in zip(values.items(), signs, strict=True)
        }
        found.append(stage(cards.format(**moved), name="XU2").gain[0][1])
    worst = stage(cards.format(**values), name="XU2").gain_worst[0][1]
    assert worst.low == pytest.approx(min(found), rel=1e-3)
    assert worst.high == pytest.approx(max(found), rel=0.015)
