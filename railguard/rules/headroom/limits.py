"""Headroom beyond the two ranges: phase reversal, input clamps, offset, the load's own limit."""

from collections.abc import Iterator

from railguard.analysis.bound import Range
from railguard.analysis.stage import Design, Loaded, Stage
from railguard.notices import NotChecked
from railguard.rules.compose import (
    finding,
    missing_figure,
    open_point,
    stage_finding,
)
from railguard.rules.protocol import Limit, Limits, Outcome, Rule
from railguard.rules.remedies import fit
from railguard.rules.severity import ROUNDING, TABLE, evidence
from railguard.rules.wording import NO_SOURCE, capital, cited, device, listed, origin
from railguard.rules.working import standstill
from railguard.settings.model import Load
from railguard.units import percent, si
from railguard.words import Basis

# --- headroom-phase-reversal


def judge_reversal(stage: Stage, limits: Limits, design: Design) -> Iterator[Outcome]:
    """Judge whether the inputs of a device that turns its output over leave their range."""
    family = stage.family
    if stage.use != "linear" or family is None or not family.phase_reversal:
        return
    if standstill(stage) is not None:
        return
    for bound in (stage.inputs.low, stage.inputs.high):
        limit = bound.typical if bound.typical is not None else bound.guaranteed
        basis = bound.typical_basis if bound.typical is not None else bound.guaranteed_basis
        if bound.demand is None or limit is None:
            continue
        room = limit - bound.demand if bound.upper else bound.demand - limit
        if room >= -ROUNDING * max(abs(limit), abs(bound.demand)):
            continue
        word = "up" if bound.upper else "down"
        yield stage_finding(
            "headroom-phase-reversal",
            stage,
            TABLE["guaranteed"][evidence(bound.demand_basis, basis)],
            f"{stage.schematic}'s inputs go {word} to {si(bound.demand, 'V')}, past the "
            f"{si(limit, 'V')} ({origin(basis)}) to which {device(stage)} keeps its sense: beyond "
            "it the output turns over to the other rail.",
            nets=(stage.inputs.plus.net,),
            demand=bound.demand,
            limit=limit,
            margin=room,
            unit="V",
            basis=(bound.demand_basis, basis),
            remedy="Keep the input inside its range with a series resistor and a Schottky diode to "
            "the rail, or fit a device free of phase reversal.",
            source=f"Analog Devices MT-036; {cited(stage, basis)}",
        )
        return


REVERSAL = Rule(
    name="headroom-phase-reversal",
    family="headroom",
    looks_at="stage",
    judges="Whether the inputs of a device known for phase reversal leave its common-mode range.",
    reason="Past its range, mostly near the negative rail, a JFET or ground-sensing bipolar input "
    "stage inverts: a small overdrive becomes a full-scale error, and a loop may latch.",
    source="Analog Devices MT-036",
    silent="Devices that do not reverse, or of which it is not known.",
    judge=judge_reversal,
)


# --- headroom-differential


def judge_differential(stage: Stage, limits: Limits, design: Design) -> Iterator[Outcome]:
    """Judge the voltage between the inputs against what the device stands."""
    asked = stage.inputs.differential
    if asked is None or stage.use == "unused" or standstill(stage):
        return
    figure = None if stage.family is None else stage.family.differential_input
    limit = None if figure is None else figure.best
    series = sum(pin.series or 0.0 for pin in (stage.inputs.plus, stage.inputs.minus))
    # Clamps begin at one diode; resistors before the inputs bound their current in any device.
    conducts = limit if limit is not None else limits["diode"]
    if asked <= conducts * (1 + ROUNDING):
        return
    if series > 0 and (asked - conducts) / series <= limits["current"]:
        return
    gap = None
    if limit is None and stage.family is not None:
        gap = missing_figure(stage, "differential input limit", "differential_input")
    yield from open_point("headroom-differential", stage, ("device",), gap)
    if limit is None or figure is None:
        return
    basis = figure.best_basis
    yield stage_finding(
        "headroom-differential",
        stage,
        TABLE["guaranteed"][evidence(stage.inputs.high.demand_basis, basis)],
        f"Between the inputs of {stage.schematic} stand up to {si(asked, 'V')}; {device(stage)} "
        f"stands {si(limit, 'V')} ({origin(basis)}), beyond which its clamps conduct.",
        nets=tuple(dict.fromkeys((stage.inputs.plus.net, stage.inputs.minus.net))),
        demand=asked,
        limit=limit,
        margin=limit - asked,
        unit="V",
        basis=(stage.inputs.high.demand_basis, basis),
        remedy=f"Fit {si(fit((asked - limit) / limits['current'], 'up'), 'Ω')} or more in series "
        "with an input, or a device without clamps between its inputs.",
        source=cited(stage, basis),
    )


DIFFERENTIAL = Rule(
    name="headroom-differential",
    family="headroom",
    looks_at="stage",
    judges="The voltage between the inputs of a stage that is driven open-loop against the "
    "device's differential limit.",
    reason="Many input pairs have back-to-back diodes between them; they load the source and warm "
    "the device where the inputs are driven apart.",
    source="the device's data sheet",
    silent="Stages whose loop holds the inputs together; clamps that resistors before the inputs "
    "leave little current.",
    limits=(
        Limit(
            name="current",
            default=5e-3,
            unit="A",
            meaning="current the clamps between the inputs may carry",
            source="from memory: 10 mA in the NE5532 data sheet, 25 mA in the OP27's",
        ),
        Limit(
            name="diode",
            default=0.5,
            unit="V",
            meaning="where clamps begin to conduct in a device whose data sheet does not tell",
            source="from memory: 0.5 to 0.7 V in data sheets of devices with clamps",
        ),
    ),
    judge=judge_differential,
)


# --- headroom-offset


def judge_offset(stage: Stage, limits: Limits, design: Design) -> Iterator[Outcome]:
    """Judge the share of the output's range that accumulated offset takes."""
    reach, error = stage.output.available.span, stage.output.offset
    if stage.use != "linear" or standstill(stage) or error is None or not reach:
        return
    share = 2 * abs(error) / reach
    if share <= limits["share"]:
        return
    figure = None if stage.family is None else stage.family.offset_voltage
    basis: Basis = "practice" if figure is None else figure.best_basis
    row = TABLE["guaranteed"] if share > limits["far-share"] else TABLE["reserve"]
    gain = stage.loop.noise_gain_dc
    words = f" at a noise gain of {si(gain, '')}" if gain else ""
    yield stage_finding(
        "headroom-offset",
        stage,
        row[evidence(basis)],
        f"Offset and bias current of {stage.schematic} and the stages before it add up to "
        f"±{si(abs(error), 'V')} at its output{words}, {percent(share)} of the {si(reach, 'V')} "
        f"it reaches ({origin(basis)}).",
        nets=(stage.output.net,),
        demand=2 * abs(error),
        limit=limits["share"] * reach,
        margin=limits["share"] * reach - 2 * abs(error),
        unit="V",
        basis=("netlist", basis),
        remedy=_STEADY if stage.band.low == 0 else _MOVING,
        source=cited(stage, basis),
    )


_STEADY = "Fit a device of less offset and bias current: its signal goes down to DC."
_MOVING = (
    "Couple the stages through a capacitor, give the gain a capacitor in its ground leg so that it "
    "is one at DC, or fit a device of less offset."
)


OFFSET = Rule(
    name="headroom-offset",
    family="headroom",
    looks_at="stage",
    judges="The share of the output's range taken by offset and bias current, accumulated over the "
    "stages before.",
    reason="Offset is amplified like a signal, and what it takes of the range is lost to the "
    "signal.",
    source="the device's data sheet for offset; the share is common practice, no source",
    silent="Devices whose offset is not listed.",
    limits=(
        Limit(
            name="share",
            default=0.10,
            unit="",
            meaning="share of the output's range offset may take, both signs counted",
            source=NO_SOURCE,
        ),
        Limit(
            name="far-share",
            default=0.50,
            unit="",
            meaning="share beyond which it counts like a guaranteed limit",
            source=NO_SOURCE,
        ),
    ),
    judge=judge_offset,
)


# --- headroom-load


def judge_load(subject: Design, limits: Limits, design: Design) -> Iterator[Outcome]:
    """Judge the outputs that drive a load against the voltage the load stands."""
    for load in subject.settings.loads:
        if load.max_volts is None:
            continue
        driven = _driven(load.net, subject)
        if driven is None:
            why = f"the voltage on net {load.net} was not worked out"
            add = "put the load on the net of an op-amp's output, or behind resistors of one, and "
            add += "state the signals"
            yield NotChecked(load.net, "headroom-load", why, add)
            continue
        yield from _load(driven, load, load.max_volts, subject)


def _driven(net: str, design: Design) -> Loaded | None:
    """Return what a load gets: from the output it stands on, as far as that goes, or behind one."""
    stage = next((s for s in design.stages if s.output.net == net), None)
    if stage is None:
        return next((found for found in design.loads if found.net == net), None)
    high, low, reach = stage.output.demand.high, stage.output.demand.low, stage.output.available
    if high is None or low is None:
        return None
    most = reach.high if reach.high is not None else stage.supply.positive
    least = reach.low if reach.low is not None else stage.supply.negative
    high = high if most is None else min(high, most)
    low = low if least is None else max(low, least)
    return Loaded(net=net, volts=Range(low, high), drivers=(stage.designator,))


def _load(driven: Loaded, load: Load, most: float, design: Design) -> Iterator[Outcome]:
    stages = [s for s in design.stages if s.designator in driven.drivers]
    high, low = driven.volts.high or 0.0, driven.volts.low or 0.0
    worst = max(high, -low if low < 0 else 0.0)
    if worst <= most * (1 + ROUNDING):
        return
    basis = stages[0].output.high.demand_basis
    names = listed(stage.schematic for stage in stages)
    verb = "drives" if len(stages) == 1 else "drive"
    message = (
        f"the load on net {load.net} stands {si(most, 'V')} (as stated), and {names} {verb} it to "
        f"{si(high if worst == high else low, 'V')}, {si(worst - most, 'V')} beyond."
    )
    yield finding(
        "headroom-load",
        TABLE["absolute"][evidence(basis)],
        capital(message),
        designators=driven.drivers,
        nets=(load.net,),
        demand=worst,
        limit=most,
        margin=most - worst,
        unit="V",
        basis=(basis, "user"),
        remedy=f"Divide the output by {si(worst / most, '')} before the load, run "
        f"{names} on a rail of {si(most, 'V')}, or clamp the net through a series "
        "resistor.",
        source="the load's own limit, as stated",
        location=stages[0].location,
    )


LOAD = Rule(
    name="headroom-load",
    family="headroom",
    looks_at="design",
    judges="The voltage an output drives a stated load to against the load's own max-volts.",
    reason="An amplifier on ±12 V destroys a converter input that stands 3.3 V.",
    source="the load's own limit, as stated",
    silent="Loads without max-volts. A load that hangs on no output, not even behind resistors, is "
    "listed as not checked.",
    judge=judge_load,
)

RULES = (REVERSAL, DIFFERENTIAL, OFFSET, LOAD)
