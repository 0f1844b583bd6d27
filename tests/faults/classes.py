"""The classes of faults: each changes one card, one rail or one value of a sound circuit.

A class is a function from a circuit to a Fault, or to None where the circuit has no place for it.
Every fault crosses its limit by a fifth at least.
"""

from collections.abc import Callable
from typing import NamedTuple

from tests.faults.cards import Base, Cards

Who = tuple[str, ...]


class Fault(NamedTuple):
    """A faulty version of a circuit and what is to be said of it.

    rules    names of rules any of which tells it rightly, the best first
    who      designators or nets any of which must be named
    holds    True where no reasonable reader would let it pass: major at least
    """

    cards: Cards
    rules: tuple[str, ...]
    who: Who
    holds: bool = False


Class = Callable[[Base], Fault | None]

ALL: list[Class] = []


def fault(made: Class) -> Class:
    """Register a class of faults."""
    ALL.append(made)
    return made


def has(base: Base, *roles: str) -> bool:
    """Tell whether a circuit has cards in all of some roles."""
    return all(base.roles.get(role) for role in roles)


def linear(base: Base) -> bool:
    """Tell whether the main stage is a linear one."""
    return not base.roles.get("switching")


# --- supply


@fault
def rail_without_source(base: Base) -> Fault:
    """The source of the positive rail is not on the netlist."""
    return Fault(base.without("VP", "RSP"), ("supply-missing",), (base.main, "vp"), True)


@fault
def rail_misspelt(base: Base) -> Fault:
    """The positive pin of one stage is on a net nothing else has."""
    cards = base.rewired(base.main, "vp", "vpp")
    return Fault(cards, ("supply-missing", "supply-package-split"), (base.main, "vpp"), True)


@fault
def supply_pins_swapped(base: Base) -> Fault:
    """The two supply pins exchanged."""
    name, plus, minus, top, bottom, *rest = base.cards[base.main].split()
    cards = base.with_cards(**{base.main: " ".join([name, plus, minus, bottom, top, *rest])})
    return Fault(cards, ("supply-reversed", "supply-package-split"), (base.main,), True)


@fault
def source_turned(base: Base) -> Fault | None:
    """The source of the positive rail is turned round."""
    a = base.amplifier
    cards = base.with_cards(VP=f"VP rawp 0 {-a.positive:g}")
    return Fault(cards, ("supply-reversed", "supply-missing"), (base.main, "vp"), True)


def _rails(base: Base, total: float) -> dict[str, str]:
    """Return the cards with another total supply, split as it was."""
    a = base.amplifier
    share = total / (a.positive - a.negative)
    cards = base.with_cards(VP=f"VP rawp 0 {a.positive * share:.4g}")
    if not a.single:
        cards["VN"] = f"VN rawn 0 {a.negative * share:.4g}"
    return cards


@fault
def supply_too_low(base: Base) -> Fault:
    """A supply on which the device does not work."""
    return Fault(_rails(base, base.amplifier.low), ("supply-range",), (base.main, "vp"), True)


@fault
def supply_too_high(base: Base) -> Fault:
    """A supply that breaks the device."""
    return Fault(_rails(base, base.amplifier.high), ("supply-range",), (base.main, "vp"), True)


@fault
def series_drop(base: Base) -> Fault | None:
    """A series resistor that eats the rail at the current its packages draw."""
    a = base.amplifier
    packages = len(_rail_capacitors(base, "P"))
    cards = base.with_cards(RSP=f"RSP rawp vp {0.15 * a.positive / a.draws / packages:.3g}")
    return Fault(cards, ("supply-drop",), (base.main, "vp"))


@fault
def rails_of_one_package_differ(base: Base) -> Fault | None:
    """One channel of a dual package on a rail of its own."""
    spare = base.roles.get("spare")
    if not spare:
        return None
    level = base.amplifier.positive * 0.9
    cards = base.rewired(spare, "vp", "vq")
    cards |= {"VQ": f"VQ vq 0 {level:.3g}", "CQ": "CQ vq 0 100n"}
    return Fault(cards, ("supply-package-split",), (spare, base.main), True)


@fault
def name_disagrees(base: Base) -> Fault:
    """The rail is named for another level than it has."""
    volts = f"+{base.amplifier.positive * 1.5:.3g}V"
    words = {k: [volts if w == "vp" else w for w in v.split()] for k, v in base.cards.items()}
    cards = {k: " ".join(v) for k, v in words.items()}
    return Fault(cards, ("supply-name-disagrees",), (volts,), True)


# --- decoupling


def _rail_capacitors(base: Base, letter: str) -> list[str]:
    return [k for k in base.cards if k.startswith(f"C{letter}") and k[2:].isdigit()]


@fault
def positive_undecoupled(base: Base) -> Fault:
    """No small capacitor on the positive rail."""
    cards = base.without(*_rail_capacitors(base, "P"))
    return Fault(cards, ("decoupling-absent",), ("vp",), True)


@fault
def negative_undecoupled(base: Base) -> Fault | None:
    """No small capacitor on the negative rail."""
    if base.amplifier.single:
        return None
    cards = base.without(*_rail_capacitors(base, "N"))
    return Fault(cards, ("decoupling-absent",), ("vn",), True)


@fault
def capacitor_too_small(base: Base) -> Fault:
    """Picofarads where nanofarads were meant."""
    cards = base.with_cards(**{k: f"{k} vp 0 100p" for k in _rail_capacitors(base, "P")})
    return Fault(cards, ("decoupling-absent",), ("vp",), True)


@fault
def capacitors_too_few(base: Base) -> Fault | None:
    """One capacitor for several packages."""
    all_of_them = _rail_capacitors(base, "P")
    if len(all_of_them) < 2:
        return None
    return Fault(base.without(*all_of_them[1:]), ("decoupling-few",), ("vp",))


@fault
def decoupled_before_ferrite(base: Base) -> Fault:
    """All capacitors on the source side of a ferrite."""
    moved = {k: base.cards[k].replace(" vp ", " rawp ") for k in _rail_capacitors(base, "P")}
    moved["CBP"] = "CBP rawp 0 10u"
    cards = {k: v for k, v in base.cards.items() if k != "RSP"}
    cards |= {**moved, "LFB1": "LFB1 rawp vp 10u"}
    return Fault(cards, ("decoupling-behind-series",), ("vp",), True)


@fault
def decoupled_across_only(base: Base) -> Fault | None:
    """Rails decoupled to each other only."""
    if base.amplifier.single:
        return None
    gone = [*_rail_capacitors(base, "P"), *_rail_capacitors(base, "N"), "CBP", "CBN"]
    cards = {**base.without(*gone), "CX1": "CX1 vp vn 100n"}
    return Fault(cards, ("decoupling-rail-to-rail-only",), ("vp", "vn"))


@fault
def reference_not_bypassed(base: Base) -> Fault | None:
    """The divided reference without its capacitor."""
    if not has(base, "bypass"):
        return None
    return Fault(base.without(base.roles["bypass"]), ("decoupling-reference",), (base.main,))


@fault
def no_bulk(base: Base) -> Fault:
    """No capacitor larger than 100 nF on a rail fed through a resistor."""
    return Fault(base.without("CBP"), ("decoupling-bulk",), ("vp",))


# --- headroom


@fault
def signal_too_large(base: Base) -> Fault | None:
    """A signal that asks for more than the rails."""
    source = base.roles.get("source", "")
    if not linear(base) or " SIN(" not in base.cards.get(source, "") or source == "IPD":
        return None
    head, numbers = base.cards[source].split("SIN(")
    offset, peak, rest = numbers.split(" ", 2)
    a = base.amplifier
    room = max(a.positive - a.middle, a.middle - a.negative) / a.peak
    times = 2.0 * room / float(base.roles.get("swing", "0.9"))
    cards = base.with_cards(**{source: f"{head}SIN({offset} {float(peak) * times:.4g} {rest}"})
    return Fault(
        cards, ("headroom-output", "headroom-input"), (base.main, base.roles["last"]), True
    )


@fault
def gain_too_high(base: Base) -> Fault | None:
    """A feedback resistor ten times too large."""
    if not has(base, "feedback", "gain", "source") or base.roles.get("across"):
        return None
    if base.name in ("anti_alias_gain",):
        return None
    feedback = base.roles["feedback"]
    a = base.amplifier
    room = max(a.positive - a.middle, a.middle - a.negative) / a.peak
    times = 3.0 * room / float(base.roles.get("swing", "0.9"))
    if base.roles["gain"] == "RG":
        cards = base.revalued(RG=base.value("RG") / times)
    else:
        cards = base.revalued(**{feedback: base.value(feedback) * times})
    return Fault(cards, ("headroom-output",), (base.main, base.roles["last"]), True)


@fault
def level_wrong(base: Base) -> Fault | None:
    """The middle level near the upper rail."""
    a = base.amplifier
    used = [k for k, v in base.cards.items() if k != "VREF" and "ref" in v.split()]
    if not used or not linear(base) or base.name == "anti_alias_gain":
        return None
    cards = base.with_cards(VREF=f"VREF ref 0 {a.positive * 0.99:.4g}")
    last = base.roles["last"]
    rules = ("headroom-output", "headroom-input", "bias-level")
    return Fault(cards, rules, (base.main, last, base.roles.get("spare", last)), True)


@fault
def input_beyond_range(base: Base) -> Fault | None:
    """A follower's signal beyond what its inputs take, but inside the rails."""
    a = base.amplifier
    above = a.reach[1]
    if base.name != "probe_buffer" or above >= 0:
        return None
    top = a.positive + above * 0.2
    cards = base.with_cards(VIN=f"VIN in 0 SIN({a.middle:g} {top - a.middle:.4g} 40)")
    return Fault(cards, ("headroom-input", "headroom-output"), (base.main,), True)


@fault
def input_at_lower_rail(base: Base) -> Fault | None:
    """A signal that goes to the negative rail of a device whose inputs do not reach it."""
    a = base.amplifier
    if base.name != "probe_buffer" or a.reach[0] <= 0.5:
        return None
    cards = base.with_cards(VIN=f"VIN in 0 SIN({a.negative / 2:g} {-a.negative / 2:g} 40)")
    rules = ("headroom-input", "headroom-output", "headroom-phase-reversal")
    return Fault(cards, rules, (base.main,), True)


@fault
def offset_eats_range(base: Base) -> Fault | None:
    """So much gain at DC that the offset alone takes the range."""
    a = base.amplifier
    if base.name != "level_inverter" or a.offset < 100e-6:
        return None
    gain = 0.5 * (a.positive - a.negative) / a.offset
    peak = a.peak / 2 / gain
    cards = base.revalued(R1=100.0, R2=100.0 * gain)
    cards["VIN"] = f"VIN in 0 SIN({a.middle:g} {peak:.4g} 1)"
    rules = ("headroom-offset", "headroom-output", "feedback-high")
    return Fault(cards, rules, (base.main,))


@fault
def load_overdriven(base: Base) -> Fault | None:
    """A converter input that stands half of what the output reaches."""
    if base.name != "level_amplifier":
        return None
    top = base.amplifier.middle + base.amplifier.peak
    cards = {**base.cards, "*9": f"* railguard: load out 100k max-volts={top / 2:.3g}"}
    return Fault(cards, ("headroom-load",), (base.main,), True)


# --- drive


@fault
def load_too_heavy(base: Base) -> Fault | None:
    """A load that asks for half as much again as the short-circuit current."""
    if not has(base, "load") or not linear(base) or base.name in ("thermistor", "reference_buffer"):
        return None
    a = base.amplifier
    swing = a.peak * 0.55 * float(base.roles.get("swing", "0.9"))
    level = 0.0 if base.name == "stated_bridge" else abs(a.middle)
    ohms = (level + swing) / (1.5 * a.amperes)
    load = base.roles["load"]
    who = {"line_pair": base.main}.get(base.name, base.roles["last"])
    return Fault(base.revalued(**{load: ohms}), ("drive-current",), (who, base.main), True)


@fault
def capacitor_at_slope(base: Base) -> Fault | None:
    """A capacitor behind a small resistor that takes several times the output current."""
    a = base.amplifier
    if base.name != "level_amplifier":
        return None
    hertz = min(a.product / 200, a.slew / (6.28 * a.peak * 4))
    farads = 3 * a.amperes / (6.28 * hertz * a.peak)
    cards = base.with_cards(
        VIN=f"VIN in 0 SIN({a.middle:g} {a.peak / 2:.4g} {hertz:.4g})",
        RO="RO out line 10", CO=f"CO line 0 {farads:.4g}",
    )  # fmt: skip
    rules = ("drive-current",)
    return Fault(cards, rules, (base.main,))


@fault
def outputs_joined(base: Base) -> Fault | None:
    """Two outputs on one net."""
    if base.name != "line_pair":
        return None
    cards = {
        k: v.replace(" lb ", " la ") if k in ("XU2", "RM") else v for k, v in base.cards.items()
    }
    cards["R2"] = base.cards["R2"].replace(" lb ", " la ")
    return Fault(cards, ("drive-joined",), ("XU1", "XU2"), True)


@fault
def output_tied_to_rail(base: Base) -> Fault | None:
    """The output on the positive rail."""
    if base.name not in ("level_amplifier", "geophone"):
        return None
    cards = base.rewired(base.main, "out", "vp", which=4)
    rules = ("drive-tied", "feedback-open", "netlist-sources-fight")
    return Fault(cards, rules, (base.main,), True)


@fault
def output_grounded(base: Base) -> Fault | None:
    """The output on ground."""
    if base.name not in ("level_amplifier", "level_inverter"):
        return None
    cards = base.rewired(base.main, "out", "0", which=4)
    return Fault(cards, ("drive-tied",), (base.main,), True)


@fault
def output_on_a_source(base: Base) -> Fault | None:
    """An ideal source on the output's net."""
    if base.name not in ("level_amplifier", "two_stage"):
        return None
    cards = {**base.cards, "VX": f"VX out 0 {base.amplifier.middle + 1:g}"}
    rules = ("drive-tied", "netlist-sources-fight")
    return Fault(cards, rules, (base.roles["last"], "VX"), True)


@fault
def input_from_higher_rail(base: Base) -> Fault | None:
    """An input driven from another supply, far above its own, without a resistor."""
    a = base.amplifier
    if base.name != "probe_buffer":
        return None
    cards = base.with_cards(VIN=f"VIN in 0 {a.positive + 5:g}", RP="RP in p 10")
    rules = ("drive-input-above-rail", "headroom-input", "headroom-output")
    return Fault(cards, rules, (base.main,), True)


@fault
def package_too_hot(base: Base) -> Fault | None:
    """A load that makes a package burn some watts."""
    a = base.amplifier
    if base.name != "level_amplifier" or a.positive < 12 or not a.single:
        return None
    cards = base.revalued(RL=a.middle / (a.amperes * 0.95))
    cards["*9"] = "* railguard: ambient 85 85"
    return Fault(cards, ("drive-power", "drive-current"), (base.main,))


# --- bias


@fault
def bias_removed(base: Base) -> Fault | None:
    """A coupled input without its resistor."""
    if not has(base, "bias", "coupling"):
        return None
    cards = base.without(base.roles["bias"])
    return Fault(cards, ("bias-no-dc-path",), (base.main, "p"), True)


@fault
def coupled_without_bias(base: Base) -> Fault | None:
    """A capacitor where a resistor led the signal in."""
    leg = base.roles.get("leg", "")
    if not leg or base.name in ("anti_alias", "anti_alias_gain"):
        return None
    nets = base.nets(leg)
    cards = {**base.without(leg), "CK": f"CK {nets[0]} {nets[1]} 1u"}
    return Fault(cards, ("bias-no-dc-path",), (base.main, "p"), True)


@fault
def input_left_open(base: Base) -> Fault | None:
    """The resistor to the non-inverting input is not there."""
    leg = base.roles.get("leg", "")
    if not leg:
        return None
    return Fault(base.without(leg), ("bias-no-dc-path",), (base.main, "p"), True)


@fault
def biased_at_rail(base: Base) -> Fault | None:
    """A coupled input biased at the upper rail."""
    if not has(base, "bias") or base.name == "drift_block":
        return None
    bias = base.roles["bias"]
    name, pin, _, value = base.cards[bias].split()
    cards = base.with_cards(**{bias: f"{name} {pin} vp {value}"})
    rules = ("headroom-input", "headroom-output", "bias-level")
    return Fault(cards, rules, (base.main,), True)


@fault
def biased_at_ground(base: Base) -> Fault | None:
    """A coupled input on a single supply biased at ground."""
    if not has(base, "bias") or not base.amplifier.single:
        return None
    bias = base.roles["bias"]
    name, pin, _, value = base.cards[bias].split()
    cards = base.with_cards(**{bias: f"{name} {pin} 0 {value}"})
    rules = ("headroom-output", "headroom-input", "bias-level")
    return Fault(cards, rules, (base.main,), True)


@fault
def bias_resistor_huge(base: Base) -> Fault | None:
    """A bias resistor in which the bias current makes a tenth of the range."""
    a = base.amplifier
    if base.name != "geophone" or a.leak < 5e-9:
        return None
    ohms = 0.3 * a.peak / a.leak
    cards = base.revalued(RB=ohms)
    return Fault(cards, ("bias-current-error", "headroom-offset"), (base.main,))


@fault
def spare_left_open(base: Base) -> Fault | None:
    """The spare channel's input on a net of its own."""
    spare = base.roles.get("spare")
    if not spare:
        return None
    cards = base.rewired(spare, base.nets(spare)[0], "nowhere", which=0)
    return Fault(cards, ("bias-unused", "bias-no-dc-path"), (spare,), True)


@fault
def spare_at_rail(base: Base) -> Fault | None:
    """The spare channel without feedback, its inputs tied together."""
    spare = base.roles.get("spare")
    if not spare:
        return None
    ref = base.amplifier.reference
    cards = base.rewired(spare, "rest", ref, which=1)
    return Fault(cards, ("bias-unused",), (spare,))


# --- feedback


@fault
def feedback_missing(base: Base) -> Fault | None:
    """The feedback resistor is not there."""
    if not has(base, "feedback", "gain") or base.roles.get("across"):
        return None
    cards = base.without(base.roles["feedback"])
    return Fault(cards, ("feedback-open",), (base.main,), True)


@fault
def integrator_unheld(base: Base) -> Fault | None:
    """An integrator or charge amplifier without its resistor."""
    if not has(base, "feedback", "across"):
        return None
    cards = base.without(base.roles["feedback"])
    return Fault(cards, ("feedback-open", "bias-no-dc-path"), (base.main,), True)


@fault
def inputs_swapped(base: Base) -> Fault | None:
    """The two inputs exchanged."""
    if not linear(base):
        return None
    name, plus, minus, *rest = base.cards[base.main].split()
    cards = base.with_cards(**{base.main: " ".join([name, minus, plus, *rest])})
    return Fault(cards, ("feedback-reversed",), (base.main,), True)


def _network(base: Base) -> list[str]:
    names = ("R1", "R2") if base.name == "two_stage" else ("R1", "R2", "R3", "R4")
    return [n for n in names if n in base.cards]


@fault
def feedback_too_low(base: Base) -> Fault | None:
    """A feedback network that takes half as much again as the output gives."""
    if base.name not in (
        "level_inverter", "level_amplifier", "bridge_difference", "rain_sum", "two_stage",
        "spare_channel", "hydrophone_inverter",
    ):  # fmt: skip
        return None
    a = base.amplifier
    feedback = base.roles["feedback"]
    swing = {"two_stage": 0.25}.get(base.name, 0.6) * a.peak
    ohms = swing / (1.5 * a.amperes)
    factor = ohms / base.value(feedback)
    cards = base.revalued(**{n: base.value(n) * factor for n in _network(base)})
    if base.name == "hydrophone_inverter":
        cards["CI"] = "CI in b 100m"
    rules = ("feedback-low", "drive-current")
    return Fault(cards, rules, (base.main,), True)


@fault
def feedback_too_high(base: Base) -> Fault | None:
    """A feedback network of tens of megohms."""
    if base.name not in (
        "level_inverter", "level_amplifier", "bridge_difference", "rain_sum", "two_stage",
        "spare_channel",
    ):  # fmt: skip
        return None
    cards = base.revalued(**{n: base.value(n) * 2000 for n in _network(base)})
    return Fault(cards, ("feedback-high",), (base.main,))


@fault
def difference_unmatched(base: Base) -> Fault | None:
    """A small difference on a large common level, with resistors of one per cent."""
    a = base.amplifier
    if base.name != "bridge_difference" or a.single:
        return None
    level = a.peak
    cards = base.with_cards(
        VA=f"VA a 0 SIN({level:g} 0.02 40)", VB=f"VB b 0 SIN({level:g} 0.02 33)",
    ) | {"*9": "* railguard: tolerance resistor 1%"}  # fmt: skip
    return Fault(cards, ("feedback-matching",), (base.main,))


# --- dynamics


def _at(base: Base, hertz: float, peak: float) -> dict[str, str]:
    return base.with_cards(VIN=f"VIN in 0 SIN({base.amplifier.middle:g} {peak:.4g} {hertz:.4g})")


@fault
def band_too_high(base: Base) -> Fault | None:
    """A signal at which no loop gain is left."""
    if base.name not in ("level_inverter", "level_amplifier", "spare_channel"):
        return None
    cards = _at(base, base.amplifier.product, 0.2)
    return Fault(cards, ("dynamics-loop-gain",), (base.main,), True)


@fault
def slope_too_steep(base: Base) -> Fault | None:
    """A swing at a frequency that the slew rate does not follow."""
    a = base.amplifier
    if base.name not in ("level_inverter", "level_amplifier", "probe_buffer"):
        return None
    hertz = 1.5 * a.slew / (6.28 * a.peak)
    if hertz > a.product / 8:
        return None  # where it has no loop gain left either
    if base.name == "probe_buffer":
        return Fault(_at(base, hertz, a.peak), ("dynamics-slew",), (base.main,), True)
    return Fault(_at(base, hertz, a.peak / 2), ("dynamics-slew",), (base.main,), True)


@fault
def coupling_too_small(base: Base) -> Fault | None:
    """A coupling capacitor a hundred times too small."""
    if not has(base, "coupling") or base.name in ("charge_amplifier", "drift_block"):
        return None
    coupling = base.roles["coupling"]
    cards = base.revalued(**{coupling: base.value(coupling) / 300})
    return Fault(cards, ("dynamics-coupling",), (base.main,))


@fault
def filter_too_fast(base: Base) -> Fault | None:
    """A filter moved to where the device has too little gain-bandwidth product."""
    if base.name not in ("anti_alias", "band_limit"):
        return None
    factor = base.amplifier.product / 25 / 100
    capacitors = [n for n in ("C1", "C2") if n in base.cards]
    cards = base.revalued(**{n: base.value(n) / factor for n in capacitors})
    rules = ("dynamics-filter", "dynamics-loop-gain", "stability-phase-margin")
    return Fault(cards, rules, (base.main,))


# --- stability


@fault
def capacitor_at_output(base: Base) -> Fault | None:
    """100 nF straight at the output."""
    if base.name not in ("level_amplifier", "probe_buffer", "level_inverter", "reference_buffer"):
        return None
    cards = {**base.cards, "CO": "CO out 0 100n"}
    rules = ("stability-load-capacitance", "stability-phase-margin")
    return Fault(cards, rules, (base.main,))


@fault
def decompensated(base: Base) -> Fault | None:
    """A device that is stable from a gain of five, as a follower."""
    if base.name != "probe_buffer" or base.amplifier.name != "OP27G":
        return None
    cards = base.with_cards(XU1=base.cards["XU1"].replace("OP27G", "OP37G"))
    return Fault(cards, ("stability-noise-gain",), (base.main,), True)


@fault
def transimpedance_bare(base: Base) -> Fault | None:
    """A photodiode's stage without its capacitor, on a large diode."""
    if base.name != "turbidity":
        return None
    cards = {**base.without("CF"), "CPD": "CPD n 0 200p"}
    rules = ("stability-transimpedance", "stability-phase-margin", "feedback-high")
    return Fault(cards, rules, (base.main,))


# --- netlist


@fault
def megohm_as_m(base: Base) -> Fault | None:
    """1M where 1meg is meant: a milliohm to SPICE."""
    if not has(base, "load"):
        return None
    load = base.roles["load"]
    cards = base.with_cards(**{load: " ".join([*base.cards[load].split()[:3], "1M"])})
    return Fault(cards, ("netlist-value-suffix",), (load,))


@fault
def decimal_comma(base: Base) -> Fault | None:
    """A comma where SPICE wants a point."""
    if not has(base, "load"):
        return None
    load = base.roles["load"]
    cards = base.with_cards(**{load: " ".join([*base.cards[load].split()[:3], "20,5k"])})
    return Fault(cards, ("netlist-value-form",), (load,))


@fault
def value_missing(base: Base) -> Fault | None:
    """A resistor without a value."""
    if not has(base, "feedback"):
        return None
    name = base.roles["feedback"]
    cards = base.with_cards(**{name: " ".join(base.cards[name].split()[:3])})
    return Fault(cards, ("netlist-value-missing",), (name,), True)


@fault
def designator_twice(base: Base) -> Fault:
    """A designator that stands twice."""
    cards = {**base.cards, "CP1 again": "CP1 vp 0 220n"}
    return Fault(cards, ("netlist-duplicate",), ("CP1",), True)


@fault
def net_dangling(base: Base) -> Fault | None:
    """The load on a net nothing else has."""
    if not has(base, "load") or base.name == "stated_bridge":
        return None
    load = base.roles["load"]
    cards = base.rewired(load, base.nets(load)[0], "outt", which=0)
    return Fault(cards, ("netlist-dangling",), (load, "outt"))


@fault
def element_shorted(base: Base) -> Fault | None:
    """Both ends of the load on one net."""
    if not has(base, "load"):
        return None
    load = base.roles["load"]
    net = base.nets(load)[0]
    cards = base.with_cards(**{load: f"{load} {net} {net} 20k"})
    return Fault(cards, ("netlist-shorted",), (load,))


@fault
def device_unknown(base: Base) -> Fault:
    """A device nobody knows."""
    words = base.cards[base.main].split()
    cards = base.with_cards(**{base.main: " ".join([*words[:-1], "XQ9981"])})
    return Fault(cards, ("netlist-device-unknown",), (base.main,))


@fault
def sources_fight(base: Base) -> Fault:
    """A second source on the positive rail at another level."""
    cards = {**base.cards, "VP2": f"VP2 rawp 0 {base.amplifier.positive * 0.7:.3g}"}
    return Fault(cards, ("netlist-sources-fight",), ("VP2", "VP", "rawp"), True)
