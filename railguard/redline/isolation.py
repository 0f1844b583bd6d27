"""A resistor between an output and what it drives, or between a driver and an input."""

import math
from collections.abc import Iterator

from railguard.analysis.stage import Stage
from railguard.circuit.model import GROUND, Element
from railguard.redline.decoupling import joined
from railguard.redline.model import Edit
from railguard.redline.scene import Candidate, Scene, all_of
from railguard.rules.finding import Finding
from railguard.units import si

LOAD_SHARE = 0.05
"""Of the resistance an output works into; a larger resistor in its way would cost more level."""
BAND_ROOM = 3.0
"""Of the top of the band: a corner there costs 5 %."""
STEPS = (22.0, 47.0, 100.0, 220.0, 470.0, 1000.0)
"""Ohm; data sheets draw 20 to 100 ohms, large capacitances take more."""


def isolated(finding: Finding, scene: Scene) -> Iterator[Candidate]:
    """Part an output from its load with a resistor outside the feedback."""
    stage = scene.stage(finding)
    if stage is None:
        return
    for ohms in STEPS:
        if _costs(stage, ohms):
            return
        scene.forget()
        made = parted(stage, scene, scene.fit("R", ohms))
        if made is None:
            return
        edits, name, value = made
        yield Candidate(
            edits=edits,
            what=f"add {name} of {si(value, 'Ω')} between the output of {stage.schematic} and "
            f"{stage.output.net}, outside its feedback",
            choice=_choice(stage, value),
        )


def _costs(stage: Stage, ohms: float) -> bool:
    """Tell whether a resistor before the load would take its level or its band away."""
    load, farads = stage.current.load, stage.current.load_capacitance
    if load and ohms > LOAD_SHARE * load:
        return True
    top = stage.loop.band or stage.band.high
    if not farads or not top:
        return False
    return 1 / (2 * math.pi * ohms * farads) < BAND_ROOM * top


def _choice(stage: Stage, ohms: float) -> str:
    farads = stage.current.load_capacitance
    corner = (
        f" and makes a corner at {si(1 / (2 * math.pi * ohms * farads), 'Hz')} with the "
        f"{si(farads, 'F')}"
        if farads
        else ""
    )
    return (
        "the smallest of six from 22 Ω to 1 kΩ that cures it: a larger one damps more and costs "
        f"level at the load{corner}"
    )


def parted(stage: Stage, scene: Scene, ohms: float) -> tuple[tuple[Edit, ...], str, float] | None:
    """Move an op-amp's output and its own network to a new net, a resistor from there to the old.

    What hangs on the old net (loads, the next stage, a connector) keeps the net's name.
    """
    net = stage.output.net
    new = scene.new_net(scene.local(net, stage))
    moves: list[Edit | None] = [scene.pin(stage, "output", new)]
    if stage.inputs.minus.net == net:
        moves.append(scene.pin(stage, "minus", new))
    if stage.inputs.plus.net == net:
        return None
    for element in own_network(stage, scene):
        moves.append(scene.node(element, net, new))
    edits, added = all_of(*moves), scene.added("R", (new, net), ohms, stage)
    if edits is None or added is None:
        return None
    return tuple(sorted((*edits, added[0]))), added[1], ohms


def own_network(stage: Stage, scene: Scene) -> tuple[Element, ...]:
    """Return the elements at the output that lead back to the stage's own inputs."""
    net = stage.output.net
    inputs = {stage.inputs.plus.net, stage.inputs.minus.net} - {GROUND, net}
    walls = {GROUND, net, *(r.net for r in scene.design.rails)}
    walls |= {s.output.net for s in scene.design.stages}
    held = {e.nets[0] for e in scene.design.circuit.elements if e.kind == "V"}
    found = []
    for element in scene.on(net):
        far = element.nets[1] if element.nets[0] == net else element.nets[0]
        waiting, seen = [far], set()
        while waiting:
            at = waiting.pop()
            if at in seen or at in walls or at in held:
                continue
            seen.add(at)
            waiting += [n for e in scene.on(at) for n in e.nets[:2]]
        if seen & inputs:
            found.append(element)
    return tuple(found)


def divided(finding: Finding, scene: Scene) -> Iterator[Candidate]:
    """Divide an output down before a load that stands less."""
    stage = scene.stage(finding)
    if stage is None or not finding.demand or not finding.limit:
        return
    share = finding.limit / finding.demand
    for lower in (10e3, 2.2e3, 47e3):
        scene.forget()
        upper = scene.fit("R", lower * (1 / share - 1) * 1.02, "up")
        made = parted(stage, scene, upper)
        if made is None:
            return
        edits, name, ohms = made
        shunt = scene.added("R", (stage.output.net, GROUND), scene.fit("R", lower), stage)
        if shunt is None:
            return
        yield Candidate(
            edits=joined([*edits, shunt[0]]),
            what=f"divide the output of {stage.schematic} by {name} of {si(ohms, 'Ω')} and "
            f"{shunt[1]} of {si(scene.fit('R', lower), 'Ω')} before {stage.output.net}",
            choice="smaller resistors would load the output, larger ones make noise and let the "
            "load pull the level",
            regains=True,
        )


def guarded(finding: Finding, scene: Scene) -> Iterator[Candidate]:
    """Put a resistor in series with an input that another supply drives."""
    stage = scene.stage(finding)
    if stage is None:
        return
    role = "plus" if stage.inputs.plus.net in finding.nets else "minus"
    pin = stage.inputs.plus if role == "plus" else stage.inputs.minus
    least = 100.0
    if finding.demand and finding.limit and pin.series:
        least = pin.series * finding.demand / finding.limit - pin.series
    for ohms in (max(least, 100.0), 1e3, 4.7e3, 10e3, 47e3):
        scene.forget()
        value = scene.fit("R", ohms, "up")
        if value < least:
            continue
        net = scene.new_net(scene.local(pin.net, stage))
        moved = scene.pin(stage, "plus" if role == "plus" else "minus", net)
        added = scene.added("R", (pin.net, net), value, stage)
        if moved is None or added is None:
            return
        yield Candidate(
            edits=tuple(sorted((moved, added[0]))),
            what=f"add {added[1]} of {si(value, 'Ω')} in series with the input of "
            f"{stage.schematic} on {pin.net}",
            choice="the least that holds the current in the input's diode; more would add noise "
            "and bias error",
        )
