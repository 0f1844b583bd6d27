"""DC paths of inputs: a return that is missing, an integrator nothing holds, an unused channel."""

import math
from collections.abc import Iterator

from railguard.analysis.stage import Pin, Stage
from railguard.circuit.model import GROUND, Element
from railguard.circuit.sources import Sine
from railguard.redline.decoupling import joined
from railguard.redline.level import Level, levels, wanted_level
from railguard.redline.scene import Candidate, Scene
from railguard.rules.bias.path import USUAL_RETURN
from railguard.rules.feedback.size import BOLTZMANN_4KT
from railguard.rules.finding import Finding
from railguard.rules.inputs import bias_current, output_span
from railguard.units import si

LARGEST = 10e6
"""Ohm; beyond it resistors are rare and leakage of the board counts. Common practice, no source."""
FALLING = (10e6, 1e6, 100e3)
"""Ohm; tried where what the corner asks for lets bias current or the signal take the range."""
CORNER_SHARE = 0.1
"""Of the band's lowest frequency; a corner there costs 0.04 dB."""


def returned(finding: Finding, scene: Scene) -> Iterator[Candidate]:
    """Give a floating input a resistor to a level."""
    stage = scene.stage(finding)
    if stage is None:
        return
    for pin in (stage.inputs.plus, stage.inputs.minus):
        if pin.net not in finding.nets:
            continue
        if pin is stage.inputs.minus and stage.feedback.resistance is None:
            yield from across(finding, scene)
            return
        after = _anchor(pin, scene) or stage
        tried = 0
        while True:
            scene.forget()
            choices = levels(stage, scene, after)
            if tried >= len(choices):
                return
            yield from _return_to(stage, pin, choices[tried], after, scene)
            tried += 1


def _anchor(pin: Pin, scene: Scene) -> Element | None:
    return next((scene.elements[d] for d in pin.path if d in scene.elements), None)


def _return_to(
    stage: Stage, pin: Pin, level: Level, after: Element | Stage, scene: Scene
) -> Iterator[Candidate]:
    least, most = return_bounds(stage, pin, scene)
    ohms = USUAL_RETURN if least <= USUAL_RETURN <= most else math.sqrt(least * most)
    if least > most:
        ohms = least
    given = tuple(scene.given)
    for value in dict.fromkeys(scene.fit("R", min(v, LARGEST)) for v in (ohms, 10 * ohms, LARGEST)):
        scene.given = list(given)
        made = scene.added("R", (pin.net, level.net), value, after)
        if made is None:
            return
        through = f", {level.words}" if level.words else ""
        yield Candidate(
            edits=joined([*level.edits, made[0]]),
            what=f"add {made[1]} of {si(value, 'Ω')} from {pin.net} to {level.net}{through}",
            choice=_return_choice(stage, value, least, most, scene),
            regains=True,  # an input without a path has no gain that could be kept
        )


def return_bounds(stage: Stage, pin: Pin, scene: Scene) -> tuple[float, float]:
    """Return the least and the largest resistance of a return, ohm.

    Least: the coupling capacitor's corner stays a tenth of the lowest frequency, and the source is
    loaded little (ten times its resistance); largest: bias current moves the output by no more than
    its rule allows.
    """
    least, most = 1e3, LARGEST
    farads = [c.value for c in scene.on(pin.net, "C") if c.value and GROUND not in c.nets[:2]]
    bottom = stage.band.low or _lowest(scene)
    if farads and bottom:
        least = max(least, 1 / (2 * math.pi * CORNER_SHARE * bottom * min(farads)))
    current, (span, _) = bias_current(stage, scene.design), output_span(stage)
    gain = stage.loop.noise_gain_dc or 1.0
    if current is not None and current.amps and span:
        share = scene.limits("bias-current-error")["share"]
        most = min(most, share * span / (current.amps * gain))
    return least, most


def _lowest(scene: Scene) -> float | None:
    """Return the lowest frequency any stated signal has, hertz."""
    lows = [s.band.low for s in scene.design.stages if s.band.low]
    lows += [s.start for s in scene.design.settings.signals if s.start]
    waves = [e.source.wave for e in scene.design.circuit.elements if e.source is not None]
    lows += [w.frequency for w in waves if isinstance(w, Sine) and w.frequency]
    return min(lows, default=None)


def _return_choice(stage: Stage, ohms: float, least: float, most: float, scene: Scene) -> str:
    """Say what speaks for the value: corner and loading below, bias error and noise above."""
    noise = math.sqrt(BOLTZMANN_4KT * ohms)
    current = bias_current(stage, scene.design)
    error = ""
    if current is not None and current.amps:
        moved = current.amps * ohms * (stage.loop.noise_gain_dc or 1.0)
        error = f" and a bias error of {si(moved, 'V')} at the output"
    above = (
        f"above {si(most, 'Ω')} bias current would cost more than its share of the range"
        if most < LARGEST
        else "above some megohms leakage of the board counts"
    )
    below = f"below {si(least, 'Ω')} it loads the source or lifts the corner of its coupling"
    if least > most:
        return f"{below}, and {above}: the corner was kept"
    return f"{below}; {above}; {si(ohms, 'Ω')} makes {si(noise, 'V')}/√Hz of noise{error}"


def across(finding: Finding, scene: Scene) -> Iterator[Candidate]:
    """Give an integrator a resistor across its capacitor, so that its level is held."""
    stage = scene.stage(finding)
    if stage is None:
        return
    if not stage.feedback.elements:
        yield from _closed(stage, scene)
        return
    capacitor = next(
        (e for d in stage.feedback.elements if (e := scene.elements.get(d)) and e.kind == "C"), None
    )
    if capacitor is None or not capacitor.value:
        return
    net = stage.inputs.minus.net
    inputs = [e.value for e in scene.on(net, "R") if e.value]
    bottom = stage.band.low or _lowest(scene)
    least = 10 * max(inputs) if inputs else 0.0
    corner = 1 / (2 * math.pi * CORNER_SHARE * bottom * capacitor.value) if bottom else 0.0
    current = bias_current(stage, scene.design)
    room = stage.output.available.span or stage.supply.total
    most = math.inf
    if current is not None and current.amps and room:
        most = 0.1 * room / current.amps
    first = max(least, corner)
    tried = [v for v in (first, least, corner, 10 * first, *FALLING) if v]
    for ohms in dict.fromkeys(scene.fit("R", min(v, LARGEST), "down") for v in tried):
        scene.forget()
        made = scene.added("R", (stage.output.net, net), ohms, capacitor)
        if made is None:
            return
        starts = 1 / (2 * math.pi * ohms * capacitor.value)
        yield Candidate(
            edits=(made[0],),
            what=f"add {made[1]} of {si(ohms, 'Ω')} across {capacitor.designator}, from "
            f"{stage.output.net} to {net}",
            choice=f"it integrates from {si(starts, 'Hz')} on: a smaller one would lift that, a "
            f"larger one than {si(most, 'Ω')} would let bias current take a tenth of the range"
            if math.isfinite(most)
            else f"it integrates from {si(starts, 'Hz')} on: a smaller one would lift that",
            regains=True,
        )


def _closed(stage: Stage, scene: Scene) -> Iterator[Candidate]:
    """Wire the output to an inverting input that nothing else stands on: a follower."""
    net = stage.inputs.minus.net
    others = [e for e in scene.design.circuit.elements if net in e.nets]
    edit = scene.pin(stage, "minus", scene.local(stage.output.net, stage))
    if len(others) == 1 and edit is not None:
        yield Candidate(
            edits=(edit,),
            what=f"wire the inverting input of {stage.schematic} to its output, {stage.output.net}",
            choice="nothing else stands at that input, so no other gain is drawn",
            regains=True,
        )


def parked(finding: Finding, scene: Scene) -> Iterator[Candidate]:
    """Wire an unused channel as a follower at a level its inputs take."""
    stage = scene.stage(finding)
    if stage is None:
        return
    out = stage.output.net
    free = [e for e in scene.design.circuit.elements if out in e.nets]
    level = levels(stage, scene, stage)
    tie = level[0] if level else None
    if tie is None or not free:
        return
    edits = list(tie.edits)
    plus = scene.pin(stage, "plus", tie.net)
    minus = scene.pin(stage, "minus", scene.local(out, stage))
    if plus is None or minus is None:
        return
    wanted = wanted_level(stage, scene)
    middle = f", near the {si(wanted, 'V')} in the middle of its range" if wanted else ""
    yield Candidate(
        edits=tuple(sorted((plus, minus, *joined(edits)))),
        what=f"wire {stage.schematic} as a follower of {tie.net} ({si(tie.volts, 'V')}{middle})"
        + (f": {tie.words}" if tie.words else ""),
        regains=True,
    )
