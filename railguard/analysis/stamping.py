"""What each kind of element, and an amplifier, adds to the equations."""

import msgspec
import numpy as np

from railguard.analysis.equations import Equations, Injection, Stamp
from railguard.analysis.recognise import Amplifier
from railguard.circuit.model import GROUND, Element

OPEN_LOOP_GAIN = 2e5
"""DC open-loop gain of an amplifier whose data sheet's is not in the catalogue: common practice."""
WINDING_OHMS = 1e-3
"""Resistance given to an inductor or a link, so that two in parallel stay solvable at DC."""


class Parasitics(msgspec.Struct, frozen=True):
    """What an amplifier adds to its own loop: farads at the inverting input, ohms at the output."""

    input_farads: float
    output_ohms: float


def stamp(equations: Equations, element: Element) -> None:
    """Write down an element; one that another's current controls comes later, by itself."""
    name, nets = element.designator, element.nets
    match element.kind:
        case "R" if element.value is not None:
            ohms = element.value if abs(element.value) > WINDING_OHMS else WINDING_OHMS
            equations.conductance(name, "R", nets[0], nets[1], 1.0 / ohms)
        case "link" if len(nets) >= 2:
            ohms = max(element.value or 0.0, WINDING_OHMS)
            equations.conductance(name, "R", nets[0], nets[1], 1.0 / ohms)
        case "C" if element.value is not None:
            equations.conductance(name, "C", nets[0], nets[1], element.value)
        case "L":
            _coil(equations, element)
        case "V" | "battery":
            equations.source(name, "V", nets[0], nets[1])
        case "I":
            at = equations.row(nets[0]), equations.row(nets[1])
            equations.injections[name] = Injection(name, -1, *at)
        case "E":
            _voltage_controlled(equations, element)
        case "G":
            _transconductance(equations, element)
        case "B" if "v" in element.parameters or element.text[:1].lower() == "v":
            equations.source(name, "V", nets[0], nets[1])
        case _:
            pass


def _coil(equations: Equations, element: Element) -> None:
    row = equations.branch(element.designator, "L", element.nets[0], element.nets[1])
    if row is not None:
        henry = element.value or 0.0
        equations.g.append((row, row, -WINDING_OHMS))
        equations.c.append((row, row, -henry))
        equations.stamps.append(Stamp(element.designator, "L", row, row, henry))


def _voltage_controlled(equations: Equations, element: Element) -> None:
    row = equations.source(element.designator, "E", element.nets[0], element.nets[1])
    control = element.control
    if row is None or control is None or control.gain is None or len(control.nets) != 2:
        return
    for net, sign in zip(control.nets, (-1.0, 1.0), strict=True):
        at = equations.row(net)
        if at >= 0:
            equations.g.append((row, at, sign * control.gain))


def _transconductance(equations: Equations, element: Element) -> None:
    control = element.control
    if control is None or control.gain is None or len(control.nets) != 2:
        return
    for net, out in zip(element.nets, (1.0, -1.0), strict=False):
        i = equations.row(net)
        for sense, sign in zip(control.nets, (1.0, -1.0), strict=True):
            j = equations.row(sense)
            if i >= 0 and j >= 0:
                equations.g.append((i, j, out * sign * control.gain))


def stamp_current_controlled(equations: Equations, element: Element) -> None:
    """Write down an F or H source, when every branch it may listen to has its row."""
    control = element.control
    sensed = next(
        (b.row for b in equations.branches if control and b.designator == control.element), None
    )
    if element.kind == "H":
        row = equations.source(element.designator, "H", element.nets[0], element.nets[1])
        if row is None:
            return
        if control is not None and control.gain is not None and sensed is not None:
            equations.g.append((row, sensed, -control.gain))
        return
    if control is None or control.gain is None or sensed is None:
        return
    for net, sign in zip(element.nets, (1.0, -1.0), strict=False):
        at = equations.row(net)
        if at >= 0:
            equations.g.append((at, sensed, sign * control.gain))


def stamp_amplifier(
    equations: Equations, amplifier: Amplifier, forced: bool, parasitics: Parasitics | None
) -> None:
    """Write down an amplifier with one pole; its current counts as flowing out into its net.

    forced  True: its output is a plain source
    """
    name, out = amplifier.designator, equations.row(amplifier.output)
    row = None if out < 0 else equations.hold(name, "A", amplifier.output, GROUND)
    if row is None:
        if out < 0:
            equations.conflicts.append((name, amplifier.output, GROUND))
        return
    equations.outputs[name] = row
    equations.g.append((out, row, -1.0))
    equations.injections[name] = Injection(name, row, -1, -1)
    if forced:
        equations.g.append((row, out, 1.0))
        return
    inverse_gain = 1.0 / open_loop_gain(amplifier)
    equations.g.append((row, out, inverse_gain))
    gbw = gain_bandwidth(amplifier)
    integration = 1.0 / (2 * np.pi * gbw) if gbw else 0.0
    if integration:
        equations.c.append((row, out, integration))
    if parasitics is not None:
        equations.g.append((row, row, parasitics.output_ohms * inverse_gain))
        equations.c.append((row, row, parasitics.output_ohms * integration))
        minus = equations.row(amplifier.minus)
        if minus >= 0:
            equations.c.append((minus, minus, parasitics.input_farads))
    for net, sign in ((amplifier.plus, -1.0), (amplifier.minus, 1.0)):
        at = equations.row(net)
        if at >= 0:
            equations.g.append((row, at, sign))


def open_loop_gain(amplifier: Amplifier) -> float:
    """Return an amplifier's DC open-loop gain, V/V."""
    if amplifier.gain is not None:
        return amplifier.gain
    device = amplifier.match.device
    if device is None:
        return OPEN_LOOP_GAIN
    return device.open_loop_gain.typical or device.open_loop_gain.guaranteed or OPEN_LOOP_GAIN


def gain_bandwidth(amplifier: Amplifier) -> float | None:
    """Return an amplifier's gain-bandwidth product, hertz; typical, as a bandwidth is drawn."""
    device = amplifier.match.device
    if device is None:
        return None
    listed = device.gain_bandwidth
    return listed.typical if listed.typical is not None else listed.guaranteed
