"""Whether a feedback network's resistors are too small for the output or too large for the input.

Never by ohms alone: small is what the output cannot feed, large is what bias current, input
capacitance or noise make of it.
"""

import math
from collections.abc import Iterator

import msgspec

from railguard.analysis.bound import Bound
from railguard.analysis.stage import Design, Stage, Unknown
from railguard.devices.model import Device
from railguard.rules.compose import first_unknown, open_point, stage_finding
from railguard.rules.drive.current import FAR_FACTOR
from railguard.rules.inputs import LEAST_UNEQUAL, bias_current, output_span
from railguard.rules.protocol import Limit, Limits, Outcome, Rule
from railguard.rules.remedies import (
    LEAST_CAPACITOR,
    compensation,
    decades,
    fit,
    scaled_network,
    sentence,
)
from railguard.rules.severity import (
    TABLE,
    Breach,
    Broken,
    breach,
    capped,
    evidence,
    far_beyond,
    gravity,
)
from railguard.rules.wording import NO_SOURCE, cited, device, listed, origin
from railguard.units import percent, si
from railguard.words import SEVERITIES, Basis, Severity

BOLTZMANN_4KT = 4 * 1.380649e-23 * 300.0
"""J; thermal noise power density of a resistor at 300 K is this times its resistance."""

NO_NETWORK = Unknown(
    "its feedback network could not be solved",
    "run with --engine ngspice where it is installed",
)


def _negative(stage: Stage) -> bool:
    return stage.use == "linear" and stage.loop.dc in ("negative", None)


# --- feedback-low


def judge_low(stage: Stage, limits: Limits, design: Design) -> Iterator[Outcome]:
    """Judge the current a stage's own feedback network takes from its output."""
    if not _negative(stage) or not stage.feedback.resistance:
        return
    bounds = [_own_current(stage, b) for b in (stage.current.source, stage.current.sink)]
    limit_known = [b for b in bounds if b.typical is not None or b.guaranteed is not None]
    gap = None
    if not limit_known:
        gap = Unknown(f"the output current of {stage.device} is not known", "state its limits")
    elif limit_known[0].demand is None:
        gap = NO_NETWORK
    yield from open_point("feedback-low", stage, ("loop", "device"), gap)
    found = [_low(bound, limits) for bound in limit_known]
    broken = min(filter(None, found), key=gravity, default=None)
    if broken is None:
        return
    yield stage_finding(
        "feedback-low",
        stage,
        capped(broken.severity, "minor") if stage.family is None else broken.severity,
        _low_message(stage, broken),
        nets=(stage.output.net,),
        demand=broken.demand,
        limit=broken.limit,
        margin=broken.margin,
        unit="A",
        basis=broken.basis,
        remedy=sentence(
            scaled_network(stage, design, decades(broken.demand / (limits["share"] * broken.limit)))
        ),
        source=cited(stage, broken.limit_basis),
    )


def _own_current(stage: Stage, bound: Bound) -> Bound:
    """Return an output's current limits with the feedback network's own current as the demand.

    Where no signal is stated, what the network takes at the full swing stands in, assumed.
    """
    demand, basis = stage.feedback.current, bound.demand_basis
    load = stage.feedback.load
    rails = [abs(v) for v in (stage.supply.positive, stage.supply.negative) if v is not None]
    if not demand and load and rails:
        demand, basis = max(rails) / load, "assumed"
    return msgspec.structs.replace(
        bound, demand=demand, demand_basis=basis, level=None, span=None, stated=None, default=None
    )


def _low(bound: Bound, limits: Limits) -> Breach | None:
    """Find a limit the network alone breaks, else whether it takes more than its share."""
    broken = breach(bound)
    if broken is not None:
        return far_beyond(bound, broken, limits["far-factor"])
    best, basis = bound.best, bound.best_basis
    if bound.demand is None or best is None or bound.demand <= limits["share"] * best:
        return None
    severity = TABLE["reserve"][evidence(bound.demand_basis, basis)]
    bases: tuple[Basis, ...] = tuple(dict.fromkeys((bound.demand_basis, basis)))
    return Breach(
        "reserve", severity, bound.demand, best, best - bound.demand, None, bases, basis, False
    )


def _low_message(stage: Stage, broken: Breach) -> str:
    when = " at full swing" if "assumed" in broken.basis else ""
    load = f" ({si(stage.feedback.load, 'Ω')})" if stage.feedback.load else ""
    takes = f"{stage.schematic}'s own feedback network{load} takes {si(broken.demand, 'A')}{when}"
    limit = si(broken.limit, "A")
    if broken.broken == "reserve":
        return (
            f"{takes}, {percent(broken.demand / broken.limit)} of the {limit} {device(stage)} "
            f"gives ({origin(broken.limit_basis)}), before anything reaches the load."
        )
    return (
        f"{takes}; {device(stage)} gives {limit} ({origin(broken.limit_basis)}), so "
        f"{si(-broken.margin, 'A')} is missing before anything reaches the load."
    )


LOW = Rule(
    name="feedback-low",
    family="feedback",
    looks_at="stage",
    judges="The peak current a stage's own feedback network takes from its output.",
    reason="Feedback current is output load: it costs swing and heat, and leaves less for what the "
    "stage is there to drive.",
    source="the device's data sheet for the current; the share is common practice, no source",
    silent="Followers wired straight back. Where no signal is stated the current at full swing "
    "stands in, and the finding is minor at most.",
    limits=(
        Limit(
            name="share",
            default=0.5,
            unit="",
            meaning="share of the output current its own feedback may take",
            source=NO_SOURCE,
        ),
        FAR_FACTOR,
    ),
    judge=judge_low,
)


# --- feedback-high


class _Trouble(msgspec.Struct, frozen=True):
    """One thing large resistors do.

    fitting  resistance at the inverting input that would just do, ohm
    """

    severity: Severity
    words: str
    fitting: float
    basis: tuple[Basis, ...]
    cure: str = ""


def judge_high(stage: Stage, limits: Limits, design: Design) -> Iterator[Outcome]:
    """Judge what bias current, input capacitance and noise make of the feedback resistors."""
    if not _negative(stage) or stage.feedback.resistance == 0 or not stage.feedback.elements:
        return
    seen, family = stage.feedback.seen, stage.family
    gap = NO_NETWORK if seen is None else None
    yield from open_point("feedback-high", stage, ("loop", "device"), gap)
    if not seen or family is None or first_unknown(stage, ("loop",)) is not None:
        return
    troubles = [t for t in (_bias(stage, family, limits, design),
                            _pole(stage, family, seen, limits),
                            _noise(stage, family, seen, limits)) if t is not None]  # fmt: skip
    if not troubles:
        return
    troubles.sort(key=lambda t: (SEVERITIES.index(t.severity), t.fitting))
    worst = troubles[0]
    cures = tuple(dict.fromkeys(t.cure for t in troubles if t.cure))
    yield stage_finding(
        "feedback-high",
        stage,
        worst.severity,
        f"{stage.schematic}'s feedback network is {si(seen, 'Ω')} at the inverting input: "
        f"{'; '.join(t.words for t in troubles)}.",
        nets=(stage.inputs.minus.net,),
        demand=seen,
        limit=worst.fitting,
        margin=worst.fitting - seen,
        unit="Ω",
        basis=worst.basis,
        remedy=sentence(scaled_network(stage, design, -decades(seen / worst.fitting)), *cures),
        source=_high_source(stage, worst),
    )


def _high_source(stage: Stage, worst: _Trouble) -> str:
    reasons = "Texas Instruments SLOA013A; S. Franco, Design with Operational Amplifiers, 3rd ed."
    sheet = cited(stage, worst.basis[-1])
    return reasons if sheet == NO_SOURCE else f"{reasons}; {sheet}"


def _bias(stage: Stage, family: Device, limits: Limits, design: Design) -> _Trouble | None:
    """Bias current through the network, less what an equal resistance at the other input undoes."""
    current = bias_current(stage, design)
    ohms = stage.inputs.minus.resistance or stage.feedback.seen
    gain = stage.loop.noise_gain_dc
    span, span_basis = output_span(stage)
    if current is None or not ohms or not gain or not span:
        return None
    unequal = ohms - (stage.inputs.plus.resistance or 0.0)
    error = current.amps * unequal * gain
    offset = family.offset_voltage.best or 0.0
    allowed = max(limits["error-share"] * span, offset * gain)
    far = error > limits["far-error-share"] * span
    if error <= allowed or (unequal <= limits["least"] and not far):
        return None
    row: Broken = "typical" if far else "reserve"
    bases: tuple[Basis, ...] = tuple(dict.fromkeys((span_basis, current.basis)))
    return _Trouble(
        severity=TABLE[row][evidence(*bases)],
        words=f"a bias current of {si(current.amps, 'A')} ({current.note}) moves the output by "
        f"{si(error, 'V')}, {percent(error / span)} of its span",
        fitting=ohms * allowed / error,
        basis=bases,
        cure=f"fit a device of less bias current than {device(stage)}",
    )


def _pole(stage: Stage, family: Device, seen: float, limits: Limits) -> _Trouble | None:
    """The pole of the network's resistance with the input capacitance, against the crossover."""
    if stage.topology == "transimpedance":
        return None  # there the source's capacitance counts, and the loop is judged as a whole
    loop = stage.loop
    sure = loop.phase_margin if loop.phase_margin is not None else loop.margins.low
    if not loop.crossover or (sure or 0.0) >= limits["phase-margin"]:
        return None
    listed_farads = family.input_capacitance.best
    farads = listed_farads or limits["input-capacitance"]
    basis: Basis = family.input_capacitance.best_basis if listed_farads else "practice"
    pole = 1 / (2 * math.pi * seen * farads)
    ratio = loop.crossover / pole
    if ratio <= limits["pole-ratio"] or _compensated(stage, seen, farads):
        return None
    row: Broken = "guaranteed" if ratio > limits["far-pole-ratio"] else "reserve"
    return _Trouble(
        severity=TABLE[row][evidence(basis)],
        words=f"with {si(farads, 'F')} of input capacitance ({origin(basis)}) it makes a pole at "
        f"{si(pole, 'Hz')}, and the loop closes at {si(loop.crossover, 'Hz')}",
        fitting=seen * limits["pole-ratio"] / ratio,
        basis=("netlist", basis),
        cure=_capacitor_across(stage, farads),
    )


def _compensated(stage: Stage, seen: float, farads: float) -> bool:
    """Tell whether a capacitor across the feedback already undoes the pole."""
    fitted, resistance = stage.feedback.capacitance or 0.0, stage.feedback.resistance
    if fitted <= 0 or not resistance:
        return False
    enough = [c for c in (compensation(stage, farads),) if c is not None]
    if resistance > seen:
        enough.append(farads * seen / (resistance - seen))
    return fitted >= min(enough, default=math.inf)


def _capacitor_across(stage: Stage, farads: float) -> str:
    wanted = compensation(stage, farads)
    if wanted is None:
        return ""
    fitting = fit(max(wanted, LEAST_CAPACITOR), "up")
    return f"fit {si(fitting, 'F')} across {listed(stage.feedback.elements)}"


def _noise(stage: Stage, family: Device, seen: float, limits: Limits) -> _Trouble | None:
    """The network's thermal noise against the device's own."""
    density = family.voltage_noise.best
    if not density or "transimpedance" in stage.topology:
        return None  # there the large resistor is what makes the signal
    resistor = math.sqrt(BOLTZMANN_4KT * seen)
    if resistor <= limits["noise-ratio"] * density:
        return None
    return _Trouble(
        severity="remark",
        words=f"its thermal noise of {si(resistor, 'V')}/√Hz is {si(resistor / density, '')} times "
        f"the device's own {si(density, 'V')}/√Hz",
        fitting=(limits["noise-ratio"] * density) ** 2 / BOLTZMANN_4KT,
        basis=("netlist", family.voltage_noise.best_basis),
    )


HIGH = Rule(
    name="feedback-high",
    family="feedback",
    looks_at="stage",
    judges="What the feedback network's resistance makes of bias current, input capacitance and "
    "noise; never its ohms alone.",
    reason="Bias current times resistance is offset; resistance and input capacitance are a pole "
    "inside the loop; resistance is noise.",
    source="Texas Instruments SLOA013A; S. Franco, Design with Operational Amplifiers, 3rd ed., "
    "ch. 5 and 8",
    silent="Followers wired straight back; a pole that a feedback capacitor undoes, or that the "
    "phase margin shows to be harmless; pole and noise of a transimpedance stage, which has rules "
    "of its own.",
    limits=(
        Limit(
            name="error-share",
            default=0.01,
            unit="",
            meaning="share of the output span that bias current may move the output by",
            source=NO_SOURCE,
        ),
        Limit(
            name="far-error-share",
            default=0.10,
            unit="",
            meaning="share beyond which it counts like a typical limit",
            source=NO_SOURCE,
        ),
        LEAST_UNEQUAL,
        Limit(
            name="pole-ratio",
            default=1.0,
            unit="",
            meaning="crossover over the pole with input capacitance; one leaves about 50 degrees",
            source="from memory: the pole at 2 to 10 times the bandwidth is often asked for",
        ),
        Limit(
            name="far-pole-ratio",
            default=10.0,
            unit="",
            meaning="ratio beyond which less than 20 degrees are left",
            source="derived: one integrator and one pole",
        ),
        Limit(
            name="input-capacitance",
            default=10e-12,
            unit="F",
            meaning="input capacitance with its stray, where the data sheet lists none",
            source=NO_SOURCE,
        ),
        Limit(
            name="phase-margin",
            default=45.0,
            unit="°",
            meaning="phase margin from which the pole is harmless",
            source="Texas Instruments TIDU535 designs for 45 degrees",
        ),
        Limit(
            name="noise-ratio",
            default=5.0,
            unit="",
            meaning="thermal noise of the network over the device's own",
            source=NO_SOURCE,
        ),
    ),
    judge=judge_high,
)

RULES = (LOW, HIGH)
