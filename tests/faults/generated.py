"""Sound designs made up at random: chains of stages sized as a handbook sizes them.

    for design in designs(1000):
        design.name, design.text

Each design is a row of blocks on one kind of amplifier: a sensor, gain, filters, level shifts,
outputs. What runs through is kept track of (level, amplitude, highest frequency), and every block
takes its values from it: swing inside what the device reaches, resistors that bias current and
input capacitance do not mind, signals the slew rate follows five times over. Nothing here asks the
checker anything, and the seed alone says what comes out.
"""

import math
from collections.abc import Callable, Iterator
from random import Random
from typing import NamedTuple

from tests.faults.amplifiers import AMPLIFIERS, MORE, Amplifier
from tests.faults.cards import SPELLINGS

E24 = (1.0, 1.1, 1.2, 1.3, 1.5, 1.6, 1.8, 2.0, 2.2, 2.4, 2.7, 3.0,
       3.3, 3.6, 3.9, 4.3, 4.7, 5.1, 5.6, 6.2, 6.8, 7.5, 8.2, 9.1)  # fmt: skip
E6 = (1.0, 1.5, 2.2, 3.3, 4.7, 6.8)


class Design(NamedTuple):
    """A generated netlist. `made` says in words what it is made of."""

    name: str
    made: str
    text: str


class Wire(NamedTuple):
    """What runs on a net.

    level  V at rest; `peak` round it; `top` hertz at most
    stiff  it comes from an output; `source`: it has no resistance behind it
    """

    net: str
    level: float
    peak: float
    top: float
    stiff: bool = False
    source: bool = False


def nearest(value: float, series: tuple[float, ...] = E24) -> float:
    """Return the nearest value of a series."""
    decade = 10.0 ** math.floor(math.log10(value))
    around = [m * decade * f for f in (0.1, 1.0, 10.0) for m in series]
    return min(around, key=lambda v: abs(math.log(v / value)))


def written(value: float) -> str:
    """Write a value with a SPICE suffix."""
    for suffix, scale in (("meg", 1e6), ("k", 1e3), ("", 1.0), ("m", 1e-3), ("u", 1e-6),
                          ("n", 1e-9), ("p", 1e-12)):  # fmt: skip
        if value >= 0.9999 * scale:
            return f"{value / scale:.4g}{suffix}"
    return f"{value:.4g}"


class Sheet:
    """A netlist being drawn: it numbers elements and nets, and hands out channels of packages."""

    def __init__(self, random: Random, amplifier: Amplifier) -> None:
        self.random = random
        self.a = amplifier
        self.cards: dict[str, str] = {}
        self.kinds: list[str] = []
        self._numbers: dict[str, int] = {}
        self._free: list[str] = []
        self.packages = 0
        self.ohms = self._resistance()

    def number(self, letter: str) -> int:
        """Return the next number of a letter."""
        self._numbers[letter] = self._numbers.get(letter, 0) + 1
        return self._numbers[letter]

    def net(self) -> str:
        """Return a new net."""
        return f"w{self.number('net')}"

    def put(self, letter: str, a: str, b: str, value: float | str) -> str:
        """Draw a two-ended element; return its designator."""
        name = f"{letter}{self.number(letter)}"
        self.cards[name] = f"{name} {a} {b} {value if isinstance(value, str) else written(value)}"
        return name

    def amp(self, plus: str, minus: str, out: str) -> None:
        """Draw an amplifier in the next free channel."""
        if not self._free:
            self.packages += 1
            letters = "ABCD"[: self.a.channels] if self.a.channels > 1 else ("",)
            self._free = [f"XU{self.packages}{letter}" for letter in letters]
        name = self._free.pop(0)
        self.cards[name] = f"{name} {plus} {minus} vp {self.a.bottom} {out} {self.a.name}"

    def spare(self) -> None:
        """Tie what is left of the last package as followers at the middle level."""
        while self._free:
            rest = self.net()
            self.amp(self.a.reference, rest, rest)

    def _resistance(self) -> float:
        """Return the usual resistance: small for bias current, large for what the output gives."""
        most = min(0.004 * self.a.peak / self.a.leak, 47e3)
        least = (abs(self.a.middle) + self.a.peak) / (0.02 * self.a.amperes)
        return nearest(self.random.uniform(max(least, 4.7e3), max(most, 1.5 * least, 10e3)))

    def most_peak(self) -> float:
        """Return the swing that is surely reached round the middle level, V."""
        return self.a.peak * self.random.uniform(0.55, 0.95)

    def fits(self, top: float, gain: float) -> bool:
        """Tell whether the amplifier is fast enough for a band at a noise gain."""
        loop = self.a.product / gain / top
        slope = 2 * math.pi * top * self.a.peak
        return loop > 30 and slope < 0.2 * self.a.slew


# --- sensors: each returns the wire it feeds


def electrode(s: Sheet) -> Wire:
    """A sine from an electrode's own amplifier."""
    a, net = s.a, s.net()
    peak, top = a.peak * s.random.uniform(0.02, 0.9), s.random.choice((2.0, 10.0, 40.0, 200.0))
    s.put("V", net, "0", f"SIN({a.middle:g} {peak:.4g} {top:g})")
    return Wire(net, a.middle, peak, top, source=True)


def level_sensor(s: Sheet) -> Wire:
    """A slow ramp of a level sensor."""
    a, net = s.a, s.net()
    peak = a.peak * s.random.uniform(0.3, 0.9)
    low, high = a.middle - peak, a.middle + peak
    s.put("V", net, "0", f"PWL(0 {low:.4g} 5 {high:.4g} 10 {low:.4g})")
    return Wire(net, a.middle, peak, 1.0, source=True)


def stated(s: Sheet) -> Wire:
    """A level that arrives over a connector, stated in a comment card."""
    a, net = s.a, f"FIELD{s.number('J')}"
    peak, top = a.peak * s.random.uniform(0.3, 0.9), s.random.choice((1, 20, 100))
    low, high = a.middle - peak, a.middle + peak
    s.cards[f"*{net}"] = f"* railguard: signal {net} low={low:.4g} high={high:.4g} to={top}"
    s.cards[f"J{s.number('JJ')}"] = f"J{s.number('JX')} {net} 0 CONN2"
    return Wire(net, a.middle, peak, float(top), source=True)


def loop_current(s: Sheet) -> Wire:
    """4 to 20 mA over a shunt to ground, filtered."""
    a = s.a
    top = (a.middle + a.peak if a.single else a.peak) * s.random.uniform(0.4, 0.9)
    net, after = s.net(), s.net()
    ohms = nearest(top / 0.020)
    s.put("I", "0", net, "PWL(0 0.004 2 0.020 4 0.004)")
    s.put("R", net, "0", ohms)
    s.put("R", net, after, nearest(min(s.ohms, 4.7e3)))
    s.put("C", after, "0", 100e-9)
    high, low = 0.020 * ohms, 0.004 * ohms
    return Wire(after, (high + low) / 2, (high - low) / 2, 1.0)


def thermistor(s: Sheet) -> Wire:
    """A divider with a thermistor at the middle level."""
    a, top, net = s.a, s.net(), s.net()
    level = a.middle or a.peak * 0.6
    s.put("V", top, "0", f"{2 * level:g}")
    s.put("R", top, net, nearest(s.ohms))
    s.put("R", net, "0", nearest(s.ohms))
    return Wire(net, level, 0.0, 1.0)


def photodiode(s: Sheet) -> Wire:
    """A photodiode's current into a transimpedance stage."""
    a, minus, out = s.a, s.net(), s.net()
    ohms = nearest(min(100e3, 0.004 * a.peak / a.leak))
    peak = s.most_peak() / 2
    amps = peak / ohms
    s.put("I", minus, "0", f"SIN({amps:.4g} {amps:.4g} 20)")
    s.put("C", minus, "0", "22p")
    s.put("R", minus, out, ohms)
    least = math.sqrt(60e-12 / (2 * math.pi * ohms * a.product))
    s.put("C", minus, out, nearest(max(2 * least, 4.7e-12), E6))
    s.amp(a.reference, minus, out)
    s.kinds.append("transimpedance")
    return Wire(out, a.middle + peak, peak, 20.0, True)


SENSORS: tuple[Callable[[Sheet], Wire], ...] = (
    electrode, level_sensor, stated, loop_current, thermistor, photodiode,
)  # fmt: skip


# --- blocks: each returns the wire behind it, or None where it does not suit


Block = Callable[[Sheet, Wire], Wire | None]


def _off(s: Sheet, wire: Wire) -> float:
    """Return how far a wire rests from the middle level, V."""
    return abs(wire.level - s.a.middle)


def follower(s: Sheet, wire: Wire) -> Wire | None:
    """A buffer, now and then behind a resistor."""
    if not s.fits(wire.top, 1.0):
        return None
    net, out = wire.net, s.net()
    if s.random.random() < 0.5:
        net = s.net()
        s.put("R", wire.net, net, nearest(min(s.ohms, 10e3)))
    s.amp(net, out, out)
    return wire._replace(net=out, stiff=True)


def amplifier(s: Sheet, wire: Wire) -> Wire | None:
    """A non-inverting gain round the middle level."""
    room = s.most_peak() / max(wire.peak + _off(s, wire), 1e-3)
    gain = min(s.random.uniform(1.5, 20.0), room)
    if gain < 1.4 or not s.fits(wire.top, gain) or s.a.offset * gain > 0.02 * s.a.peak:
        return None
    minus, out = s.net(), s.net()
    upper = nearest(s.ohms)
    lower = nearest(upper / (gain - 1) * 1.03)
    real = 1 + upper / lower
    s.put("R", s.a.reference, minus, lower)
    s.put("R", minus, out, upper)
    s.amp(wire.net, minus, out)
    level = s.a.middle + (wire.level - s.a.middle) * real
    return Wire(out, level, wire.peak * real, wire.top, True)


def inverter(s: Sheet, wire: Wire) -> Wire | None:
    """An inverting gain round the middle level."""
    if not wire.stiff:
        return None
    room = s.most_peak() / max(wire.peak + _off(s, wire), 1e-3)
    gain = min(s.random.uniform(0.5, 10.0), room)
    if gain < 0.4 or not s.fits(wire.top, 1 + gain) or s.a.offset * gain > 0.02 * s.a.peak:
        return None
    minus, out = s.net(), s.net()
    across = nearest(s.ohms)
    before = nearest(across / gain * 1.03)
    s.put("R", wire.net, minus, before)
    s.put("R", minus, out, across)
    if s.random.random() < 0.3:
        corner = max(50 * wire.top, 1e3)
        s.put("C", minus, out, nearest(1 / (2 * math.pi * across * corner), E6))
    s.amp(s.a.reference, minus, out)
    real = across / before
    level = s.a.middle - (wire.level - s.a.middle) * real
    return Wire(out, level, wire.peak * real, wire.top, True)


def difference(s: Sheet, wire: Wire) -> Wire | None:
    """A difference amplifier of gain one against the middle level."""
    if not wire.stiff or not s.fits(wire.top, 2.0):
        return None
    minus, plus, out = s.net(), s.net(), s.net()
    ohms = nearest(s.ohms)
    s.put("R", s.a.reference, minus, ohms)
    s.put("R", minus, out, ohms)
    s.put("R", wire.net, plus, ohms)
    s.put("R", plus, s.a.reference, ohms)
    s.amp(plus, minus, out)
    return wire._replace(net=out)


def sallen_key(s: Sheet, wire: Wire) -> Wire | None:
    """A second-order low-pass with a gain of one."""
    corner = 4 * wire.top
    if not wire.stiff or corner * 300 > s.a.product or not s.fits(corner, 1.0):
        return None
    middle, plus, out = s.net(), s.net(), s.net()
    ohms = nearest(min(s.ohms, 22e3))
    quality = s.random.uniform(0.5, 1.0)
    mean = 1 / (2 * math.pi * corner * ohms)
    s.put("R", wire.net, middle, ohms)
    s.put("R", middle, plus, ohms)
    s.put("C", middle, out, nearest(mean * 2 * quality, E6))
    s.put("C", plus, "0", nearest(mean / (2 * quality), E6))
    s.amp(plus, out, out)
    return wire._replace(net=out)


def multiple_feedback(s: Sheet, wire: Wire) -> Wire | None:
    """A multiple-feedback low-pass with a gain of minus one."""
    corner = 5 * wire.top
    if not wire.stiff or corner * 400 > s.a.product or not s.fits(corner, 2.0):
        return None
    middle, minus, out = s.net(), s.net(), s.net()
    ohms = nearest(min(s.ohms, 22e3))
    mean = 1 / (2 * math.pi * corner * ohms)
    s.put("R", wire.net, middle, ohms)
    s.put("R", middle, out, ohms)
    s.put("R", middle, minus, nearest(ohms / 2))
    s.put("C", middle, "0", nearest(mean * 3.0, E6))
    s.put("C", minus, out, nearest(mean * 0.67, E6))
    s.amp(s.a.reference, minus, out)
    return wire._replace(net=out, level=2 * s.a.middle - wire.level)


def coupled(s: Sheet, wire: Wire) -> Wire | None:
    """A coupling capacitor, biased at the middle level, buffered."""
    if wire.peak == 0 or wire.top < 10 or not s.fits(wire.top, 1.0):
        return None
    plus, out = s.net(), s.net()
    ohms = nearest(min(4 * s.ohms, 0.004 * s.a.peak / s.a.leak, 220e3))
    s.put("C", wire.net, plus, nearest(10 / (2 * math.pi * ohms * wire.top), E6))
    s.put("R", plus, s.a.reference, ohms)
    s.amp(plus, out, out)
    return Wire(out, s.a.middle, wire.peak, wire.top, True)


def attenuated(s: Sheet, wire: Wire) -> Wire | None:
    """A divider towards the middle level, filtered and buffered."""
    if not (wire.stiff or wire.source):
        return None
    if not s.fits(wire.top, 1.0) or wire.peak < 0.05 * s.a.peak:
        return None
    plus, out = s.net(), s.net()
    ohms = nearest(s.ohms)
    s.put("R", wire.net, plus, ohms)
    s.put("R", plus, s.a.reference, ohms)
    s.put("C", plus, "0", nearest(1 / (2 * math.pi * ohms / 2 * 30 * wire.top), E6))
    s.amp(plus, out, out)
    level = (wire.level + s.a.middle) / 2
    return Wire(out, level, wire.peak / 2, wire.top, True)


BLOCKS: tuple[Block, ...] = (
    follower, amplifier, inverter, difference, sallen_key, multiple_feedback, coupled, attenuated,
)  # fmt: skip


# --- ends


def converter(s: Sheet, wire: Wire) -> None:
    """A converter's input behind a resistor and a capacitor."""
    net = s.net()
    s.put("R", wire.net, net, nearest(s.random.choice((470.0, 1e3, 2.2e3))))
    s.put("C", net, "0", nearest(s.random.choice((1e-9, 10e-9)), E6))
    s.put("R", net, "0", "1meg")


def meter(s: Sheet, wire: Wire) -> None:
    """A resistor to ground."""
    worst = abs(wire.level) + wire.peak
    least = max(worst / (0.1 * s.a.amperes), 10e3)
    s.put("R", wire.net, "0", nearest(2 * least))


def alarm(s: Sheet, wire: Wire) -> None:
    """A comparator with hysteresis on the end, that lights a lamp."""
    if wire.peak < 0.2 * s.a.peak:
        return meter(s, wire)
    plus, out, base, lamp = s.net(), s.net(), s.net(), s.net()
    reference = s.net()
    s.put("V", reference, "0", f"{wire.level:.4g}")
    ohms = nearest(s.ohms)
    rails = s.a.positive - s.a.negative
    s.put("R", wire.net, plus, ohms)
    s.put("R", plus, out, nearest(ohms * rails / (0.2 * wire.peak)))
    s.amp(plus, reference, out)
    s.put("R", out, base, nearest(rails / (0.1 * s.a.amperes)))
    s.put("R", base, "0", "47k")
    number = s.number("Q")
    s.cards[f"Q{number}"] = f"Q{number} {lamp} {base} 0 QLAMP"
    s.put("R", "vp", lamp, "4.7k")
    s.cards[".q"] = ".model QLAMP NPN(BF=150)"
    return None


ENDS: tuple[Callable[[Sheet, Wire], None], ...] = (converter, meter, alarm)


def _rails(s: Sheet) -> dict[str, str]:
    """Draw the rails: ideal, behind a ferrite or a resistor, or stated."""
    a, r = s.a, s.random
    cards: dict[str, str] = {}
    style = r.choice(("source", "ferrite", "resistor", "stated"))
    s.kinds.append(style)
    sides = [("P", "vp", a.positive)] + ([] if a.single else [("N", "vn", a.negative)])
    for letter, net, volts in sides:
        raw = net if style == "source" else f"raw{letter.lower()}"
        if style == "stated":
            cards[f"*{net}"] = f"* railguard: rail {net} {volts:g} tol={r.choice((1, 2, 3))}%"
        else:
            cards[f"V{letter}"] = f"V{letter} {raw} 0 {volts:g}"
        if style == "ferrite":
            cards[f"LFB{letter}"] = f"LFB{letter} {raw} {net} 10u"
        if style == "resistor":
            cards[f"RS{letter}"] = f"RS{letter} {raw} {net} 1"
        cards[f"CB{letter}"] = f"CB{letter} {net} 0 {r.choice(('10u', '4.7u', '22u'))}"
        for n in range(1, s.packages + 1):
            cards[f"C{letter}{n}"] = f"C{letter}{n} {net} 0 100n"
    return cards


def _reference(s: Sheet) -> dict[str, str]:
    """Draw the middle level: a source, or a bypassed divider with a buffer."""
    if not s.a.middle:
        return {}
    if s.random.random() < 0.6:
        return {"VREF": f"VREF ref 0 {s.a.middle:g}"}
    lower = nearest(s.ohms)
    upper = lower * (s.a.positive - s.a.middle) / s.a.middle
    s.put("R", "vp", "half", f"{upper:.5g}")
    s.put("R", "half", "0", lower)
    s.put("C", "half", "0", "10u")
    s.amp("half", "ref", "ref")
    s.kinds.append("buffered middle")
    return {}


def draw(seed: int) -> Design:
    """Draw the design of a seed."""
    random = Random(seed)
    a = random.choice((*AMPLIFIERS, *MORE))
    s = Sheet(random, a)
    early = _reference(s)
    for _ in range(random.choice((1, 1, 2, 3))):
        sensor = random.choice(SENSORS)
        wire = sensor(s)
        s.kinds.append(sensor.__name__)
        made = 0
        for block in random.sample(BLOCKS, len(BLOCKS)):
            if made >= random.choice((1, 2, 3, 4)):
                break
            after = block(s, wire)
            if after is not None:
                s.kinds.append(block.__name__)
                wire, made = after, made + 1
        if not wire.stiff:
            out = s.net()
            s.amp(wire.net, out, out)
            wire = wire._replace(net=out, stiff=True)
        end = random.choice(ENDS)
        end(s, wire)
        s.kinds.append(end.__name__)
    s.spare()
    cards = {**_rails(s), **early, **s.cards}
    usable = [x for x in SPELLINGS if x.name != "exported" or a.channels > 1]
    spelling = random.choice(usable)
    name = f"seed {seed}, {a.name}, {spelling.name}"
    return Design(name, ", ".join(s.kinds), spelling.text(cards))


def designs(count: int, start: int = 0) -> Iterator[Design]:
    """Yield the designs of `count` seeds from `start` on."""
    for seed in range(start, start + count):
        yield draw(seed)
