"""Sound circuits of a river-gauge station, each on any of the amplifiers.

Roles: `main` the stage faults are put into, `last` the stage at the end, `feedback` the resistor
from its output to its inverting input, `gain` the other one there, `source` the card of the signal,
`load` the load, `coupling` and `bias` an input capacitor and the resistor behind it, `leg` a
resistor in series with the non-inverting input's signal, `across` the capacitor across the
feedback, `bypass` that of a reference, `spare` a channel that rests, `switching` what is no linear
stage, `swing` the share of the amplifier's safe swing that is used at the end.
"""

from collections.abc import Callable, Iterator

from tests.faults.amplifiers import AMPLIFIERS, Amplifier
from tests.faults.cards import Base, Cards

Made = tuple[Cards, dict[str, str]]
Circuit = Callable[[Amplifier], Made | None]


def amp(a: Amplifier, plus: str, minus: str, out: str, name: str = "XU1") -> str:
    """Return an op-amp's card in the usual order of pins."""
    return f"{name} {plus} {minus} vp {a.bottom} {out} {a.name}"


def sine(a: Amplifier, peak: float, net: str = "in", name: str = "VIN", hertz: float = 40) -> str:
    """Return a sine round the middle level."""
    return f"{name} {net} 0 SIN({a.middle:g} {peak:.4g} {hertz:g})"


def supply(a: Amplifier, packages: int) -> dict[str, str]:
    """Return the rails through a small series resistor, bulk, and a capacitor for each package."""
    cards = {"VP": f"VP rawp 0 {a.positive:g}", "RSP": "RSP rawp vp 0.47", "CBP": "CBP vp 0 10u"}
    if not a.single:
        cards |= {
            "VN": f"VN rawn 0 {a.negative:g}",
            "RSN": "RSN rawn vn 0.47",
            "CBN": "CBN vn 0 10u",
        }
    for index in range(1, packages + 1):
        cards[f"CP{index}"] = f"CP{index} vp 0 100n"
        if not a.single:
            cards[f"CN{index}"] = f"CN{index} vn 0 100n"
    if a.middle:
        cards["VREF"] = f"VREF ref 0 {a.middle:g}"
    return cards


def level_inverter(a: Amplifier) -> Made:
    """Gain -2 round the middle level."""
    return {
        "VIN": sine(a, a.peak / 2), "R1": "R1 in n 10k", "R2": "R2 n out 20k",
        "XU1": amp(a, a.reference, "n", "out"), "RL": "RL out 0 20k",
    }, {"feedback": "R2", "gain": "R1", "source": "VIN"}  # fmt: skip


def level_amplifier(a: Amplifier) -> Made:
    """Gain 2 round the middle level."""
    return {
        "VIN": sine(a, a.peak / 2), "R1": f"R1 {a.reference} n 10k", "R2": "R2 n out 10k",
        "XU1": amp(a, "in", "n", "out"), "RL": "RL out 0 20k",
    }, {"feedback": "R2", "gain": "R1", "source": "VIN"}  # fmt: skip


def probe_buffer(a: Amplifier) -> Made:
    """A follower behind a protection resistor."""
    return {
        "VIN": sine(a, a.peak), "RP": "RP in p 1k", "XU1": amp(a, "p", "out", "out"),
        "RL": "RL out 0 20k",
    }, {"source": "VIN", "leg": "RP"}  # fmt: skip


def bridge_difference(a: Amplifier) -> Made:
    """Gain 2 for the difference of two signals."""
    return {
        "VA": sine(a, a.peak / 4, "a", "VA"), "VB": sine(a, a.peak / 4, "b", "VB", 33),
        "R1": "R1 a n 10k", "R2": "R2 n out 20k", "R3": "R3 b p 10k",
        "R4": f"R4 p {a.reference} 20k", "XU1": amp(a, "p", "n", "out"), "RL": "RL out 0 20k",
    }, {"feedback": "R2", "gain": "R1", "source": "VA", "swing": "0.4"}  # fmt: skip


def bridge_instrument(a: Amplifier) -> Made:
    """Three amplifiers behind a bridge: gain 11 and then one."""
    return {
        "VA": sine(a, a.peak / 30, "sp", "VA", 5), "VB": f"VB sm 0 {a.middle:g}",
        "R1": "R1 o1 n1 10k", "RG": "RG n1 n2 2k", "R2": "R2 n2 o2 10k",
        "XU1": amp(a, "sp", "n1", "o1"), "XU2": amp(a, "sm", "n2", "o2", "XU2"),
        "R3": "R3 o2 n3 10k", "R4": "R4 n3 out 10k", "R5": "R5 o1 p3 10k",
        "R6": f"R6 p3 {a.reference} 10k", "XU3": amp(a, "p3", "n3", "out", "XU3"),
        "RL": "RL out 0 20k",
    }, {"feedback": "R1", "gain": "RG", "source": "VA", "last": "XU3", "swing": "0.37"}  # fmt: skip


def rain_sum(a: Amplifier) -> Made:
    """Two signals added and turned over."""
    return {
        "VA": sine(a, a.peak / 3, "a", "VA"), "VB": sine(a, a.peak / 3, "b", "VB", 33),
        "R1": "R1 a n 10k", "R3": "R3 b n 10k", "R2": "R2 n out 10k",
        "XU1": amp(a, a.reference, "n", "out"), "RL": "RL out 0 20k",
    }, {"feedback": "R2", "gain": "R1", "source": "VA", "swing": "0.4"}  # fmt: skip


def anti_alias(a: Amplifier) -> Made:
    """A Sallen-Key low-pass at 100 Hz with a gain of one."""
    return {
        "VIN": sine(a, a.peak * 0.8, hertz=30), "R1": "R1 in a 11.3k", "R2": "R2 a p 11.3k",
        "C1": "C1 a out 200n", "C2": "C2 p 0 100n", "XU1": amp(a, "p", "out", "out"),
        "RL": "RL out 0 20k",
    }, {"source": "VIN", "leg": "R2"}  # fmt: skip


def anti_alias_gain(a: Amplifier) -> Made:
    """A Sallen-Key low-pass with equal capacitors and a gain of 1.6."""
    return {
        "VIN": sine(a, a.peak / 2, hertz=30), "R1": "R1 in a 15.8k", "R2": "R2 a p 15.8k",
        "C1": "C1 a out 100n", "C2": "C2 p 0 100n", "R3": f"R3 {a.reference} n 10k",
        "R4": "R4 n out 5.9k", "XU1": amp(a, "p", "n", "out"), "RL": "RL out 0 20k",
    }, {"feedback": "R4", "gain": "R3", "source": "VIN", "leg": "R2"}  # fmt: skip


def band_limit(a: Amplifier) -> Made:
    """A multiple-feedback low-pass at 100 Hz, gain -1."""
    return {
        "VIN": sine(a, a.peak / 2, hertz=20), "R1": "R1 in b 11k", "R2": "R2 b out 11k",
        "R3": "R3 b n 5.6k", "C1": "C1 b 0 220n", "C2": "C2 n out 68n",
        "XU1": amp(a, a.reference, "n", "out"), "RL": "RL out 0 20k",
    }, {"source": "VIN", "feedback": "R2"}  # fmt: skip


def drift_block(a: Amplifier) -> Made:
    """A Sallen-Key high-pass at 1 Hz for the wave staff."""
    return {
        "VIN": f"VIN in 0 SIN(0 {a.peak * 0.7:.4g} 10)", "CI": "CI in a 1u", "C2": "C2 a p 1u",
        "R1": "R1 a out 110k", "RB": f"RB p {a.reference} 220k",
        "XU1": amp(a, "p", "out", "out"), "RL": "RL out 0 20k",
    }, {"source": "VIN", "coupling": "CI", "bias": "RB"}  # fmt: skip


def turbidity(a: Amplifier) -> Made:
    """A photodiode's current into 200 kilohm."""
    amps = a.peak / 4e5
    return {
        "IPD": f"IPD n 0 SIN({amps:.3g} {amps:.3g} 40)", "CPD": "CPD n 0 20p",
        "R2": "R2 n out 200k", "CF": "CF n out 10p", "XU1": amp(a, a.reference, "n", "out"),
        "RL": "RL out 0 20k",
    }, {"feedback": "R2", "source": "IPD", "across": "CF"}  # fmt: skip


def flow_integrator(a: Amplifier) -> Made:
    """An integrator held at DC by a resistor."""
    return {
        "VIN": sine(a, a.peak / 4), "R1": "R1 in n 10k", "R2": "R2 n out 20k",
        "CF": "CF n out 100n", "XU1": amp(a, a.reference, "n", "out"), "RL": "RL out 0 20k",
    }, {
        "feedback": "R2", "gain": "R1", "source": "VIN", "across": "CF", "swing": "0.44",
    }  # fmt: skip


def geophone(a: Amplifier) -> Made:
    """A coupled input biased at the middle level, gain 2 with a capacitor in its leg."""
    return {
        "VIN": f"VIN in 0 SIN(0 {a.peak / 2:.4g} 40)", "CI": "CI in p 1u",
        "RB": f"RB p {a.reference} 47k", "R1": "R1 n g 10k", "CG": "CG g 0 47u",
        "R2": "R2 n out 10k", "XU1": amp(a, "p", "n", "out"), "RL": "RL out 0 20k",
    }, {
        "feedback": "R2", "gain": "R1", "source": "VIN", "coupling": "CI", "bias": "RB",
    }  # fmt: skip


def hydrophone_inverter(a: Amplifier) -> Made:
    """A coupled inverting stage, gain -4."""
    return {
        "VIN": f"VIN in 0 SIN(0 {a.peak / 4:.4g} 100)", "CI": "CI in b 10u",
        "R1": "R1 b n 10k", "R2": "R2 n out 40.2k", "XU1": amp(a, a.reference, "n", "out"),
        "RL": "RL out 0 20k",
    }, {"feedback": "R2", "gain": "R1", "source": "VIN", "coupling": "CI"}  # fmt: skip


def two_stage(a: Amplifier) -> Made:
    """Two inverting stages."""
    return {
        "VIN": sine(a, a.peak / 8), "R1": "R1 in n 10k", "R2": "R2 n mid 20k",
        "XU1": amp(a, a.reference, "n", "mid"), "R3": "R3 mid m 10k", "R4": "R4 m out 20k",
        "XU2": amp(a, a.reference, "m", "out", "XU2"), "RL": "RL out 0 20k",
    }, {"feedback": "R2", "gain": "R1", "source": "VIN", "last": "XU2"}  # fmt: skip


def thermistor(a: Amplifier) -> Made:
    """The water temperature's divider from the middle level's source, low-passed and buffered."""
    level = a.middle or a.peak
    return {
        "VT": f"VT top 0 {level * 2 if a.middle else level:g}", "R1": "R1 top t 10k",
        "RT": "RT t 0 10k", "RP": "RP t p 1k", "C1": "C1 p 0 100n",
        "XU1": amp(a, "p", "out", "out"), "R4": "R4 out adc 1k", "C4": "C4 adc 0 100n",
        "RL": "RL adc 0 100k",
    }, {"leg": "RP"}  # fmt: skip


def loop_receiver(a: Amplifier) -> Made:
    """4 to 20 mA over a shunt, filtered, and a gain."""
    top = a.peak if not a.single else a.middle + a.peak
    ohms = top / 2 / 0.020
    return {
        "ILOOP": "ILOOP 0 in PWL(0 0.004 1 0.020 2 0.004)", "RS": f"RS in 0 {ohms:.3g}",
        "RP": "RP in p 4.99k", "C1": "C1 p 0 100n", "R1": "R1 n 0 10k", "R2": "R2 n out 10k",
        "XU1": amp(a, "p", "n", "out"), "RL": "RL out 0 20k",
    }, {"feedback": "R2", "gain": "R1", "source": "ILOOP", "leg": "RP"}  # fmt: skip


def reference_buffer(a: Amplifier) -> Made:
    """A level divided from the rail, bypassed, buffered, and isolated from its capacitor."""
    level = a.middle or a.peak
    upper = 10e3 * (a.positive - level) / level
    return {
        "RD1": f"RD1 vp p {upper:.4g}", "RD2": "RD2 p 0 10k", "CD": "CD p 0 10u",
        "XU1": amp(a, "p", "out", "out"), "RO": "RO out mid 100", "C4": "C4 mid 0 100n",
        "RL": "RL mid 0 20k",
    }, {"bypass": "CD"}  # fmt: skip


def charge_amplifier(a: Amplifier) -> Made:
    """A piezo hydrophone's charge onto 1 nF, with 10 megohm across and 1 kilohm before."""
    volts = a.peak / 3
    return {
        "VIN": f"VIN src 0 SIN(0 {volts:.3g} 400)", "CI": "CI src in 1n", "R1": "R1 in n 1k",
        "CF": "CF n out 1n", "R2": "R2 n out 1meg", "XU1": amp(a, a.reference, "n", "out"),
        "RL": "RL out 0 20k",
    }, {"feedback": "R2", "source": "VIN", "across": "CF", "swing": "0.33"}  # fmt: skip


def line_pair(a: Amplifier) -> Made:
    """A follower and an inverter of it: a differential line."""
    return {
        "VIN": sine(a, a.peak * 0.8), "RP": "RP in p 1k", "XU1": amp(a, "p", "la", "la"),
        "R1": "R1 la n 10k", "R2": "R2 n lb 10k", "XU2": amp(a, a.reference, "n", "lb", "XU2"),
        "RL": "RL la 0 20k", "RM": "RM lb 0 20k",
    }, {"source": "VIN", "leg": "RP", "last": "XU2"}  # fmt: skip


def gauge_chain(a: Amplifier) -> Made:
    """Amplifier, low-pass and output buffer in a row."""
    return {
        "VIN": sine(a, a.peak / 5, hertz=10), "R1": f"R1 {a.reference} n 2.49k",
        "R2": "R2 n o1 10k", "XU1": amp(a, "in", "n", "o1"), "R3": "R3 o1 b 11.3k",
        "R4": "R4 b p 11.3k", "C1": "C1 b o2 200n", "C2": "C2 p 0 100n",
        "XU2": amp(a, "p", "o2", "o2", "XU2"), "R5": "R5 o2 q 1k", "C3": "C3 q 0 10n",
        "XU3": amp(a, "q", "out", "out", "XU3"), "RL": "RL out 0 20k",
    }, {"feedback": "R2", "gain": "R1", "source": "VIN", "last": "XU3"}  # fmt: skip


def spare_channel(a: Amplifier) -> Made | None:
    """A stage of a dual package whose second channel rests as a follower."""
    if a.channels == 1:
        return None
    return {
        "VIN": sine(a, a.peak / 2), "R1": f"R1 {a.reference} n 10k", "R2": "R2 n out 10k",
        "XU1A": amp(a, "in", "n", "out", "XU1A"),
        "XU1B": amp(a, a.reference, "rest", "rest", "XU1B"), "RL": "RL out 0 20k",
    }, {
        "main": "XU1A", "spare": "XU1B", "feedback": "R2", "gain": "R1", "source": "VIN",
    }  # fmt: skip


def stated_level(a: Amplifier) -> Made:
    """A level that arrives through a connector, stated, with a stated load."""
    low, high = a.middle - a.peak / 2, a.middle + a.peak / 2
    return {
        "*1": f"* railguard: signal LEVEL low={low:g} high={high:g} to=20",
        "*2": "* railguard: load ADC 100k",
        "J1": "J1 LEVEL ADC 0 CONN3", "RP": "RP LEVEL p 4.99k", "C1": "C1 p 0 10n",
        "R1": f"R1 {a.reference} n 10k", "R2": "R2 n out 10k",
        "XU1": amp(a, "p", "n", "out"), "R5": "R5 out ADC 1k", "C2": "C2 ADC 0 10n",
    }, {"feedback": "R2", "gain": "R1", "source": "*1", "leg": "RP"}  # fmt: skip


def stated_bridge(a: Amplifier) -> Made:
    """A bridge of 350 ohm, stated, into two amplifiers with a common gain resistor."""
    common = a.middle
    return {
        "*1": f"* railguard: signal bridge between=S1,S2 peak={a.peak / 60:.3g} common={common:g} "
        "ohms=350 to=20",
        "J1": "J1 S1 S2 0 CONN3", "R1": "R1 o1 n1 10k", "RG": "RG n1 n2 1k", "R2": "R2 n2 o2 10k",
        "XU1": amp(a, "S1", "n1", "o1"), "XU2": amp(a, "S2", "n2", "o2", "XU2"),
        "RL": "RL o1 o2 20k",
    }, {"feedback": "R1", "gain": "RG", "source": "*1", "last": "XU2", "swing": "0.18"}  # fmt: skip


def alarm(a: Amplifier) -> Made:
    """A comparator with hysteresis that lights a lamp over a transistor."""
    mid = a.middle
    turn = (a.positive - a.negative) * 10 / 480
    return {
        "VIN": f"VIN in 0 PWL(0 {mid - 2 * turn:.3g} 10 {mid + 2 * turn:.3g})",
        "R1": "R1 in p 10k", "R2": "R2 out p 470k", "XU1": amp(a, "p", a.reference, "out"),
        "R3": "R3 out base 22k", "R4": "R4 base 0 10k", "Q1": "Q1 lamp base 0 QLAMP",
        "RLAMP": "RLAMP vp lamp 1k", ".1": ".model QLAMP NPN(BF=200)",
    }, {"source": "VIN", "switching": "yes"}  # fmt: skip


CIRCUITS: tuple[Circuit, ...] = (
    level_inverter, level_amplifier, probe_buffer, bridge_difference, bridge_instrument, rain_sum,
    anti_alias, anti_alias_gain, band_limit, drift_block, turbidity, flow_integrator, geophone,
    hydrophone_inverter, two_stage, thermistor, loop_receiver, reference_buffer, charge_amplifier,
    line_pair, gauge_chain, spare_channel, stated_level, stated_bridge, alarm,
)  # fmt: skip


def base(circuit: Circuit, a: Amplifier) -> Base | None:
    """Return a circuit on one amplifier with its rails; None: it does not suit the device."""
    made = circuit(a)
    if made is None:
        return None
    cards, roles = made
    packages = len({name.rstrip("ABCD") for name in cards if name.startswith("XU")})
    load = "RL" if "RL" in cards else ""
    usual = {"main": "XU1", "load": load, **roles}
    usual.setdefault("last", usual["main"])
    return Base(circuit.__name__, a, {**supply(a, packages), **cards}, usual)


def bases() -> Iterator[Base]:
    """Yield every circuit on every amplifier it suits."""
    for circuit in CIRCUITS:
        for a in AMPLIFIERS:
            made = base(circuit, a)
            if made is not None:
                yield made
