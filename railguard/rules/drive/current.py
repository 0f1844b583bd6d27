"""The current an output must give."""

from collections.abc import Iterator

from msgspec.structs import replace

from railguard.analysis.bound import Bound
from railguard.analysis.stage import Carrier, Design, Stage, Unknown
from railguard.devices.model import UNLISTED_CURRENT
from railguard.rules.compose import (
    breach_finding,
    missing_figure,
    open_point,
)
from railguard.rules.headroom.ranges import cap_of, corner_words
from railguard.rules.protocol import Limit, Limits, Outcome, Rule
from railguard.rules.remedies import SERIES, fit, sentence
from railguard.rules.severity import Breach, breach, capped, far_beyond, gravity
from railguard.rules.wording import NO_SOURCE, device, either, limit_note, of_gain, sheet
from railguard.rules.working import stands_still, standstill
from railguard.units import preferred, si

NO_CURRENT = Unknown(
    "its output current is not known",
    "state the signal that reaches it under [signals], and its load under [loads]",
)

FAR_FACTOR = Limit(
    name="far-factor",
    default=3.0,
    unit="",
    meaning="multiple of the current a device is known to give beyond which, where no typical one "
    "is listed, it counts like a typical limit",
    source="common practice, no source: short-circuit currents are two to five times what swing "
    "is guaranteed at",
)

# --- drive-current


def judge_current(stage: Stage, limits: Limits, design: Design) -> Iterator[Outcome]:
    """Judge the peak current an output must source and sink."""
    if stage.use == "unused":
        return
    if standstill(stage) is not None:
        yield from stands_still("drive-current", stage)
        return
    bounds = {"source": stage.current.source, "sink": stage.current.sink}
    yield from open_point("drive-current", stage, ("supply", "current", "device"), _gap(stage))
    sides = []
    for verb, bound in bounds.items():
        reserve = limits["reserve-share"] * (bound.guaranteed or bound.typical or 0.0)
        broken = breach(bound, reserve)
        if broken is not None:
            broken = far_beyond(bound, broken, limits["far-factor"])
            broken = replace(broken, severity=capped(broken.severity, cap_of(stage)))
            sides.append((verb, bound, broken))
    if not sides:
        return
    sides.sort(key=lambda side: gravity(side[2]))
    verb, bound, broken = sides[0]
    message = _current_message(stage, verb, bound, broken)
    for other_verb, _, other in sides[1:]:
        message += (
            f" It must {other_verb} {si(other.demand, 'A')} as well, against "
            f"{si(other.limit, 'A')}."
        )
    yield breach_finding(
        "drive-current",
        stage,
        broken,
        "A",
        message,
        nets=(stage.output.net,),
        remedy=_current_remedy(stage, broken),
        source=sheet(stage, broken),
    )


def _gap(stage: Stage) -> Unknown | None:
    bounds = (stage.current.source, stage.current.sink)
    if all(b.demand is None for b in bounds):
        return None if stage.use != "linear" else NO_CURRENT
    if any(b.typical is None and b.guaranteed is None for b in bounds):
        return missing_figure(stage, "output current", "source_current and sink_current")
    return None


def _current_message(stage: Stage, verb: str, bound: Bound, broken: Breach) -> str:
    lead = corner_words(bound, broken)
    into = _into(stage)
    asked = f"{lead}{stage.schematic} must {verb} {si(broken.demand, 'A')}{into}"
    limit = si(broken.limit, "A")
    typical = broken.broken == "typical" or bound.guaranteed is None
    note, gives = _note(bound, broken, typical), "gives" if typical else "is known to give"
    if broken.broken == "reserve":
        return f"{asked}; {device(stage)} {gives} {limit} {note}: {si(broken.margin, 'A')} is left."
    end = "missing" if broken.broken == "typical" else "not covered"
    return (
        f"{asked}; {device(stage)} {gives} {limit} {note}, so {si(-broken.margin, 'A')} is {end}."
    )


def _into(stage: Stage) -> str:
    """Say where most of the current goes: into a transistor, which carries more, or a resistor."""
    carrier = _carrier(stage)
    if carrier is not None:
        return f" into the base of {either(carrier)}, which {of_gain(carrier)}"
    return f" into {stage.current.into}" if stage.current.into else ""


def _carrier(stage: Stage) -> Carrier | None:
    """Return the transistor that takes most of an output's current, if one does."""
    most = max(stage.current.carriers, key=lambda c: c.takes, default=None)
    asked = max(stage.current.demand_source or 0.0, stage.current.demand_sink or 0.0)
    return most if most is not None and most.takes > 0.5 * asked else None


def _note(bound: Bound, broken: Breach, typical: bool) -> str:
    """Say what sort of figure a current limit is, where the sheet lists no output current too."""
    if not bound.condition.startswith(UNLISTED_CURRENT):
        kind = "typical" if typical else "guaranteed"
        return limit_note(kind, broken.limit_basis, bound.condition)
    if typical:
        return limit_note("typical short-circuit current", broken.limit_basis)
    if broken.limit_basis == "practice":
        return limit_note("half its short-circuit current", broken.limit_basis)
    test = bound.condition.removeprefix(UNLISTED_CURRENT).lstrip(": ")
    return limit_note(test or "swing test", broken.limit_basis)


def _current_remedy(stage: Stage, broken: Breach) -> str:
    load, buffer = "", "put a buffer behind the stage"
    carrier = _carrier(stage)
    if carrier is not None:
        return sentence(*_more_gain(carrier, broken), "fit a device that gives more current")
    ohms = stage.current.load
    if ohms is not None and ohms > 0 and broken.demand > 0:
        fitting = fit(ohms * broken.demand / broken.limit, "up") if broken.limit > 0 else None
        if fitting is not None:
            load = (
                f"raise what the output works into from {si(ohms, 'Ω')} to at least "
                f"{si(fitting, 'Ω')}, its feedback network included"
            )
    return sentence(load, buffer, "fit a device that gives more current")


def _more_gain(carrier: Carrier, broken: Breach) -> tuple[str, ...]:
    """Say which gain a transistor needs that leaves its output no more than it gives."""
    room = broken.limit - max(broken.demand - carrier.takes, 0.0)
    words = f"put a second transistor in front of {either(carrier)}, a Darlington"
    if room <= 0:
        return (words,)
    wanted = preferred(carrier.carries / room, SERIES, "up")
    gain = f"fit one for {either(carrier)} with a gain of at least {si(wanted, '')}"
    return f"{gain} at {si(carrier.carries, 'A')}", words


CURRENT = Rule(
    name="drive-current",
    family="drive",
    looks_at="stage",
    judges="The peak current an output must source and sink, its own feedback network, any "
    "capacitive load and the base of a transistor it drives included, against what the device is "
    "known to give, then its short-circuit current.",
    reason="Beyond its current an output follows the load, not the input. The short-circuit "
    "current is the point of gross distortion and falls when hot.",
    source="the device's data sheet; Texas Instruments on OPA2134 output current, hot and cold",
    silent="Unused channels. Open loops, unknown devices and loads nobody states are listed as not "
    "checked.",
    limits=(
        Limit(
            name="reserve-share",
            default=0.0,
            unit="",
            meaning="share of the guaranteed (else typical) current to be left",
            source=NO_SOURCE,
        ),
        FAR_FACTOR,
    ),
    judge=judge_current,
)

RULES = (CURRENT,)
