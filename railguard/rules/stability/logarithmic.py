"""Transistors that amplify inside a loop: the grounded base of a logarithmic amplifier."""

import math

import msgspec

from railguard.analysis.stage import Design, Stage
from railguard.rules.remedies import fit
from railguard.units import si

OVER = 3.3
"""The corner of emitter resistor and capacitor is put so many times below the amplifier's own: its
noise gain is then 0.96 where the loop closes."""
ACROSS = 100e-12
"""F; the capacitor proposed where there is none: common practice, no source."""


class Amplifying(msgspec.Struct, frozen=True):
    """A transistor that takes an output's voltage to the inverting input, and multiplies it.

    transistor  its designator
    emitter     its emitter's net
    resistor    of the resistor between output and emitter, or ""
    ohms        that resistor's value; 0 where there is none
    """

    transistor: str
    emitter: str
    resistor: str = ""
    ohms: float = 0.0


def amplifying(stage: Stage, design: Design) -> Amplifying | None:
    """Return the transistor whose collector stands at the inverting input, if there is one.

    A transistor with collector and base together is a diode: it divides.
    """
    out, minus = stage.output.net, stage.inputs.minus.net
    for element in design.circuit.elements:
        if element.kind != "Q" or not element.fitted or len(element.nets) < 3:
            continue
        collector, base, emitter = element.nets[:3]
        if collector != minus or base in (minus, out):
            continue
        if emitter == out:
            return Amplifying(element.designator, emitter)
        for between in design.circuit.elements:
            if between.kind == "R" and set(between.nets[:2]) == {out, emitter} and between.value:
                return Amplifying(element.designator, emitter, between.designator, between.value)
    return None


def emitter_ohms(stage: Stage) -> float | None:
    """Return the emitter resistor that leaves a noise gain of one where the loop closes, ohm."""
    product = None if stage.family is None else stage.family.gain_bandwidth.best
    if not product:
        return None
    return OVER / (2 * math.pi * product * (stage.feedback.capacitance or ACROSS))


def emitter_remedy(found: Amplifying, stage: Stage) -> str:
    """Say which emitter resistor keeps a transistor from amplifying where the loop closes."""
    ohms = emitter_ohms(stage)
    value = "some kilohm" if ohms is None else si(fit(ohms, "up"), "Ω")
    across = stage.feedback.capacitance
    kept = f"the {si(across, 'F')}" if across else si(ACROSS, "F")
    if found.resistor:
        what = f"Fit {value} in place of {found.resistor} ({si(found.ohms, 'Ω')})"
    else:
        what = f"Fit {value} between the output of {stage.schematic} and the emitter of "
        what += found.transistor
    return f"{what}, and {kept} from the output itself to the inverting input."
