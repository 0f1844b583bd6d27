"""The feedback network at the same gain: every resistor scaled alike, capacitors the other way."""

import math
from collections.abc import Iterator

from railguard.analysis.stage import Stage
from railguard.circuit.model import GROUND, Element
from railguard.redline.scene import Candidate, Scene, all_of, with_value
from railguard.rules.feedback.size import BOLTZMANN_4KT
from railguard.rules.finding import Finding
from railguard.rules.remedies import decades, network_resistors
from railguard.units import si

MOST_RESISTORS = 8
"""More make a change nobody reviews."""
FURTHER = 2
"""Decades tried beyond the first that should do."""


def scaled(finding: Finding, scene: Scene) -> Iterator[Candidate]:
    """Scale a feedback network down or up by whole decades, which keeps every ratio and series."""
    stage = scene.stage(finding)
    if stage is None or not finding.demand or not finding.limit:
        return
    up = finding.rule == "feedback-low" or finding.unit == "A"
    ratio = finding.demand / finding.limit
    if up:
        ratio /= scene.limits("feedback-low")["share"]
    first = decades(ratio)
    for power in range(max(first - 1, 1), first + FURTHER + 1):
        for pairs in _pairs(stage):
            made = _scaled(stage, power if up else -power, scene, pairs)
            if made is not None:
                yield made


def _pairs(stage: Stage) -> tuple[bool, bool]:
    """Tell whether to scale the resistors at the other input too: first where they are one half."""
    return (True, False) if stage.topology == "difference" else (False, True)


def _scaled(stage: Stage, power: int, scene: Scene, pair: bool) -> Candidate | None:
    """Scale one network; `pair`: with the resistors at the other input, which balance it."""
    resistors = list(network_resistors(stage, scene.design))
    both = _at_plus(stage, scene) if pair else ()
    if pair and not both:
        return None
    resistors += [e for e in both if e not in resistors]
    if not resistors or len(resistors) > MOST_RESISTORS:
        return None
    capacitors = _capacitors(stage, resistors, scene, pair)
    edits, words = [], []
    for element in resistors:
        new = _decimal(element.value or 0.0, power)
        edits.append(scene.value(element, new))
        words.append(with_value(element, new))
    for element in capacitors:
        new = _decimal(element.value or 0.0, -power)
        edits.append(scene.value(element, new))
        words.append(with_value(element, new))
    made = all_of(*edits)
    if made is None:
        return None
    return Candidate(edits=made, what=", ".join(words), choice=_choice(stage, power))


def _decimal(value: float, power: int) -> float:
    """Move the point exactly: a value of a series stays in it."""
    return (
        float(f"{value:.9g}") * 10.0**power if power > 0 else float(f"{value / 10.0**-power:.9g}")
    )


def _choice(stage: Stage, power: int) -> str:
    """Say what speaks for the new size: noise and bias error against load and power."""
    seen = stage.feedback.seen
    scale = 10.0**power
    words = "the gain and every time constant stay"
    if not seen:
        return words
    noise = math.sqrt(BOLTZMANN_4KT * seen * scale)
    words += f"; {si(seen * scale, 'Ω')} at the inverting input make {si(noise, 'V')}/√Hz of noise"
    current = stage.family.bias_current.best if stage.family is not None else None
    if current:
        words += f" and {si(current * seen * scale, 'V')} of bias error at the input"
    if stage.feedback.current:
        words += f", and take {si(stage.feedback.current / scale, 'A')} from the output"
    further = "larger resistors: more noise and bias error" if power > 0 else (
        "smaller resistors: more load on the output and on the source, more power"
    )  # fmt: skip
    return f"{words} ({further})"


def _at_plus(stage: Stage, scene: Scene) -> tuple[Element, ...]:
    """Return the resistors at the non-inverting input, where they are the network's other half."""
    net = stage.inputs.plus.net
    if net == GROUND or net == stage.inputs.minus.net:
        return ()
    return tuple(e for e in scene.on(net, "R") if e.value)


def _capacitors(stage: Stage, resistors: list[Element], scene: Scene, pair: bool) -> list[Element]:
    """Return the capacitors that make time constants with the network's resistors."""
    ends = {stage.output.net, stage.inputs.minus.net, stage.inputs.plus.net, GROUND}
    rails = {r.net for r in scene.design.rails}
    inner = {n for r in resistors for n in r.nets[:2]} - ends - rails
    found = []
    for element in scene.design.circuit.elements:
        if element.kind != "C" or not element.value or not element.fitted:
            continue
        nets = set(element.nets[:2])
        at_input = {stage.inputs.minus.net, stage.inputs.plus.net if pair else GROUND} - {GROUND}
        # One that ends inside the network: across the feedback, in the ground leg, at a T.
        inside = bool(nets & at_input) or any(
            n in inner and len(list(scene.on(n))) == 2 for n in nets
        )
        if inside:
            found.append(element)
    return found


def scaled_down(finding: Finding, scene: Scene) -> Iterator[Candidate]:
    """Scale a feedback network down by whole decades, whatever the finding's own figures are."""
    stage = scene.stage(finding)
    if stage is None:
        return
    for power in (1, 2, 3):
        for pairs in _pairs(stage):
            made = _scaled(stage, -power, scene, pairs)
            if made is not None:
                yield made
