"""Capacitors and resistors that keep a loop stable."""

import math
from collections.abc import Iterator

from railguard.analysis.stage import Stage
from railguard.circuit.model import GROUND
from railguard.redline.decoupling import joined
from railguard.redline.isolation import isolated, parted
from railguard.redline.model import Edit
from railguard.redline.network import scaled_down
from railguard.redline.scene import Candidate, Scene, all_of, with_value
from railguard.rules.finding import Finding
from railguard.rules.stability.logarithmic import Amplifying, amplifying, emitter_ohms
from railguard.rules.stability.margin import across_feedback
from railguard.units import si

FACTORS = (1.0, 1.5, 2.2, 3.3, 4.7, 10.0, 22.0, 47.0, 100.0)
"""Multiples of the capacitance worked out that are tried in turn."""
LEAST = 1e-12
"""F; the smallest capacitor that can be bought and is more than a board's stray."""
LEAD_SHARE = 0.1
"""Of the crossover: where the lead network's own corner is put."""


def phase(finding: Finding, scene: Scene) -> Iterator[Candidate]:
    """Win phase margin: isolate the load, put a capacitor across the feedback, shrink it."""
    stage = scene.stage(finding)
    if stage is None:
        return
    transistor = amplifying(stage, scene.design)
    if transistor is not None:
        yield from emitter_resistor(stage, transistor, scene)
        return
    if stage.current.load_capacitance:
        yield from isolated(finding, scene)
    yield from across_feedback_resistor(finding, scene)
    yield from scaled_down(finding, scene)
    if not stage.current.load_capacitance:
        yield from isolated(finding, scene)


def across_feedback_resistor(finding: Finding, scene: Scene) -> Iterator[Candidate]:
    """Put a capacitor across the feedback resistor, or enlarge the one that is there."""
    stage = scene.stage(finding)
    if stage is None or not stage.feedback.resistance or stage.output.net == stage.inputs.minus.net:
        return
    out, net = stage.output.net, stage.inputs.minus.net
    there = [e for e in scene.on(out, "C") if set(e.nets[:2]) == {out, net} and e.value]
    start = max(across_feedback(stage, 20e-12) or LEAST, LEAST)
    before = scene.elements.get(stage.feedback.elements[0]) if stage.feedback.elements else None
    for factor in FACTORS:
        scene.forget()
        farads = scene.fit("C", start * factor, "up")
        corner = 1 / (2 * math.pi * stage.feedback.resistance * farads)
        if stage.band.high and corner < stage.band.high:
            return  # it would take the band away
        choice = (
            f"with {si(stage.feedback.resistance, 'Ω')} it cuts off at {si(corner, 'Hz')}: a "
            "smaller one leaves less phase, a larger one less bandwidth"
        )
        if there:
            if farads <= (there[0].value or 0.0):
                continue
            edit = scene.value(there[0], farads)
            if edit is not None:
                yield Candidate(edits=(edit,), what=with_value(there[0], farads), choice=choice)
            continue
        made = scene.added("C", (out, net), farads, before or stage)
        if made is not None:
            yield Candidate(
                edits=(made[0],),
                what=f"add {made[1]} of {si(farads, 'F')} across the feedback, from {out} to {net}",
                choice=choice,
            )


def lead(finding: Finding, scene: Scene) -> Iterator[Candidate]:
    """Raise the noise gain at the crossover: resistor and capacitor between the inputs.

    A capacitor across the feedback that brings it down there is made smaller first.
    """
    stage = scene.stage(finding)
    if stage is None or not finding.limit or not stage.loop.crossover:
        return
    transistor = amplifying(stage, scene.design)
    if transistor is not None:
        yield from emitter_resistor(stage, transistor, scene)
        return
    out, net = stage.output.net, stage.inputs.minus.net
    for element in [e for e in scene.on(out, "C") if set(e.nets[:2]) == {out, net} and e.value]:
        for share in (0.47, 0.22, 0.1, 0.047):
            farads = scene.fit("C", (element.value or 0.0) * share, "down", element)
            edit = scene.value(element, farads)
            if edit is not None:
                yield Candidate(edits=(edit,), what=with_value(element, farads))
    resistance, gain = stage.feedback.resistance, stage.loop.noise_gain_crossover
    if not resistance or not gain or gain >= finding.limit:
        return
    for share in (0.9, 0.7, 0.5):
        scene.forget()
        ohms = scene.fit("R", share * resistance / (finding.limit - gain), "down")
        crossover = stage.loop.crossover * gain / finding.limit
        farads = scene.fit("C", 1 / (2 * math.pi * LEAD_SHARE * crossover * ohms), "up")
        middle = scene.new_net(net)
        other = stage.inputs.plus.net or GROUND
        resistor = scene.added("R", (net, middle), ohms, stage)
        capacitor = scene.added("C", (middle, other), farads, stage)
        if resistor is not None and capacitor is not None:
            yield Candidate(
                edits=joined([resistor[0], capacitor[0]]),
                what=f"add {resistor[1]} of {si(ohms, 'Ω')} and {capacitor[1]} of "
                f"{si(farads, 'F')} in series between the inputs",
                choice="they raise the noise gain at the crossover only; noise rises there too, "
                "the signal's gain stays",
            )


def emitter_resistor(stage: Stage, found: Amplifying, scene: Scene) -> Iterator[Candidate]:
    """Keep a transistor in the feedback from amplifying: a resistor before its emitter.

    The logarithm stays at the emitter, with all that hangs there.
    """
    start = emitter_ohms(stage)
    if start is None or not stage.feedback.capacitance:
        return
    there = scene.elements.get(found.resistor)
    for factor in FACTORS[:5]:
        scene.forget()
        ohms = scene.fit("R", start * factor, "up", there)
        choice = (
            f"the transistor then amplifies by less where the loop closes; {si(ohms, 'Ω')} take "
            "more of the output's range the more current the logarithm is of"
        )
        if there is not None:
            edit = scene.value(there, ohms)
            if edit is not None and ohms > found.ohms:
                yield Candidate(
                    edits=(edit,), what=with_value(there, ohms), choice=choice, regains=True
                )
            continue
        made = parted(stage, scene, ohms)
        if made is None:
            return
        edits, name, value = made
        yield Candidate(
            edits=edits,
            what=f"add {name} of {si(value, 'Ω')} between the output of {stage.schematic} and the "
            f"emitter of {found.transistor}",
            choice=choice,
            regains=True,
        )


def current_type(finding: Finding, scene: Scene) -> Iterator[Candidate]:
    """Give a current-feedback device the feedback resistor its sheet states, and no capacitor."""
    stage = scene.stage(finding)
    if stage is None or stage.family is None:
        return
    if stage.feedback.capacitance:
        out, net = stage.output.net, stage.inputs.minus.net
        for element in [e for e in scene.on(out, "C") if set(e.nets[:2]) == {out, net}]:
            edits = scene.without(element)
            if edits:
                yield Candidate(edits=edits, what=f"take {element.designator} out", regains=True)
        return
    stated, ohms = stage.family.feedback_resistor.best, stage.feedback.resistance
    if not stated or not ohms:
        return
    changes: list[Edit | None] = []
    words = []
    resistors = [e for e in scene.on(stage.inputs.minus.net, "R") if e.value]
    for element in resistors:
        value = scene.fit("R", (element.value or 0.0) * stated / ohms, at=element)
        changes.append(scene.value(element, value))
        words.append(with_value(element, value))
    made = all_of(*changes)
    if made is not None:
        yield Candidate(
            edits=made,
            what=" and ".join(words),
            choice=f"the data sheet states {si(stated, 'Ω')}; the others follow, so the gain stays",
        )
