"""What else capacitors on rails and references should be: large, small, rated, there."""

import math
from collections.abc import Iterator

from railguard.analysis.rail import Capacitor, Package, Rail
from railguard.analysis.stage import Design, Stage
from railguard.notices import NotChecked
from railguard.rules.compose import channels_of, finding, stage_finding
from railguard.rules.decoupling.capacitors import (
    BULK_SOURCE,
    at_pins,
    is_return,
    return_net,
)
from railguard.rules.finding import Finding
from railguard.rules.protocol import Limit, Limits, Outcome, Rule
from railguard.rules.severity import ROUNDING
from railguard.rules.wording import NO_SOURCE, listed
from railguard.units import percent, si

# --- decoupling-bulk


def judge_bulk(rail: Rail, limits: Limits, design: Design) -> Iterator[Outcome]:
    """Judge whether a decoupled rail has a larger capacitor somewhere."""
    if is_return(rail) or design.kind == "bench" or rail.ideal or not at_pins(rail):
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
        remedy=f"Fit one of 10 µF from {rail.net} to {return_net(rail)} where the rail enters "
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
        if package.designator not in rail.packages or is_return(rail) or not rail.decoupling:
            continue
        if any(c.farads is not None and c.farads <= limits["most"] for c in at_pins(rail)):
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
            remedy=f"Add 1 nF from {rail.net} to {return_net(rail)} in the smallest case at "
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
    switches = stage.use in ("comparator", "oscillator")
    if stage.use == "unused" or switches or divider is None or design.kind == "bench":
        return
    if set(divider.elements) <= design.bridges:
        return  # half of a sensor: a capacitor there would take its signal
    corner = 1 / (2 * math.pi * divider.resistance * divider.bypass) if divider.bypass else None
    if corner is not None and corner <= limits["corner"]:
        return
    if divider.unvalued:
        why = f"the value of {divider.unvalued} at the divider's tap could not be read"
        add = f"give {divider.unvalued} a value"
        yield NotChecked(stage.designator, "decoupling-reference", why, add)
        return
    small = "without a capacitor: what the rail carries reaches the output"
    if corner is not None:
        small = f"with only {si(divider.bypass, 'F')}: what the rail carries below "
        small += f"{si(corner, 'Hz')} reaches the output"
    yield stage_finding(
        "decoupling-reference",
        stage,
        "minor",
        f"The level of {stage.schematic}'s non-inverting input comes from the divider "
        f"{listed(divider.elements)} ({si(divider.resistance, 'Ω')}) straight from a rail, "
        f"{small}.",
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
    silent="Comparators and oscillators, whose thresholds may well follow the rail; bench decks.",
    limits=(
        Limit(
            name="corner",
            default=1e3,
            unit="Hz",
            meaning="highest corner of divider and capacitor that counts as bypassed",
            source=NO_SOURCE,
        ),
    ),
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

RULES = (BULK, FAST, REFERENCE, RATING)
