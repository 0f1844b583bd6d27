"""Decoupling, judged per rail: a netlist knows no distance."""

from collections.abc import Iterable, Iterator

from railguard.analysis.stage import Capacitor, Design, Package, Rail, Stage
from railguard.circuit.model import GROUND
from railguard.notices import NotChecked
from railguard.rules.compose import channels_of, finding, stage_finding
from railguard.rules.finding import Finding
from railguard.rules.protocol import Limit, Limits, Outcome, Rule
from railguard.rules.severity import ROUNDING
from railguard.rules.wording import NO_SOURCE, count, listed
from railguard.units import percent, si

PER_PIN_SOURCE = (
    "Texas Instruments OP07C SLOS099G, OPA172 SBOS618H and TLV274 data sheets, layout sections: "
    "0.1 µF at each supply pin; Microchip DS21812E: 0.01 to 0.1 µF; Analog Devices AN462"
)
BULK_SOURCE = (
    "Microchip DS21812E asks for 1 µF within 100 mm; Analog Devices AN462 and the MCP6141 data "
    "sheet hold it for seldom needed: sources disagree"
)
USUAL = 100e-9
"""F; the value every source names."""

_LEAST = Limit(
    name="least",
    default=10e-9,
    unit="F",
    meaning="smallest capacitor that counts as decoupling",
    source="Microchip DS21812E and Analog Devices AN462: 10 to 100 nF",
)
_MOST = Limit(
    name="most",
    default=1e-6,
    unit="F",
    meaning="largest capacitor that counts as decoupling rather than bulk",
    source=NO_SOURCE,
)


def _is_return(rail: Rail) -> bool:
    return rail.net == GROUND or rail.net in rail.returns


def _within(capacitor: Capacitor, limits: Limits) -> bool:
    """Tell whether a capacitor is of the size that decouples."""
    farads = capacitor.farads
    return farads is not None and (
        limits["least"] * (1 - ROUNDING) <= farads <= limits["most"] * (1 + ROUNDING)
    )


def _at_pins(rail: Rail) -> tuple[Capacitor, ...]:
    return tuple(c for c in rail.decoupling if not c.behind)


def _upstream(rail: Rail) -> tuple[Capacitor, ...]:
    return tuple(c for c in rail.decoupling if c.behind) + rail.upstream


def _good(rail: Rail, limits: Limits) -> tuple[Capacitor, ...]:
    """Return the capacitors that decouple a rail at its pins."""
    return tuple(c for c in _at_pins(rail) if _within(c, limits))


def _any_within(capacitors: Iterable[Capacitor], limits: Limits) -> tuple[Capacitor, ...]:
    return tuple(c for c in capacitors if _within(c, limits))


def _bare(rail: Rail, limits: Limits) -> bool:
    """Tell whether a rail has no decoupling of any kind, here, upstream or across."""
    if _is_return(rail) or not rail.packages:
        return False
    return not (
        _good(rail, limits)
        or _any_within(_upstream(rail), limits)
        or _any_within(rail.across, limits)
    )


def _return_words(rail: Rail) -> str:
    return rail.returns[0] if rail.returns else GROUND


# --- decoupling-absent


def judge_absent(rail: Rail, limits: Limits, design: Design) -> Iterator[Outcome]:
    """Judge whether a rail has any decoupling capacitor at all."""
    if not _bare(rail, limits):
        return
    unknown = [c.designator for c in rail.decoupling if c.farads is None]
    if unknown:
        why = f"the value of {listed(unknown)} on rail {rail.net} could not be read"
        yield NotChecked(rail.net, "decoupling-absent", why, f"give {unknown[0]} a value")
        return
    if design.kind == "bench":
        yield from _bench(rail, limits, design)
        return
    yield finding(
        "decoupling-absent",
        "major",
        f"Rail {rail.net} feeds {count(len(rail.packages), 'package')} "
        f"({listed(rail.packages)}) and has no capacitor of {si(limits['least'], 'F')} to "
        f"{si(limits['most'], 'F')} to its return.{_other_sizes(rail)}",
        designators=rail.packages,
        nets=(rail.net,),
        demand=float(len(rail.packages)),
        limit=0.0,
        margin=-float(len(rail.packages)),
        basis=("netlist", "practice"),
        remedy=_fit(rail, rail.packages),
        source=PER_PIN_SOURCE,
        location=rail.location,
    )


def _other_sizes(rail: Rail) -> str:
    here = [f"{c.designator} ({si(c.farads, 'F')})" for c in _at_pins(rail)]
    return f" What stands there is {listed(here)}." if here else ""


def _fit(rail: Rail, packages: tuple[str, ...]) -> str:
    each = f"each of {listed(packages)}" if len(packages) > 1 else listed(packages)
    return f"Fit {si(USUAL, 'F')} from {rail.net} to {_return_words(rail)} at {each}."


def _bench(rail: Rail, limits: Limits, design: Design) -> Iterator[Finding]:
    """Say once for all rails of a deck made to simulate: a model needs no decoupling."""
    bare = [r for r in design.rails if _bare(r, limits)]
    if bare[0].net != rail.net:
        return
    packages = tuple(dict.fromkeys(p for r in bare for p in r.packages))
    nets = tuple(r.net for r in bare)
    noun = "rail" if len(nets) == 1 else "rails"
    yield finding(
        "decoupling-absent",
        "minor",
        f"No capacitor stands on {noun} {listed(nets)} ({listed(packages)}). The deck is read as a "
        "bench, where ideal sources need none; a board does.",
        designators=packages,
        nets=nets,
        basis=("netlist", "practice"),
        remedy=f"On the board fit {si(USUAL, 'F')} from each rail to its return at each of "
        f'{listed(packages)}; if this deck is a board, state kind = "board" under [review].',
        source=PER_PIN_SOURCE,
        location=rail.location,
    )


ABSENT = Rule(
    name="decoupling-absent",
    family="decoupling",
    looks_at="rail",
    judges="Whether a rail that feeds op-amps has any capacitor of 10 nF to 1 µF to its return.",
    reason="The inductance of a supply line keeps fast load current from the device: its output "
    "rings or oscillates, and noise on the rail passes where rejection has fallen off.",
    source=PER_PIN_SOURCE,
    silent="On a bench deck one minor finding names all packages. Where only capacitors to "
    "another rail or behind a series element exist, the rules for those speak instead.",
    limits=(_LEAST, _MOST),
    judge=judge_absent,
)


# --- decoupling-few


def judge_few(rail: Rail, limits: Limits, design: Design) -> Iterator[Outcome]:
    """Judge whether a rail has one capacitor for each package."""
    good = _good(rail, limits)
    if _is_return(rail) or design.kind == "bench" or not good:
        return
    needed = len(rail.packages) * limits["per-package"]
    if len(good) >= needed * (1 - ROUNDING):
        return
    missing = max(1, round(needed - len(good)))
    yield finding(
        "decoupling-few",
        "minor",
        f"Rail {rail.net} feeds {count(len(rail.packages), 'package')} "
        f"({listed(rail.packages)}) and has {count(len(good), 'capacitor')} to its return "
        f"({listed(c.designator for c in good)}). A netlist does not tell which package goes "
        "without.",
        designators=rail.packages,
        nets=(rail.net,),
        demand=needed,
        limit=float(len(good)),
        margin=len(good) - needed,
        basis=("netlist", "practice"),
        remedy=f"Fit {missing} more of {si(USUAL, 'F')} from {rail.net} to {_return_words(rail)}, "
        "so that each package has its own.",
        source=PER_PIN_SOURCE,
        location=rail.location,
    )


FEW = Rule(
    name="decoupling-few",
    family="decoupling",
    looks_at="rail",
    judges="Whether a rail has as many decoupling capacitors as packages.",
    reason="A capacitor helps the package it stands beside; a centimetre of trace is some 10 nH.",
    source=PER_PIN_SOURCE,
    silent="On bench decks, and where there is none at all: that is decoupling-absent.",
    limits=(
        _LEAST,
        _MOST,
        Limit(
            name="per-package",
            default=1.0,
            unit="",
            meaning="capacitors wanted on a rail for each package",
            source=PER_PIN_SOURCE,
        ),
    ),
    judge=judge_few,
)


# --- decoupling-behind-series


def judge_behind(rail: Rail, limits: Limits, design: Design) -> Iterator[Outcome]:
    """Judge whether a rail's capacitors stand on the pins' side of its series element."""
    if _is_return(rail) or not rail.packages or _good(rail, limits):
        return
    behind = _any_within(_upstream(rail), limits)
    if not behind:
        return
    through = next((c.behind for c in behind if c.behind), "") or listed(rail.series)
    yield finding(
        "decoupling-behind-series",
        "minor" if design.kind == "bench" else "major",
        f"The {'capacitor' if len(behind) == 1 else 'capacitors'} "
        f"{listed(c.designator for c in behind)} of rail {rail.net} "
        f"{'stands' if len(behind) == 1 else 'stand'} on the source side of "
        f"{through or 'a series element'}; at the pins of {listed(rail.packages)} there is none.",
        designators=rail.packages,
        nets=(rail.net,),
        demand=float(len(rail.packages)),
        limit=0.0,
        margin=-float(len(rail.packages)),
        basis=("netlist", "practice"),
        remedy=_fit(rail, rail.packages),
        source=PER_PIN_SOURCE,
        location=rail.location,
    )


BEHIND = Rule(
    name="decoupling-behind-series",
    family="decoupling",
    looks_at="rail",
    judges="Whether decoupling stands on the pins' side of a rail's series resistor or ferrite.",
    reason="Fast current has to come past the series element, which is there to stop just that.",
    source=PER_PIN_SOURCE,
    silent="Where a capacitor of the right size stands at the pins as well.",
    limits=(_LEAST, _MOST),
    judge=judge_behind,
)


# --- decoupling-rail-to-rail-only


def judge_across(rail: Rail, limits: Limits, design: Design) -> Iterator[Outcome]:
    """Judge whether a rail is decoupled to its return and not only to another rail."""
    if _is_return(rail) or design.kind == "bench" or not rail.packages:
        return
    if _good(rail, limits) or _any_within(_upstream(rail), limits):
        return
    across = _any_within(rail.across, limits)
    if not across:
        return
    partners = [r for r in design.rails if any(r.net == c.to for c in across)]
    if any(design.rails.index(p) < design.rails.index(rail) and _only_across(p, limits)
           for p in partners):  # fmt: skip
        return  # told with the other rail
    nets = (rail.net, *(p.net for p in partners if _only_across(p, limits)))
    packages = tuple(dict.fromkeys([*rail.packages, *(d for p in partners for d in p.packages)]))
    yield finding(
        "decoupling-rail-to-rail-only",
        "minor",
        f"Rail {listed(nets)} of {listed(packages)} "
        f"{'is' if len(nets) == 1 else 'are'} decoupled only by "
        f"{listed(c.designator for c in across)} to the other rail, not to {_return_words(rail)}.",
        designators=packages,
        nets=nets,
        basis=("netlist", "memory"),
        remedy=f"Fit {si(USUAL, 'F')} from {' and from '.join(nets)} to {_return_words(rail)} at "
        f"{'each of ' if len(packages) > 1 else ''}{listed(packages)}.",
        source="Analog Devices AN462: decouple each pin to the return of the load current; that a "
        "capacitor between the rails is no substitute is from memory",
        location=rail.location,
    )


def _only_across(rail: Rail, limits: Limits) -> bool:
    return bool(_any_within(rail.across, limits)) and not (
        _good(rail, limits) or _any_within(_upstream(rail), limits)
    )


ACROSS = Rule(
    name="decoupling-rail-to-rail-only",
    family="decoupling",
    looks_at="rail",
    judges="Whether a rail is decoupled to its return, not only to the opposite rail.",
    reason="The output's current returns through ground, so a capacitor between the rails leaves "
    "half of its path outside.",
    source="Analog Devices AN462; in part from memory",
    silent="On bench decks, and where the circuit uses no ground: the opposite rail is then the "
    "return.",
    limits=(_LEAST, _MOST),
    judge=judge_across,
)


# --- decoupling-bulk


def judge_bulk(rail: Rail, limits: Limits, design: Design) -> Iterator[Outcome]:
    """Judge whether a decoupled rail has a larger capacitor somewhere."""
    if _is_return(rail) or design.kind == "bench" or rail.ideal or not _good(rail, limits):
        return
    every = (*rail.decoupling, *rail.upstream, *rail.across)
    if any(c.farads is None or c.farads >= limits["least"] * (1 - ROUNDING) for c in every):
        return
    largest = max(c.farads or 0.0 for c in every)
    yield finding(
        "decoupling-bulk",
        "remark",
        f"The largest capacitor on rail {rail.net} is {si(largest, 'F')}; some data sheets ask for "
        f"{si(limits['least'], 'F')} or more shared by the packages near by, others hold it for "
        "needless.",
        designators=rail.packages,
        nets=(rail.net,),
        demand=limits["least"],
        limit=largest,
        margin=largest - limits["least"],
        unit="F",
        basis=("netlist", "practice"),
        remedy=f"Fit one of 10 µF from {rail.net} to {_return_words(rail)} where the rail enters "
        "the sheet, if the regulator has none.",
        source=BULK_SOURCE,
        location=rail.location,
    )


BULK = Rule(
    name="decoupling-bulk",
    family="decoupling",
    looks_at="rail",
    judges="Whether a rail has a bulk capacitor besides its decoupling.",
    reason="Slow load changes draw on charge that 100 nF does not hold: 40 mA for 100 ns in 10 mV "
    "is 0.4 µF already.",
    source=BULK_SOURCE,
    silent="On bench decks, rails held by an ideal source, and rails without any decoupling.",
    limits=(
        Limit(
            name="least",
            default=1e-6,
            unit="F",
            meaning="smallest capacitor that counts as bulk",
            source="Microchip DS21812E",
        ),
    ),
    judge=judge_bulk,
)


# --- decoupling-fast


def judge_fast(package: Package, limits: Limits, design: Design) -> Iterator[Outcome]:
    """Judge whether a fast device has a second, smaller capacitor on its rails."""
    stages = [s for s in channels_of(package, design) if _bandwidth(s) > limits["bandwidth"]]
    if not stages or design.kind == "bench":
        return
    for rail in design.rails:
        if package.designator not in rail.packages or _is_return(rail) or not rail.decoupling:
            continue
        if any(c.farads is not None and c.farads <= limits["most"] for c in _at_pins(rail)):
            continue
        yield finding(
            "decoupling-fast",
            "remark",
            f"{package.designator} ({stages[0].device}) has a gain-bandwidth product of "
            f"{si(_bandwidth(stages[0]), 'Hz')}, and no capacitor of {si(limits['most'], 'F')} or "
            f"less stands on {rail.net} beside the larger ones.",
            designators=package.channels or (package.designator,),
            nets=(rail.net,),
            basis=("netlist", stages[0].family.gain_bandwidth.typical_basis, "practice")
            if stages[0].family
            else ("netlist", "practice"),
            remedy=f"Add 1 nF from {rail.net} to {_return_words(rail)} in the smallest case at "
            f"{package.designator}.",
            source="from memory; parallel values can resonate against each other",
            location=package.location,
        )


def _bandwidth(stage: Stage) -> float:
    return (stage.family.gain_bandwidth.best or 0.0) if stage.family is not None else 0.0


FAST = Rule(
    name="decoupling-fast",
    family="decoupling",
    looks_at="package",
    judges="Whether a device faster than 50 MHz has a small capacitor beside the usual one.",
    reason="100 nF in an ordinary case turns inductive near 15 MHz.",
    source="from memory; common practice",
    silent="Slower devices, and bench decks.",
    limits=(
        Limit(
            name="bandwidth",
            default=50e6,
            unit="Hz",
            meaning="gain-bandwidth product above which a device counts as fast",
            source=NO_SOURCE,
        ),
        Limit(
            name="most",
            default=10e-9,
            unit="F",
            meaning="largest capacitor that counts as the small one",
            source=NO_SOURCE,
        ),
    ),
    judge=judge_fast,
)


# --- decoupling-reference


def judge_reference(stage: Stage, limits: Limits, design: Design) -> Iterator[Outcome]:
    """Judge whether the divider that sets an input's level is bypassed."""
    divider = stage.inputs.plus.divider
    if stage.use in ("unused", "comparator") or divider is None or design.kind == "bench":
        return
    if divider.bypass > 0:
        return
    yield stage_finding(
        "decoupling-reference",
        stage,
        "minor",
        f"The level of {stage.schematic}'s non-inverting input comes from the divider "
        f"{listed(divider.elements)} ({si(divider.resistance, 'Ω')}) straight from a rail, without "
        "a capacitor: what the rail carries reaches the output.",
        nets=(stage.inputs.plus.net,),
        demand=divider.resistance,
        unit="Ω",
        basis=("netlist", "practice"),
        remedy=f"Fit 10 µF from the divider's tap (net {stage.inputs.plus.net}) to the return; if "
        "a signal is fed in at the tap, give the divider a tap of its own and lead it in through a "
        "resistor.",
        source="Analog Devices AN-581 names the trouble; the remedy is from memory",
    )


REFERENCE = Rule(
    name="decoupling-reference",
    family="decoupling",
    looks_at="stage",
    judges="Whether a reference divided from a rail has a capacitor.",
    reason="A bare divider passes half of what the rail carries; no supply rejection helps there.",
    source="Analog Devices AN-581, opening section",
    silent="Comparators, whose threshold may well follow the rail; bench decks.",
    judge=judge_reference,
)


# --- decoupling-rating


def judge_rating(rail: Rail, limits: Limits, design: Design) -> Iterator[Outcome]:
    """Judge the voltage rating and polarity of a rail's capacitors, where the card states them."""
    level = None if rail.level is None else abs(rail.level)
    for capacitor in (*rail.decoupling, *rail.upstream):
        if capacitor.reversed:
            yield _capacitor(
                rail,
                capacitor,
                f"{capacitor.designator} is polarised and stands the wrong way round on "
                f"{rail.net} ({si(rail.level, 'V')}).",
                f"Turn {capacitor.designator} round.",
                major=True,
            )
        if capacitor.rating is None or level is None:
            continue
        allowed = limits["share"] * capacitor.rating
        if level <= allowed * (1 + ROUNDING):
            continue
        yield _capacitor(
            rail,
            capacitor,
            f"{capacitor.designator} is rated {si(capacitor.rating, 'V')} and stands at "
            f"{si(level, 'V')} on {rail.net}, {percent(level / capacitor.rating)} of its rating; "
            f"{percent(limits['share'])} is the usual derating.",
            f"Fit one rated at least {si(level / limits['share'], 'V')}.",
            major=level > capacitor.rating,
            numbers=(level, allowed),
        )


def _capacitor(
    rail: Rail,
    capacitor: Capacitor,
    message: str,
    remedy: str,
    *,
    major: bool,
    numbers: tuple[float, float] | None = None,
) -> Finding:
    demand, limit = numbers or (None, None)
    return finding(
        "decoupling-rating",
        "major" if major else "minor",
        message,
        designators=(capacitor.designator,),
        nets=(rail.net,),
        demand=demand,
        limit=limit,
        margin=None if numbers is None else numbers[1] - numbers[0],
        unit="V" if numbers else "",
        basis=(rail.basis, "netlist"),
        remedy=remedy,
        source="System Reliability Center derating table: ceramic 60 to 70 %, tantalum 70 to 80 %",
        location=capacitor.location,
    )


RATING = Rule(
    name="decoupling-rating",
    family="decoupling",
    looks_at="rail",
    judges="The voltage rating and the polarity of a rail's capacitors, where their cards state "
    "them.",
    reason="Ceramic loses capacitance with voltage, tantalum fails short when overdriven.",
    source="System Reliability Center derating table",
    silent="Capacitors whose card states no rating.",
    limits=(
        Limit(
            name="share",
            default=0.70,
            unit="",
            meaning="share of its rated voltage a capacitor may stand at",
            source="System Reliability Center derating table, benign use",
        ),
    ),
    judge=judge_rating,
)

RULES = (ABSENT, FEW, BEHIND, ACROSS, BULK, FAST, REFERENCE, RATING)
