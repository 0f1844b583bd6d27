"""What an output or an input is joined to: other outputs, rails, sources, a capacitor."""

import math
from collections.abc import Iterator

from railguard.analysis.stage import Design, Stage
from railguard.circuit.model import GROUND, Element
from railguard.rules.compose import finding, missing_figure, open_point, stage_finding
from railguard.rules.protocol import Limit, Limits, Outcome, Rule
from railguard.rules.remedies import fit
from railguard.rules.severity import evidence
from railguard.rules.wording import NO_SOURCE, device, listed, origin
from railguard.units import si
from railguard.words import Severity

# --- drive-joined


def judge_joined(stage: Stage, limits: Limits, design: Design) -> Iterator[Outcome]:
    """Judge whether two outputs stand on one net."""
    same = [s for s in design.stages if s.output.net == stage.output.net]
    if len(same) < 2 or same[0].designator != stage.designator:
        return
    # Outputs with open collectors may be joined, and an unknown device used as a comparator may
    # have one.
    open_collectors = all(s.use == "comparator" and s.family is None for s in same)
    severity: Severity = "minor" if open_collectors else "critical"
    yield finding(
        "drive-joined",
        severity,
        f"The outputs of {listed(s.schematic for s in same)} are joined on net "
        f"{stage.output.net} without a resistor between them: each drives into the other.",
        designators=tuple(s.designator for s in same),
        nets=(stage.output.net,),
        demand=float(len(same)),
        limit=1.0,
        margin=1.0 - len(same),
        remedy="Part the outputs; where two are to share a load, give each a series resistor of "
        "10 Ω to 47 Ω.",
        source=NO_SOURCE,
        location=stage.location,
    )


JOINED = Rule(
    name="drive-joined",
    family="drive",
    looks_at="stage",
    judges="Whether two outputs stand on one net.",
    reason="Two outputs differ by their offsets at least, and nothing but their short-circuit "
    "current limits what flows.",
    source=NO_SOURCE,
    silent="Outputs joined through resistors.",
    judge=judge_joined,
)


# --- drive-tied


def judge_tied(stage: Stage, limits: Limits, design: Design) -> Iterator[Outcome]:
    """Judge whether an output is tied to ground, a rail or an ideal source."""
    net = stage.output.net
    holder = "ground" if net == GROUND else _holder(net, design)
    if not holder and _is_foreign_rail(stage, design):
        holder = f"rail {net}"
    if not holder:
        return
    yield stage_finding(
        "drive-tied",
        stage,
        "critical",
        f"The output of {stage.schematic} (net {net}) is held by {holder}: it drives into a short.",
        nets=(net,),
        remedy=f"Lead the output of {stage.schematic} to a net of its own."
        if holder.startswith(("rail ", "ground"))
        else f"Take {holder} off net {net}.",
        source=NO_SOURCE,
    )


def _holder(net: str, design: Design) -> str:
    """Return the source that holds a net against ground or a rail, or ""."""
    rails = {rail.net for rail in design.rails} | {GROUND}
    for element in design.circuit.elements:
        if element.kind in ("V", "battery") and _against(element, net, rails):
            return element.designator
    return ""


def _is_foreign_rail(stage: Stage, design: Design) -> bool:
    """Tell whether an output stands on its own supply net, or on a rail that is fed elsewhere."""
    net = stage.output.net
    if net in (stage.supply.positive_net, stage.supply.negative_net):
        return True
    rail = next((r for r in design.rails if r.net == net), None)
    return rail is not None and rail.feed == "stated" and stage.designator not in rail.origin


def _against(element: Element, net: str, rails: set[str]) -> bool:
    ends = element.nets[:2]
    if net not in ends or len(ends) < 2 or not element.fitted:
        return False
    other = ends[1] if ends[0] == net else ends[0]
    return other in rails and other != net


TIED = Rule(
    name="drive-tied",
    family="drive",
    looks_at="stage",
    judges="Whether an output is tied to ground, or through an ideal source to ground or a rail.",
    reason="An output against a stiff net delivers its short-circuit current and heat.",
    source=NO_SOURCE,
    silent="A source of zero volts in series with a load: it measures current.",
    judge=judge_tied,
)


# --- drive-capacitive


def judge_capacitive(stage: Stage, limits: Limits, design: Design) -> Iterator[Outcome]:
    """Judge how fast an output slews into its capacitance where no signal tells how fast it must.

    Where one is known, the capacitor's current is in the solved one, which drive-current judges.
    """
    farads, family = stage.current.load_capacitance, stage.family
    if not farads or stage.output.slew or stage.use == "unused":
        return
    gap = None
    if family is not None and family.slew_rate.best is None:
        gap = missing_figure(stage, "slew rate", "slew_rate")
    yield from open_point("drive-capacitive", stage, ("device",), gap)
    gives = [g for g in (stage.current.available_source, stage.current.available_sink) if g]
    if family is None or gap is not None or not gives:
        return
    figure, given = family.slew_rate, min(gives)
    rate = figure.typical if figure.typical is not None else figure.guaranteed
    wanted = farads * (rate or 0.0)
    if wanted <= given * limits["factor"]:
        return
    yield stage_finding(
        "drive-capacitive",
        stage,
        "remark",
        f"{stage.schematic} drives {si(farads, 'F')}: at the {si(rate, 'V/s')} of "
        f"{device(stage)} that takes {si(wanted, 'A')}, and it gives {si(given, 'A')} "
        f"({origin(stage.current.source.guaranteed_basis)}), so a step goes at "
        f"{si(given / farads, 'V/s')} only. No signal is known that would tell whether that does.",
        nets=(stage.output.net,),
        demand=wanted,
        limit=given,
        margin=given - wanted,
        unit="A",
        basis=("netlist", stage.current.source.guaranteed_basis),
        remedy="State the signal under [signals], or lower the capacitance to "
        f"{si(fit(given / (rate or 1.0), 'down'), 'F')}.",
        source="i = C dv/dt",
    )


CAPACITIVE = Rule(
    name="drive-capacitive",
    family="drive",
    looks_at="stage",
    judges="Whether the capacitance at an output holds its steps below the device's own slew rate, "
    "where no signal is known.",
    reason="i = C dv/dt: 1 nF at 13 V/µs asks for 13 mA.",
    source="derived",
    silent="Where a signal is known: its current into the capacitor is judged by drive-current.",
    limits=(
        Limit(
            name="factor",
            default=1.0,
            unit="",
            meaning="current at the full slew rate, as a multiple of what the device gives",
            source=NO_SOURCE,
        ),
    ),
    judge=judge_capacitive,
)


# --- drive-input-above-rail


def judge_above_rail(stage: Stage, limits: Limits, design: Design) -> Iterator[Outcome]:
    """Judge the current that flows into an input driven beyond its device's rails."""
    supply, pins = stage.supply, (stage.inputs.plus, stage.inputs.minus)
    if supply.positive is None or supply.negative is None or supply.positive < supply.negative:
        return
    for pin in pins:
        over = max(
            (pin.demand.high or 0.0) - supply.positive if pin.demand.high is not None else 0.0,
            supply.negative - pin.demand.low if pin.demand.low is not None else 0.0,
        )
        if over <= limits["diode"] or pin.series is None:
            continue
        if stage.inputs.minus is pin and stage.use == "linear":
            continue  # its loop holds it at the other input, which is judged
        current = (over - limits["diode"]) / pin.series if pin.series > 0 else math.inf
        if current <= limits["current"]:
            continue
        level = si(over, "V")
        through = f"through {si(pin.series, 'Ω')}" if pin.series > 0 else "without a resistor"
        flows = f", so {si(current, 'A')} flows" if math.isfinite(current) else ""
        needed = fit((over - limits["diode"]) / limits["current"], "up")
        yield stage_finding(
            "drive-input-above-rail",
            stage,
            "major"
            if evidence(stage.inputs.high.demand_basis, supply.basis) == "stated"
            else "minor",
            f"{stage.schematic}'s input on net {pin.net} is driven {level} beyond its rail "
            f"{through}{flows}; its protection diode takes {si(limits['current'], 'A')}.",
            nets=(pin.net,),
            demand=current if math.isfinite(current) else None,
            limit=limits["current"],
            margin=limits["current"] - current if math.isfinite(current) else None,
            unit="A",
            basis=(stage.inputs.high.demand_basis, supply.basis, "memory"),
            remedy=f"Fit at least {si(needed, 'Ω')} in series with the input.",
            source="from memory: 5 to 10 mA through a protection diode; Analog Devices MT-036",
        )
        return


ABOVE_RAIL = Rule(
    name="drive-input-above-rail",
    family="drive",
    looks_at="stage",
    judges="The current into an input that another supply drives beyond the device's own rails.",
    reason="The protection diodes of an input conduct 0.3 V beyond a rail; without a resistor the "
    "driver feeds the lower rail through them.",
    source="Analog Devices MT-036; the current from memory",
    silent="Inputs whose level or series resistance is not known.",
    limits=(
        Limit(
            name="diode",
            default=0.3,
            unit="V",
            meaning="how far beyond a rail an input may go before its diode conducts",
            source="from memory: 0.3 V in most absolute maximum ratings",
        ),
        Limit(
            name="current",
            default=5e-3,
            unit="A",
            meaning="current a protection diode takes",
            source="from memory: 5 to 10 mA",
        ),
    ),
    judge=judge_above_rail,
)

RULES = (JOINED, TIED, CAPACITIVE, ABOVE_RAIL)
