"""Whether a rail is decoupled, at its pins, to its return, often enough."""

from collections.abc import Iterable, Iterator

from railguard.analysis.rail import Capacitor, Rail
from railguard.analysis.stage import Design
from railguard.notices import NotChecked
from railguard.rules.compose import finding
from railguard.rules.decoupling.capacitors import (
    LEAST,
    MOST,
    PER_PIN_SOURCE,
    USUAL,
    at_pins,
    behind_series,
    decoupling_of,
    each_of,
    fit_each,
    is_bare,
    is_return,
    return_net,
    those_of_size,
)
from railguard.rules.finding import Finding
from railguard.rules.protocol import Limit, Limits, Outcome, Rule
from railguard.rules.severity import ROUNDING
from railguard.rules.wording import count, listed
from railguard.units import si
from railguard.words import Severity

# --- decoupling-absent


def judge_absent(rail: Rail, limits: Limits, design: Design) -> Iterator[Outcome]:
    """Judge whether a rail has any decoupling capacitor at all."""
    if not is_bare(rail, limits):
        return
    unvalued = _unvalued((*rail.decoupling, *rail.upstream, *rail.across))
    if unvalued:
        yield _no_value(rail, unvalued, "decoupling-absent")
        return
    if design.kind == "bench":
        yield from _bench(rail, limits, design)
        return
    yield _none_at_the_pins(
        "decoupling-absent",
        "major",
        f"Rail {rail.net} feeds {count(len(rail.packages), 'package')} "
        f"({listed(rail.packages)}) and has no capacitor of {si(limits['least'], 'F')} to "
        f"{si(limits['most'], 'F')} to its return.{_other_sizes(rail)}",
        rail,
    )


def _none_at_the_pins(rule: str, severity: Severity, message: str, rail: Rail) -> Finding:
    """Say that no package of a rail has a capacitor at its pins."""
    return finding(
        rule,
        severity,
        message,
        designators=rail.packages,
        nets=(rail.net,),
        demand=float(len(rail.packages)),
        limit=0.0,
        margin=-float(len(rail.packages)),
        basis=("netlist", "practice"),
        remedy=fit_each(rail, rail.packages),
        source=PER_PIN_SOURCE,
        location=rail.location,
    )


def _unvalued(capacitors: Iterable[Capacitor]) -> tuple[str, ...]:
    return tuple(c.designator for c in capacitors if c.farads is None)


def _no_value(rail: Rail, unvalued: tuple[str, ...], rule: str) -> NotChecked:
    why = f"the value of {listed(unvalued)} on rail {rail.net} could not be read"
    return NotChecked(rail.net, rule, why, f"give {unvalued[0]} a value")


def _other_sizes(rail: Rail) -> str:
    here = [f"{c.designator} ({si(c.farads, 'F')})" for c in at_pins(rail)]
    return f" What stands there is {listed(here)}." if here else ""


def _bench(rail: Rail, limits: Limits, design: Design) -> Iterator[Finding]:
    """Say once for all rails of a deck made to simulate: a model needs no decoupling."""
    bare = [r for r in design.rails if is_bare(r, limits)]
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
        remedy=f"On the board fit {si(USUAL, 'F')} from each rail to its return at "
        f'{each_of(packages)}; if this deck is a board, state kind = "board" under [review].',
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
    limits=(LEAST, MOST),
    judge=judge_absent,
)


# --- decoupling-few


def judge_few(rail: Rail, limits: Limits, design: Design) -> Iterator[Outcome]:
    """Judge whether a rail has one capacitor for each package."""
    good = decoupling_of(rail, limits)
    if is_return(rail) or design.kind == "bench" or not good:
        return
    needed = len(rail.packages) * limits["per-package"]
    if len(good) >= needed * (1 - ROUNDING):
        return
    unvalued = _unvalued(at_pins(rail))
    if len(good) + len(unvalued) >= needed * (1 - ROUNDING):
        yield _no_value(rail, unvalued, "decoupling-few")
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
        remedy=f"Fit {missing} more of {si(USUAL, 'F')} from {rail.net} to {return_net(rail)}, "
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
        LEAST,
        MOST,
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
    if is_return(rail) or not rail.packages or decoupling_of(rail, limits):
        return
    behind = those_of_size(behind_series(rail), limits)
    if not behind:
        return
    through = next((c.behind for c in behind if c.behind), "") or listed(rail.series)
    yield _none_at_the_pins(
        "decoupling-behind-series",
        "minor" if design.kind == "bench" else "major",
        f"The {'capacitor' if len(behind) == 1 else 'capacitors'} "
        f"{listed(c.designator for c in behind)} of rail {rail.net} "
        f"{'stands' if len(behind) == 1 else 'stand'} on the source side of "
        f"{through or 'a series element'}; at the pins of {listed(rail.packages)} there is none.",
        rail,
    )


BEHIND = Rule(
    name="decoupling-behind-series",
    family="decoupling",
    looks_at="rail",
    judges="Whether decoupling stands on the pins' side of a rail's series resistor or ferrite.",
    reason="Fast current has to come past the series element, which is there to stop just that.",
    source=PER_PIN_SOURCE,
    silent="Where a capacitor of the right size stands at the pins as well.",
    limits=(LEAST, MOST),
    judge=judge_behind,
)


# --- decoupling-rail-to-rail-only


def judge_across(rail: Rail, limits: Limits, design: Design) -> Iterator[Outcome]:
    """Judge whether a rail is decoupled to its return and not only to another rail."""
    if is_return(rail) or design.kind == "bench" or not rail.packages:
        return
    if decoupling_of(rail, limits) or those_of_size(behind_series(rail), limits):
        return
    across = those_of_size(rail.across, limits)
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
        f"{'Rail' if len(nets) == 1 else 'Rails'} {listed(nets)} of {listed(packages)} "
        f"{'is' if len(nets) == 1 else 'are'} decoupled only by "
        f"{listed(c.designator for c in across)} to the other rail, not to {return_net(rail)}.",
        designators=packages,
        nets=nets,
        basis=("netlist", "memory"),
        remedy=f"Fit {si(USUAL, 'F')} from {' and from '.join(nets)} to {return_net(rail)} at "
        f"{each_of(packages)}.",
        source="Analog Devices AN462: decouple each pin to the return of the load current; that a "
        "capacitor between the rails is no substitute is from memory",
        location=rail.location,
    )


def _only_across(rail: Rail, limits: Limits) -> bool:
    return bool(those_of_size(rail.across, limits)) and not (
        decoupling_of(rail, limits) or those_of_size(behind_series(rail), limits)
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
    limits=(LEAST, MOST),
    judge=judge_across,
)


RULES = (ABSENT, FEW, BEHIND, ACROSS)
