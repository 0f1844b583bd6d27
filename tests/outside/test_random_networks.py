"""The linear solver against ngspice on random networks.

Ladders, bridges and chains of op-amp stages with random values. The amplifiers are the same in
both: for ngspice a voltage-controlled source with one pole behind it, for railguard a device of
that open-loop gain and gain-bandwidth product. Every amplifier's output voltage and current must
agree within 0.1 %, at DC and at a signal frequency.
"""

import shutil

import numpy as np
import pytest

from railguard.analysis.network import Network
from railguard.analysis.ranges import answer
from railguard.analysis.recognise import keeps_closed, recognise
from railguard.analysis.signals import prepare
from railguard.analysis.solve import factor
from railguard.circuit.flatten import flatten
from railguard.deck.files import deck_from_text
from railguard.devices import catalogue
from railguard.engine.guard import TITLE
from railguard.engine.ngspice import find
from railguard.engine.requests import OperatingPoint, SmallSignal
from railguard.reviewing import review
from railguard.settings.file import parse

pytestmark = pytest.mark.skipif(shutil.which("ngspice") is None, reason="ngspice is not installed")

GAIN, GBW = 1e5, 2e6
DEVICE = f"""
[[devices]]
family = "POLE1"
technology = "cmos"
open_loop_gain = {{ typical = {GAIN} }}
gain_bandwidth = {{ typical = {GBW} }}
names = {{ 1 = ["POLE1"] }}
source = {{ title = "made for this test" }}
"""
# A pole of one ohm and C farads; the output source follows it.
POLE = GAIN / (2 * np.pi * GBW)
STAGES = 3
HERTZ = 3e3


def _value(random, low, high):
    return float(f"{10 ** random.uniform(np.log10(low), np.log10(high)):.3g}")


def network(seed):
    """Return (cards with X devices, cards for ngspice, number of amplifiers)."""
    random = np.random.default_rng(seed)
    shared = [f"V1 s0 0 {random.uniform(-1, 1):.4g} AC 1", f"V2 t0 0 {random.uniform(-1, 1):.4g}"]
    at, other = "s0", "t0"
    for rung in range(random.integers(1, 4)):
        shared.append(f"RL{rung} {at} s{rung + 1} {_value(random, 100, 1e4)}")
        shared.append(f"RP{rung} s{rung + 1} 0 {_value(random, 1e3, 1e5)}")
        shared.append(f"CP{rung} s{rung + 1} 0 {_value(random, 1e-11, 1e-8)}")
        at = f"s{rung + 1}"
    shared.append(f"RB1 {at} b1 {_value(random, 1e3, 1e4)}")
    shared.append(f"RB2 b1 0 {_value(random, 1e3, 1e4)}")
    shared.append(f"RB3 {other} b2 {_value(random, 1e3, 1e4)}")
    shared.append(f"RB4 b2 0 {_value(random, 1e3, 1e4)}")
    shared.append(f"RB5 b1 b2 {_value(random, 1e3, 1e5)}")
    amplifiers = []
    source, second = "b1", "b2"
    for k in range(STAGES):
        out, n, p = f"o{k}", f"n{k}", f"p{k}"
        shared.append(f"RF{k} {n} {out} {_value(random, 2e3, 1e5)}")
        shared.append(f"RG{k} {source} {n} {_value(random, 2e3, 2e4)}")
        shared.append(f"RI{k} {second} {p} {_value(random, 1e3, 2e4)}")
        shared.append(f"RJ{k} {p} 0 {_value(random, 1e3, 2e4)}")
        shared.append(f"RO{k} {out} 0 {_value(random, 500, 1e4)}")
        if random.random() < 0.6:
            shared.append(f"CF{k} {n} {out} {_value(random, 1e-11, 1e-8)}")
        amplifiers.append((p, n, out))
        second, source = source, out
    xs = [f"XU{k} {p} {n} vp vn {o} POLE1" for k, (p, n, o) in enumerate(amplifiers)]
    models = []
    for k, (p, n, o) in enumerate(amplifiers):
        models += [
            f"G{k} 0 g{k} {p} {n} {GAIN}",
            f"RA{k} g{k} 0 1",
            f"CA{k} g{k} 0 {POLE:.9g}",
            f"E{k} {o}x 0 g{k} 0 1",
            f"VS{k} {o}x {o} 0",
        ]
    return [*shared, *xs], [*shared, *models]


def solved(cards):
    """Return railguard's (DC, complex AC) of output voltage and current, shape (amplifiers, 2)."""
    settings = parse(DEVICE, "railguard.toml")
    devices = catalogue.load(settings.devices)
    text = "title\n" + "\n".join(cards) + "\nVP vp 0 15\nVN vn 0 -15\n"
    circuit = flatten(deck_from_text(text), keeps_closed(devices))
    found = recognise(circuit, devices, settings).amplifiers
    built = Network(circuit.elements, found)
    prepared = prepare(circuit.elements, settings, {})
    answers = answer(built, found, prepared, {}, {})
    s = 2j * np.pi * HERTZ
    b = built.right_hand_side([("V1", 1.0)])
    x = np.linalg.solve(built.g + s * built.c, b)
    rows = answers.rows.reshape(len(found), -1)[:, :2]
    return answers.level.reshape(len(found), -1)[:, :2], x[rows]


@pytest.mark.parametrize("seed", range(25))
def test_random_network_agrees_with_ngspice(seed):
    """Output voltage and current at DC and at 3 kHz, within 0.1 %."""
    ours, theirs = network(seed)
    dc, ac = solved(ours)
    deck = "\n".join([TITLE, *theirs])
    run = find().run(deck, OperatingPoint(), SmallSignal(1, HERTZ, HERTZ * 10.1))
    for k in range(STAGES):
        point, sweep = run.plots
        expected = [point.voltage(f"o{k}")[0], point.current(f"vs{k}")[0]]
        assert dc[k] == pytest.approx(expected, rel=1e-3, abs=1e-9)
        wave = [sweep.vectors[f"v(o{k})"][0], sweep.vectors[f"i(vs{k})"][0]]
        assert np.abs(ac[k]) == pytest.approx(np.abs(wave), rel=1e-3, abs=1e-12)
        assert np.angle(ac[k] / np.array(wave)) == pytest.approx([0, 0], abs=2e-3)


def passive(kind, random):
    """Return the cards of a ladder or of bridges with sources, coils and controlled sources."""
    cards = [f"V1 s0 0 {random.uniform(-5, 5):.4g} AC 1"]
    if kind == "ladder":
        rungs = int(random.integers(4, 9))
        for k in range(rungs):
            series = random.choice(["R", "L", "RL"])
            at, to = f"s{k}", f"s{k + 1}"
            middle = f"m{k}" if series == "RL" else to
            if "R" in series:
                cards.append(f"RS{k} {at} {middle} {_value(random, 10, 1e5)}")
            if "L" in series:
                start = at if series == "L" else middle
                cards.append(f"LS{k} {start} {to} {_value(random, 1e-6, 1e-2)}")
            cards.append(f"RP{k} {to} 0 {_value(random, 100, 1e6)}")
            cards.append(f"CP{k} {to} 0 {_value(random, 1e-12, 1e-6)}")
        cards.append(f"I1 0 s{rungs // 2} {random.uniform(-1e-3, 1e-3):.4g}")
        return cards
    taps = [f"b{k}" for k in range(6)]
    for k, tap in enumerate(taps):
        cards.append(f"RU{k} s0 {tap} {_value(random, 100, 1e5)}")
        cards.append(f"RD{k} {tap} 0 {_value(random, 100, 1e5)}")
        cards.append(f"RX{k} {tap} {taps[(k + 1) % 6]} {_value(random, 100, 1e5)}")
        cards.append(f"CX{k} {tap} {taps[(k + 2) % 6]} {_value(random, 1e-12, 1e-7)}")
    cards.append(f"E1 e 0 b0 b1 {random.uniform(-5, 5):.4g}")
    cards.append(f"RE e b3 {_value(random, 100, 1e4)}")
    cards.append(f"G1 b2 b4 b5 0 {random.uniform(-1e-4, 1e-4):.4g}")
    cards.append("VM x 0 0")
    cards.append(f"RM b5 x {_value(random, 100, 1e4)}")
    cards.append(f"F1 b1 0 VM {random.uniform(-0.5, 0.5):.4g}")
    cards.append(f"H1 h 0 VM {random.uniform(-100, 100):.4g}")
    cards.append(f"RH h b4 {_value(random, 100, 1e4)}")
    return cards


FREQUENCIES = (10.0, 3e3, 4e5)


def held_against_ngspice(ours, theirs):
    """Compare every net both know, at DC and at three frequencies, within 0.1 %."""
    settings = parse(DEVICE, "railguard.toml")
    devices = catalogue.load(settings.devices)
    text = "title\n" + "\n".join(ours) + "\n"
    circuit = flatten(deck_from_text(text), keeps_closed(devices))
    prepared = prepare(circuit.elements, settings, {})
    found = recognise(circuit, devices, settings).amplifiers
    built = Network(prepared.elements, found)
    drives = [(d.injection, complex(d.value)) for d in prepared.levels]
    level = factor(built, 0.0).forward(built.right_hand_side(drives)).real
    run = find().run(
        "\n".join([TITLE, *theirs]),
        OperatingPoint(),
        *(SmallSignal(1, f, f * 10.1) for f in FREQUENCIES),
    )
    nets = [net for net in built.rows if f"v({net})" in run.plots[0].vectors]
    assert len(nets) >= 5
    largest = max(abs(level[built.rows[net]]) for net in nets)
    for net in nets:
        expected = run.plots[0].voltage(net)[0]
        assert level[built.rows[net]] == pytest.approx(expected, rel=1e-3, abs=1e-6 * largest)
    b = built.right_hand_side([("V1", 1.0)])
    for hertz, sweep in zip(FREQUENCIES, run.plots[1:], strict=True):
        x = factor(built, hertz).forward(b)
        for net in nets:
            wave = sweep.vectors[f"v({net})"][0]
            assert abs(x[built.rows[net]] - wave) <= 1e-3 * abs(wave) + 1e-9


@pytest.mark.parametrize("seed", range(20))
@pytest.mark.parametrize("kind", ["ladder", "bridge"])
def test_passive_network_agrees_with_ngspice(kind, seed):
    """Resistors, capacitors, coils and all four controlled sources: every net."""
    cards = passive(kind, np.random.default_rng(1000 + seed))
    held_against_ngspice(cards, cards)


@pytest.mark.parametrize("seed", range(200, 220))
def test_every_net_of_a_network_of_amplifiers_agrees_with_ngspice(seed):
    """Three amplifiers over a ladder and a bridge, with a loop over two of them."""
    ours, theirs = network(seed)
    outer = f"RZ o{STAGES - 1} n0 {_value(np.random.default_rng(seed), 2e5, 1e6)}"
    held_against_ngspice([*ours, outer], [*theirs, outer])


@pytest.mark.parametrize("seed", range(100, 120))
def test_reviewed_deck_agrees_with_ngspice(seed):
    """Output range and current of a reviewed deck, within 1 % of ngspice's level and amplitude."""
    ours, theirs = network(seed)
    level = ours[0].split()[3]
    peak = 0.3
    deck = [f"V1 s0 0 SIN({level} {peak} {HERTZ})", *ours[1:], "VP vp 0 100", "VN vn 0 -100"]
    text = "\n".join(["random network", *deck, ".end", ""])
    stages = review(text, parse(DEVICE, "railguard.toml")).designs[0].design.stages
    simulated = "\n".join([TITLE, f"V1 s0 0 {level} AC {peak}", *theirs[1:]])
    point, sweep = (
        find().run(simulated, OperatingPoint(), SmallSignal(1, HERTZ, HERTZ * 10.1)).plots
    )
    for k, stage in enumerate(stages):
        volts, amps = point.voltage(f"o{k}")[0], point.current(f"vs{k}")[0]
        wave, current = np.abs([sweep.vectors[f"v(o{k})"][0], sweep.vectors[f"i(vs{k})"][0]])
        assert stage.output.demand.high == pytest.approx(volts + wave, rel=0.01, abs=1e-6)
        assert stage.output.demand.low == pytest.approx(volts - wave, rel=0.01, abs=1e-6)
        source, sink = max(amps + current, 0.0), max(current - amps, 0.0)
        assert stage.current.demand_source == pytest.approx(source, rel=0.01, abs=1e-9)
        assert stage.current.demand_sink == pytest.approx(sink, rel=0.01, abs=1e-9)
