"""Where loops close at the ends of their tolerances: formulas, ngspice, samples solved anew."""

import itertools
import math
import shutil

import msgspec
import numpy as np
import pytest

from railguard.analysis.closing import Seen, closings
from railguard.analysis.deviations import off_of
from railguard.analysis.loops import crossing, phase_margin
from railguard.analysis.margins import known_parasitics
from railguard.analysis.network import Network
from railguard.analysis.recognise import keeps_closed, recognise
from railguard.analysis.solve import return_ratios
from railguard.circuit.flatten import flatten
from railguard.deck.files import deck_from_text
from railguard.devices import catalogue
from railguard.engine.guard import TITLE
from railguard.engine.ngspice import find
from railguard.engine.requests import SmallSignal
from railguard.settings.file import parse
from tests.outside.test_random_networks import network as random_network

A0, GBW, RO, CIN = 1e5, 5e6, 150.0, 5e-12


def device(speed="", rest=""):
    """Return a device with all that a phase margin hangs on listed."""
    return f"""
[[devices]]
family = "LISTED"
technology = "cmos"
open_loop_gain = {{ typical = {A0} }}
gain_bandwidth = {{ typical = {GBW}{speed} }}
input_capacitance = {{ typical = {CIN} }}
output_resistance = {{ typical = {RO} }}
names = {{ 1 = ["LISTED"] }}
source = {{ title = "made for this test" }}
{rest}
"""


R1, R2, CL = 10e3, 20e3, 2e-9
LOADED = (
    f"VIN in 0 SIN(0 0.1 10k)\nR1 in n {R1}\nR2 n out {R2}\nCL out 0 {CL}\nXU1 0 n vp vn out LISTED"
)


def transmission(hertz, r1, r2, load, gbw=GBW):
    """Return T of the inverting stage by hand: a pole behind RO, then the divider with CIN."""
    s = 2j * np.pi * hertz
    a = 1 / (1 / A0 + 1j * hertz / gbw)
    at_input = 1 / (1 / r1 + s * CIN)
    seen = 1 / (s * load + 1 / (r2 + at_input))
    return a * seen / (seen + RO) * at_input / (r2 + at_input)


def closed(*values, of=transmission):
    """Return (hertz, degrees) where |T| is one, by bisection."""
    low, high = 1e3, 1e8
    for _ in range(80):
        middle = np.sqrt(low * high)
        above = abs(of(middle, *values)) >= 1
        low, high = (middle, high) if above else (low, middle)
    return low, 180 + np.degrees(np.angle(of(low, *values)))


def vertices(*speeds):
    """Return every corner of 1 % resistors, a 10 % capacitor and the speeds given."""
    return itertools.product(
        (0.99 * R1, 1.01 * R1), (0.99 * R2, 1.01 * R2), (0.9 * CL, 1.1 * CL), speeds
    )


@pytest.mark.parametrize(
    ("speed", "speeds"), [("", (GBW,)), (", guaranteed = 2.5e6", (GBW / 2, GBW))]
)
def test_capacitive_load_has_the_ends_of_its_corners(stage, speed, speeds):
    """Inverting stage with 2 nF at its output: all corners by hand, the product halved or not."""
    loop = stage(LOADED, device(speed)).loop
    hertz, margin = closed(R1, R2, CL, GBW)
    assert loop.crossover == pytest.approx(hertz, rel=1e-6)
    assert loop.phase_margin == pytest.approx(margin, abs=1e-3)
    corners = np.array([closed(*values) for values in vertices(*speeds)])
    (slow, least), (fast, most) = corners.min(axis=0), corners.max(axis=0)
    assert loop.crossover_worst.low == pytest.approx(slow, rel=1e-3)
    assert loop.crossover_worst.high == pytest.approx(fast, rel=1e-3)
    span = most - least
    assert loop.phase_margin_worst.low == pytest.approx(least, abs=0.005 * span)
    assert loop.phase_margin_worst.high == pytest.approx(most, abs=0.005 * span)


def test_the_textbooks_formula(stage):
    """A follower with RO and CL alone: PM = 90 - atan(2 pi f RO CL), f where f sqrt(1 + ..) = GBW.

    Source  S. Franco, Design with Operational Amplifiers, 3rd ed., ch. 8, capacitive loading; the
            ends are the two of the only tolerance, 10 % of CL
    """
    text = device().replace(f"{CIN}", "1e-14")
    loop = stage("VIN in 0 SIN(0 1 1k)\nCL out 0 1n\nXU1 in out vp vn out LISTED", text).loop

    def degrees(load):
        pole = 1 / (2 * np.pi * RO * load)
        # x = (f / pole)^2 solves x (1 + x) = (GBW / pole)^2.
        x = (-1 + np.sqrt(1 + 4 * (GBW / pole) ** 2)) / 2
        return 90 - np.degrees(np.arctan(np.sqrt(x)))

    assert loop.phase_margin == pytest.approx(degrees(1e-9), abs=0.01)
    assert loop.phase_margin_worst.low == pytest.approx(degrees(1.1e-9), abs=0.01)
    assert loop.phase_margin_worst.high == pytest.approx(degrees(0.9e-9), abs=0.01)


def test_gains_in_band_have_their_ends(stage):
    """Loop gain and noise gain at 10 kHz, the top of the band: all corners by hand."""
    loop = stage(LOADED, device(", guaranteed = 4e6")).loop
    sizes = [abs(transmission(1e4, *values)) for values in vertices(0.8 * GBW, GBW)]
    assert loop.loop_gain == pytest.approx(abs(transmission(1e4, R1, R2, CL)), rel=1e-6)
    assert loop.loop_gain_worst.low == pytest.approx(min(sizes), rel=1e-3)
    assert loop.loop_gain_worst.high == pytest.approx(max(sizes), rel=1e-3)
    gain = abs(1 / (1 / A0 + 1j * 1e4 / GBW))
    sizes = [gain / abs(transmission(1e4, *values)) for values in vertices(GBW)]
    assert loop.in_band_worst.low == pytest.approx(min(sizes), rel=1e-3)
    assert loop.in_band_worst.high == pytest.approx(max(sizes), rel=1e-3)


def test_noise_gain_at_the_crossover_leaves_its_own_speed_out(stage):
    """What the network makes of it: |A| where the loop closes, the product as it is."""
    loop = stage(LOADED, device(", guaranteed = 2.5e6")).loop
    hertz = [closed(*values)[0] for values in vertices(GBW)]
    gains = [abs(1 / (1 / A0 + 1j * f / GBW)) for f in hertz]
    assert loop.at_crossover_worst.low == pytest.approx(min(gains), rel=1e-3)
    assert loop.at_crossover_worst.high == pytest.approx(max(gains), rel=1e-3)


def transimpedance(hertz, cf):
    """Return T of a transimpedance stage by hand: 100 kilohm and CF, 20 pF and CIN, RO of 200."""
    s = 2j * np.pi * hertz
    back, down = 1 / 100e3 + s * cf, s * (20e-12 + CIN)
    through = back * down / (back + down)
    return 1 / (1 / A0 + 1j * hertz / 50e6) / (1 + 200 * through) * back / (back + down)


def test_a_margin_that_turns_round_has_its_extreme_inside(stage):
    """Just below the CF of most margin: both ends of 20 % are worse than what lies between."""
    tried = np.linspace(0.5e-12, 12e-12, 400)
    peak = tried[np.argmax([closed(cf, of=transimpedance)[1] for cf in tried])]
    assert tried[0] < peak < tried[-1]
    nominal = 0.95 * peak
    around = [
        closed(cf, of=transimpedance)[1] for cf in np.linspace(0.8 * nominal, 1.2 * nominal, 201)
    ]
    assert max(around[0], around[-1]) < max(around)
    own = device(rest='[tolerances]\nresistor = "0 %"')
    own = own.replace(f"{RO}", "200.0").replace(f"{GBW}", "50e6")
    cards = (
        f"IPD 0 n SIN(0 1u 1k)\nRF n out 100k\nCF n out {nominal} tol=20%\nCT n 0 20p tol=0%\n"
        "XU1 0 n vp vn out LISTED"
    )
    loop = stage(cards, own).loop
    span = max(around) - min(around)
    assert loop.phase_margin_worst.high == pytest.approx(max(around), abs=0.05 * span)
    assert loop.phase_margin_worst.low == pytest.approx(min(around), abs=0.005 * span)


def test_an_unlisted_figure_leaves_no_ends(stage):
    """TL072 lists no output resistance: with 2 nF no phase margin, and no ends of it."""
    loop = stage(LOADED.replace("LISTED", "TL072")).loop
    assert loop.phase_margin is None
    assert (loop.phase_margin_worst.low, loop.phase_margin_worst.high) == (None, None)
    assert loop.crossover_worst.low < loop.crossover < loop.crossover_worst.high


def test_noise_gain_where_two_amplifiers_share_a_network(design):
    """Instrumentation pair, 1 + 2 * 20k / 2k = 21, half of it over the other one: 2 % of 20."""
    cards = (
        "V1 a 0 SIN(0 10m 10)\nV2 b 0 0\nRG m n 2k\nRA m o1 20k\nRB n o2 20k\n"
        "XU1 a m vp vn o1 TL072\nXU2 b n vp vn o2 TL072"
    )
    loop = design(cards).stages[0].loop
    ratios = [1 + 20e3 * x / (2e3 * y) for x in (0.99, 1.01) for y in (0.99, 1.01)]
    assert loop.noise_gain_dc == pytest.approx(11, rel=1e-3)
    assert loop.noise_gain_worst.low == pytest.approx(min(ratios), rel=2e-3)
    assert loop.noise_gain_worst.high == pytest.approx(max(ratios), rel=2e-3)


def test_noise_gain_of_a_stage_that_another_one_holds(design):
    """A composite amplifier's outer one, over the inner follower: 1 + 9 k / 1 k."""
    cards = (
        "VIN in 0 SIN(0 0.1 1k)\nR1 n 0 1k\nR2 n out 9k\nXU1 in n vp vn a TL072\n"
        "XU2 a out vp vn out NE5532\nRL out 0 2k"
    )
    loop = next(s for s in design(cards).stages if s.designator == "XU1").loop
    assert loop.holds == ("XU2",)
    assert loop.noise_gain_worst.low == pytest.approx(1 + 9 * 0.99 / 1.01, rel=2e-3)
    assert loop.noise_gain_worst.high == pytest.approx(1 + 9 * 1.01 / 0.99, rel=2e-3)


@pytest.mark.skipif(shutil.which("ngspice") is None, reason="ngspice is not installed")
def test_corners_solved_by_ngspice(stage):
    """The broken loop at every corner of R1, R2, CL: v(n) for one volt behind RO, times A."""
    loop = stage(LOADED, device()).loop
    found = []
    for r1, r2, load, _ in vertices(GBW):
        cards = [
            TITLE, "VB x 0 0 AC 1", f"RO x out {RO}", f"CL out 0 {load}", f"R2 n out {r2}",
            f"R1 n 0 {r1}", f"CN n 0 {CIN}",
        ]  # fmt: skip
        (plot,) = find().run("\n".join(cards), SmallSignal(2000, 1e5, 1e7)).plots
        hertz = np.real(plot.vectors["frequency"])
        t = np.array(plot.vectors["v(n)"]) / (1 / A0 + 1j * hertz / GBW)
        at = crossing(hertz, np.abs(t))
        found.append((at, phase_margin(hertz, t, at)))
    (slow, least), (fast, most) = np.min(found, axis=0), np.max(found, axis=0)
    assert loop.crossover_worst.low == pytest.approx(slow, rel=1e-4)
    assert loop.crossover_worst.high == pytest.approx(fast, rel=1e-4)
    assert loop.phase_margin_worst.low == pytest.approx(least, abs=0.005 * (most - least))
    assert loop.phase_margin_worst.high == pytest.approx(most, abs=0.005 * (most - least))


def ratios(networks, index, hertz):
    """Return T of one amplifier in many networks, each at its own frequency, from scratch."""
    first = networks[0]
    amplifier = first.amplifiers[index]
    matrices = np.stack([n.g for n in networks]) + (
        2j * np.pi * hertz[:, None, None] * np.stack([n.c for n in networks])
    )
    unit = np.zeros((len(networks), first.size, 1), dtype=complex)
    unit[:, first.outputs[amplifier.designator]] = 1.0
    x = np.linalg.solve(matrices, unit)[:, :, 0]
    z = x[:, first.row(amplifier.plus)] - x[:, first.row(amplifier.minus)]
    return -z / (1 + z)


def sampled(networks, index, near):
    """Return (hertz, degrees) where a loop closes last in each network."""
    grid = np.geomspace(near / 4, near * 4, 25)
    sizes = np.array([np.abs(ratios(networks, index, np.full(len(networks), f))) for f in grid])
    falls = (sizes[:-1] >= 1) & (sizes[1:] < 1)
    last = len(grid) - 2 - np.argmax(falls[::-1], axis=0)
    low, high = grid[last], grid[last + 1]
    for _ in range(20):
        middle = np.sqrt(low * high)
        above = np.abs(ratios(networks, index, middle)) >= 1
        low, high = np.where(above, middle, low), np.where(above, high, middle)
    return low, 180 + np.degrees(np.angle(ratios(networks, index, low)))


SAMPLES = 60


@pytest.mark.parametrize("seed", range(8))
def test_no_sample_of_a_random_network_leaves_its_ends(seed):
    """Three amplifiers over a ladder and a bridge: bandwidth and phase margin of each.

    Every sample is a circuit with other values, stamped and solved from scratch. None leaves the
    interval by more than 0.5 % of its range; together they fill most of it.
    """
    random = np.random.default_rng(seed)
    cards = [card.replace("POLE1", "LISTED") for card in random_network(seed)[0]]
    if seed % 2:
        cards += [f"CL{k} o{k} 0 {10 ** random.uniform(-11, -8.5):.3g}" for k in range(3)]
    if seed % 3 == 0:
        cards.append(f"RZ o2 n0 {10 ** random.uniform(5, 6):.3g}")
    settings = parse(device(), "railguard.toml")
    devices = catalogue.load(settings.devices)
    text = "\n".join(["title", *cards, "VP vp 0 15", "VN vn 0 -15", ""])
    circuit = flatten(deck_from_text(text), keeps_closed(devices))
    amplifiers = recognise(circuit, devices, settings).amplifiers
    extra = known_parasitics(amplifiers)
    shares = {
        e.designator: {"R": 0.02, "C": 0.10}[e.kind]
        for e in circuit.elements
        if e.kind in ("R", "C")
    }

    def drawn():
        elements = [
            msgspec.structs.replace(
                e, value=e.value * (1 + random.uniform(-1, 1) * shares[e.designator])
            )
            if e.designator in shares
            else e
            for e in circuit.elements
        ]
        return Network(elements, amplifiers, extra=extra)

    nominal = Network(circuit.elements, amplifiers, extra=extra)
    hertz = np.geomspace(1e2, 1e8, 300)
    t = return_ratios(nominal, hertz)
    seen = {}
    for k in range(len(amplifiers)):
        at = crossing(hertz, np.abs(t[:, k]))
        if at is not None:
            seen[k] = Seen(at, phase_margin(hertz, t[:, k], at), sure=True)
    found = closings(nominal, off_of(nominal, shares), seen)
    assert found
    assert found.keys() == seen.keys()
    networks = [drawn() for _ in range(SAMPLES)]
    for k, closing in found.items():
        at, degrees = sampled(networks, k, closing.hertz)
        degrees = degrees - 360 * np.round((degrees - closing.margin) / 360)
        for worst, values in ((closing.hertz_worst, at), (closing.margin_worst, degrees)):
            slack = 0.005 * worst.span
            assert worst.low - slack <= values.min()
            assert values.max() <= worst.high + slack
            assert np.ptp(values) > 0.3 * worst.span


@pytest.mark.filterwarnings("error")
@pytest.mark.parametrize("share", ["99.9%", "50%", "0%"])
def test_a_tolerance_beyond_reason_is_no_fault(stage, share):
    """A loop that stops closing on the way has no ends; its nominal figures stand."""
    own = device(rest=f'[tolerances]\nresistor = "{share}"\ncapacitor = "{share}"')
    loop = stage(LOADED, own).loop
    assert loop.crossover == pytest.approx(closed(R1, R2, CL, GBW)[0], rel=1e-6)
    for worst, nominal in (
        (loop.crossover_worst, loop.crossover),
        (loop.phase_margin_worst, loop.phase_margin),
        (loop.loop_gain_worst, loop.loop_gain),
    ):
        assert (worst.low is None) == (worst.high is None)
        if worst.low is not None:
            slack = 1e-9 * abs(nominal)
            assert worst.low - slack <= nominal <= worst.high + slack


MARGIN = (
    "VIN in 0 SIN(0 1m 100)\nR1 in n 10k tol=0%\nR2 n out 10k tol=0%\nRX n x 500 tol=0%\n"
    "CX x 0 {farads} tol={share}%\nXU1 0 n vp vn out FAST"
)
RESONANCE = (
    "VIN in 0 SIN(0 1m 10k)\nR1 n 0 1meg tol=0%\nR2 n out 10k tol=0%\nRX n x {ohms} tol=0%\n"
    "LX x y 15.915494m tol=0%\nCX y 0 {farads} tol={share}%\nXU1 in n vp vn out FAST"
)
QUICK = """
[[devices]]
family = "FAST"
technology = "cmos"
gain_bandwidth = { typical = 50e6 }
input_capacitance = { typical = 0.01e-12 }
output_resistance = { typical = 0.1 }
names = { 1 = ["FAST"] }
source = { title = "made for this test" }
"""


@pytest.mark.parametrize("picofarads", [10, 16, 20])
def test_a_margin_that_turns_round_inside_a_tolerance(stage, picofarads):
    """A lag between 2.27 and 25 MHz takes most where the loop closes between them.

    The capacitor that does so lies inside its 50 %, and no corner shows it: solved at 41 values.
    """
    farads = picofarads * 1e-12
    solved = [
        stage(MARGIN.format(farads=farads * (0.5 + k / 40), share=0), QUICK).loop.phase_margin
        for k in range(41)
    ]
    worst = stage(MARGIN.format(farads=farads, share=50), QUICK).loop.phase_margin_worst
    assert min(solved) < min(solved[0], solved[-1]) - 0.05
    assert min(solved) - 0.6 < worst.low < min(solved) + 0.05
    assert worst.high == pytest.approx(max(solved), abs=0.01)


@pytest.mark.parametrize("ohms", [500, 1000])
@pytest.mark.parametrize("detuned", [0.8, 0.9, 1.0, 1.1])
def test_a_noise_gain_with_a_peak_inside_a_tolerance(stage, ohms, detuned):
    """A series resonance at the inverting input, by hand: 1 + R2 over its resistance at the top.

    At the edge of 40 % it is lowest on the side that the slope at nominal does not point to.
    """
    top, henry = 10e3, 15.915494e-3
    farads = detuned / ((2 * math.pi * top) ** 2 * henry)

    def noise_gain(value):
        leg = ohms + 1j * (2 * math.pi * top * henry - 1 / (2 * math.pi * top * value))
        return abs(1 + 10e3 / leg + 10e3 / 1e6)

    loop = stage(RESONANCE.format(farads=farads, share=40, ohms=ohms), QUICK).loop
    assert loop.noise_gain == pytest.approx(noise_gain(farads), rel=1e-3)
    ends = [noise_gain(farads * 0.6), noise_gain(farads * 1.4)]
    assert loop.in_band_worst.low == pytest.approx(min(ends), rel=1e-3)
    peak = 1 + 10e3 / ohms
    assert 0.999 * peak < loop.in_band_worst.high < 1.12 * peak
