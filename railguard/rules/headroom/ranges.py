"""The two headroom rules every stage is judged by: its output range and its input range."""

from collections.abc import Iterator

from railguard.analysis.bound import Bound
from railguard.analysis.stage import Design, Stage, Unknown
from railguard.circuit.model import GROUND
from railguard.rules.compose import (
    breach_finding,
    missing_figure,
    open_point,
)
from railguard.rules.protocol import Limit, Limits, Outcome, Rule
from railguard.rules.remedies import (
    blocked_leg,
    other_rail,
    reached_unloaded,
    sentence,
    share_that_fits,
    smaller_gain,
)
from railguard.rules.severity import ROUNDING, Breach, breach, gravity
from railguard.rules.wording import (
    device_on,
    limit_note,
    listed,
    of_volts,
    sheet,
)
from railguard.rules.working import stands_still, standstill
from railguard.units import si
from railguard.words import Severity

Side = tuple[Bound, Breach]

NO_SIGNAL = Unknown(
    "its range is not known",
    "state the signal that reaches it under [signals]",
)

_RESERVE = Limit(
    name="reserve-share",
    default=0.01,
    unit="",
    meaning="share of the demanded span to be left at the guaranteed (else typical) limit",
    source="common practice, no source: 50 to 200 mV for rail-to-rail outputs, 0.5 V for others",
)


def cap_of(stage: Stage) -> Severity:
    """Return the worst severity for a stage: nobody knows what an unknown device reaches."""
    return "minor" if stage.family is None else "critical"


def _sides(
    stage: Stage, bounds: tuple[Bound, Bound], share: float, beyond: Severity = "minor"
) -> list[Side]:
    """Return the sides that break a limit, the worse one first.

    beyond  worst severity where an unknown device's rail itself is passed
    """
    scale = None if stage.ac_coupled else stage.supply.total
    sides = []
    for bound in bounds:
        wanted = share * (bound.span or 0.0)
        broken = breach(bound, wanted, scale=scale, cap=cap_of(stage))
        if stage.family is None and broken is not None and broken.broken == "absolute":
            broken = breach(bound, scale=scale, cap=beyond)
        if broken is not None:
            sides.append((bound, broken))
    return sorted(sides, key=lambda side: gravity(side[1]))


def _gap(stage: Stage, bounds: tuple[Bound, Bound], figure: tuple[str, str]) -> Unknown | None:
    """Say what is missing where nothing can be compared."""
    if all(b.demand is None for b in bounds):
        return NO_SIGNAL
    limits = (b.typical is not None or b.guaranteed is not None for b in bounds)
    return None if all(limits) else missing_figure(stage, *figure)


def corner_words(bound: Bound, broken: Breach) -> str:
    """Begin a sentence about a corner: which tolerances, and what moves it most."""
    if not broken.at_corner:
        return ""
    kind = "default" if broken.broken == "default-corner" else "stated"
    most = f" ({listed(bound.culprits[:3])} move it most)" if bound.culprits else ""
    return f"At the worst corner of the {kind} tolerances{most} "


# --- headroom-output


def judge_output(stage: Stage, limits: Limits, design: Design) -> Iterator[Outcome]:
    """Judge the output's demanded range against what rails, device and load let it reach."""
    if stage.use != "linear":
        return
    if standstill(stage) is not None:
        yield from stands_still("headroom-output", stage)
        return
    bounds = (stage.output.high, stage.output.low)
    gap = _gap(stage, bounds, ("output swing", "swing_high and swing_low"))
    yield from open_point("headroom-output", stage, ("supply", "output", "device"), gap)
    # Whatever the device is, its output ends at its rails.
    sides = _sides(stage, bounds, limits["reserve-share"], beyond="major")
    if not sides:
        return
    bound, broken = sides[0]
    messages = [_output_message(stage, bound, broken)]
    if _is_stuck(stage, bound, broken):
        messages.append("All of its range lies beyond, so it is stuck there and passes no signal.")
    messages += [f"That counts {of_volts(carrier)}." for carrier in stage.current.carriers]
    messages += [_other_end(b, x) for b, x in sides[1:]]
    yield breach_finding(
        "headroom-output",
        stage,
        broken,
        "V",
        " ".join(messages),
        nets=(stage.output.net,),
        remedy=_output_remedy(stage, bound, broken, design, both=len(sides) == 2),
        source=sheet(stage, broken),
    )


def _is_stuck(stage: Stage, bound: Bound, broken: Breach) -> bool:
    """Tell whether no part of the demanded range can be reached."""
    nearest = stage.output.demand.low if bound.upper else stage.output.demand.high
    if nearest is None or broken.broken not in ("absolute", "typical"):
        return False
    return nearest > broken.limit if bound.upper else nearest < broken.limit


def _output_message(stage: Stage, bound: Bound, broken: Breach) -> str:
    who, demand, limit = stage.schematic, si(broken.demand, "V"), si(broken.limit, "V")
    asked = f"{corner_words(bound, broken)}{who} is asked for {demand} at its output"
    down = "" if bound.upper else "down to "
    typical = broken.broken == "typical" or bound.guaranteed is None
    note = limit_note("typical" if typical else "guaranteed", broken.limit_basis, bound.condition)
    missing = si(-broken.margin, "V")
    match broken.broken:
        case "absolute":
            end = "positive" if bound.upper else "negative"
            return f"{asked}; its {end} rail is at {limit}, so {missing} is missing for any device."
        case "typical":
            return (
                f"{asked}; {device_on(stage)} reaches {down}{limit} {note}, "
                f"so {missing} is missing."
            )
        case "reserve":
            left = si(broken.margin, "V")
            return (
                f"{asked}; {device_on(stage)} reaches {down}{limit} {note}, so only {left} is left."
            )
        case _:
            return (
                f"{asked}; {device_on(stage)} is sure to reach {down}{limit} {note}, "
                f"so {missing} is not covered."
            )


def _other_end(bound: Bound, broken: Breach) -> str:
    end = "upper" if bound.upper else "lower"
    if broken.broken == "reserve":
        return f"At the {end} end {si(broken.margin, 'V')} is left."
    asked, reached = _volts(broken.demand, bound), si(broken.limit, "V")
    return f"At the {end} end {asked} is asked for and {reached} reached."


def _output_remedy(
    stage: Stage, bound: Bound, broken: Breach, design: Design, *, both: bool
) -> str:
    level = stage.output.level or 0.0
    outside = level > broken.limit if bound.upper else level < broken.limit
    gain = shift = ""
    opposite = stage.output.low if bound.upper else stage.output.high
    share = share_that_fits(stage, bound, opposite)
    one = len(stage.gain) <= 1 or stage.balance is not None
    if one or not outside:
        gain = smaller_gain(stage, share, design)
    nominal = broken.broken != "reserve" and not broken.at_corner
    if outside or (not gain and nominal and _has_room(bound, opposite)):
        side = "below" if bound.upper else "above"
        target = broken.limit if outside else level + broken.limit - broken.demand
        shift = f"move the output's level ({_volts(level, bound)}) {side} {si(target, 'V')}"
        if _volts(level, bound) == si(target, "V"):  # three digits do not tell them apart
            way, far = "down" if bound.upper else "up", si(abs(target - level), "V")
            shift = f"move the output's level ({_volts(level, bound)}) {way} by {far}"
        if stage.topology.startswith("inverting") and stage.inputs.plus.net == GROUND:
            shift += ", by a reference at its non-inverting input instead of ground"
    device = ""
    family = stage.family
    rail = stage.supply.positive if bound.upper else stage.supply.negative
    inside = rail is not None and (broken.demand < rail if bound.upper else broken.demand > rail)
    if inside and not (family is not None and family.rail_to_rail_output):
        device = "fit a device whose output comes closer to the rail"
    load = ""
    if broken.margin < 0 and reached_unloaded(stage, broken.demand, bound.upper):
        load = "lighten its load"
    rail_words = other_rail(stage, bound.upper, _missing(bound, broken), both)
    other = ""
    precise = bool(broken.at_corner and _moved_by_offset(bound))
    if not (precise or load or gain or shift or rail_words or device):
        side = "below" if bound.upper else "above"
        other = f"attenuate or shift its signal so that the output stays {side} "
        other += si(broken.limit, "V")
    blocked = blocked_leg(stage, design)
    better = "fit a device of less offset voltage" if precise else ""
    return sentence(better, blocked, load, gain, shift, rail_words, device, other)


def _missing(bound: Bound, broken: Breach) -> float:
    """Return what a rail must make room for: up to what is sure to be reached, not to the rail."""
    best = bound.best
    if best is None or bound.demand is None:
        return -broken.margin
    return max(-broken.margin, bound.demand - best if bound.upper else best - bound.demand)


def _moved_by_offset(bound: Bound) -> bool:
    """Tell whether it is the stage's offset that moves a corner most."""
    return bool(bound.culprits) and bound.culprits[0].startswith("offset of ")


def _has_room(bound: Bound, opposite: Bound) -> bool:
    """Tell whether the demanded span fits between the limits, moved as a whole."""
    end, other = bound.best, opposite.best
    if bound.span is None or end is None or other is None:
        return False
    return 0 < bound.span <= abs(end - other)


def _volts(value: float, bound: Bound) -> str:
    """Write a voltage; what arithmetic leaves of zero is zero."""
    return si(0.0 if abs(value) < ROUNDING * (bound.span or 1.0) else value, "V")


OUTPUT = Rule(
    name="headroom-output",
    family="headroom",
    looks_at="stage",
    judges="The output's demanded range against the swing the device reaches on its rails at the "
    "current it delivers: typical at nominal, guaranteed at the corners.",
    reason="An output clips where its last transistors run out of voltage, a volt or two from the "
    "rail in classic devices, and the further the more current it gives.",
    source="the device's data sheet; Texas Instruments SBOA583 on swing limits",
    silent="Comparators, oscillators and unused channels, whose output is meant to stand at a "
    "limit. A stage whose loop is open, whose supply or signal nobody states, or whose device is "
    "unknown is listed as not checked.",
    limits=(_RESERVE,),
    judge=judge_output,
)


# --- headroom-input


def judge_input(stage: Stage, limits: Limits, design: Design) -> Iterator[Outcome]:
    """Judge the range of the inputs against the device's common-mode range."""
    if stage.use != "linear":
        return
    if standstill(stage) is not None:
        yield from stands_still("headroom-input", stage)
        return
    bounds = (stage.inputs.high, stage.inputs.low)
    gap = _gap(stage, bounds, ("input common-mode range", "input_low and input_high"))
    yield from open_point("headroom-input", stage, ("supply", "input", "device"), gap)
    sides = _sides(stage, bounds, limits["reserve-share"])
    if not sides:
        return
    bound, broken = sides[0]
    messages = [_input_message(stage, bound, broken)]
    messages += [_other_input_end(b, x) for b, x in sides[1:]]
    yield breach_finding(
        "headroom-input",
        stage,
        broken,
        "V",
        " ".join(messages),
        nets=(stage.inputs.plus.net,),
        remedy=_input_remedy(stage, bound, broken),
        source=sheet(stage, broken),
    )


def _input_message(stage: Stage, bound: Bound, broken: Breach) -> str:
    word = "up to" if bound.upper else "down to"
    verb = "go" if not broken.at_corner else "may go"
    lead = corner_words(bound, broken)
    asked = f"{lead}{stage.schematic}'s inputs {verb} {word} {si(broken.demand, 'V')}"
    limit, missing = si(broken.limit, "V"), si(-broken.margin, "V")
    if broken.broken == "absolute":
        return f"{asked}; the absolute limit there is {limit}, so they are {missing} beyond it."
    kind = "typical" if broken.broken == "typical" or bound.guaranteed is None else "guaranteed"
    note = limit_note(kind, broken.limit_basis, bound.condition)
    allows = f"{device_on(stage)} takes inputs {word} {limit} {note}"
    if broken.broken == "reserve":
        return f"{asked}; {allows}, so only {si(broken.margin, 'V')} is left."
    return f"{asked}; {allows}, so they are {missing} beyond it."


def _other_input_end(bound: Bound, broken: Breach) -> str:
    end = "upper" if bound.upper else "lower"
    return (
        f"At the {end} end they go to {si(broken.demand, 'V')}, and {si(broken.limit, 'V')} is the "
        "limit."
    )


def _input_remedy(stage: Stage, bound: Bound, broken: Breach) -> str:
    word = "below" if bound.upper else "above"
    keep = f"keep the inputs {word} {si(broken.limit, 'V')} by attenuating or shifting the signal"
    if stage.topology == "inverting":
        keep = f"put the reference at the non-inverting input {word} {si(broken.limit, 'V')}"
    device = ""
    if not (stage.family is not None and stage.family.rail_to_rail_input):
        end = "positive" if bound.upper else "negative"
        device = f"fit a device whose inputs reach the {end} rail"
    return sentence(keep, other_rail(stage, bound.upper, -broken.margin), device)


INPUT = Rule(
    name="headroom-input",
    family="headroom",
    looks_at="stage",
    judges="The range both inputs cover against the device's common-mode range, nominal and at the "
    "corners.",
    reason="Outside its common-mode range an input pair loses its current: gain falls, offset "
    "jumps, and some devices turn their output over.",
    source="the device's data sheet; Analog Devices MT-036",
    silent="Comparators, oscillators and unused channels. Open loops, unstated supplies or signals "
    "and unknown devices are listed as not checked.",
    limits=(_RESERVE,),
    judge=judge_input,
)

RULES = (OUTPUT, INPUT)
