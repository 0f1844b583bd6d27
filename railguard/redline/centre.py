"""Levels: an output put in the middle of its range, by divider, reference or another tie."""

from collections.abc import Iterator

from railguard.analysis.stage import Stage
from railguard.circuit.model import GROUND, Element
from railguard.redline.decoupling import joined
from railguard.redline.level import divider
from railguard.redline.scene import Candidate, Scene, with_value
from railguard.rules.finding import Finding
from railguard.units import si


def centred(finding: Finding, scene: Scene) -> Iterator[Candidate]:
    """Move an input's level so that the output rests in the middle of its range."""
    stage = scene.stage(finding)
    if stage is None or stage.output.level is None:
        return
    pin, reach = stage.inputs.plus, stage.output.available
    if reach.low is None or reach.high is None:
        reach = stage.output.guaranteed
    gain = stage.loop.noise_gain_dc
    if pin.level is None or not gain or reach.low is None or reach.high is None:
        return
    target = pin.level + ((reach.high + reach.low) / 2 - stage.output.level) / gain
    yield from _divided(stage, target, scene)
    yield from _sourced(stage, target, scene)
    yield from _legged(stage, (reach.high + reach.low) / 2, gain, scene)
    yield from _moved(stage, target, scene)
    yield from _lifted(stage, target, scene)


def level_outside(finding: Finding, scene: Scene) -> Iterator[Candidate]:
    """Change the reference of a ground leg that takes the level itself beyond the range.

    No gain is at fault then; any other source may be the signal, so that its gain is tried first.
    """
    stage = scene.stage(finding)
    if stage is None or stage.output.level is None:
        return
    reach, gain = stage.output.available, stage.loop.noise_gain_dc
    if reach.low is None or reach.high is None or not gain:
        return
    if not reach.low < stage.output.level < reach.high:
        yield from _legged(stage, (reach.high + reach.low) / 2, gain, scene)


REFERENCE_STEP = 0.05
"""V; a reference proposed is a multiple of this."""


def _sourced(stage: Stage, target: float, scene: Scene) -> Iterator[Candidate]:
    """Give the reference that sets the level another voltage."""
    pin = stage.inputs.plus
    ties = [e for e in scene.on(pin.net, "R") if e.value]
    nets = {pin.net, *(n for e in ties for n in e.nets[:2])}
    for source in _standing(nets, scene):
        yield from _set(source, target, stage, scene)


def _legged(stage: Stage, middle: float, gain: float, scene: Scene) -> Iterator[Candidate]:
    """Give the reference behind the ground leg of a non-inverting stage another voltage.

    What it adds to the output is itself, turned over, times the gain less one.
    """
    net, level = stage.inputs.minus.net, stage.output.level
    if stage.topology != "non-inverting" or level is None or gain <= 1:
        return
    own = set(stage.feedback.elements)
    legs = [e for e in scene.on(net, "R") if e.value and e.designator not in own]
    for source in _standing({n for e in legs for n in e.nets[:2]} - {net}, scene):
        stands = source.source.level if source.source is not None else 0.0
        stands = stands if source.nets[0] != GROUND else -stands
        yield from _set(source, stands + (level - middle) / (gain - 1), stage, scene)


def _standing(nets: set[str], scene: Scene) -> Iterator[Element]:
    """Yield the sources of a standing level on some nets that are no rails."""
    nets = nets - {r.net for r in scene.design.rails} - {GROUND}
    for source in scene.design.circuit.elements:
        if source.kind != "V" or source.source is None or source.source.dc is None:
            continue
        if nets & set(source.nets[:2]):
            yield source


def _set(source: Element, target: float, stage: Stage, scene: Scene) -> Iterator[Candidate]:
    """Give a reference a level, in steps that references come in."""
    before, supply = source.source.dc if source.source is not None else None, stage.supply
    low, high = supply.negative, supply.positive
    if low is not None and high is not None and not low <= target <= high:
        return  # no reference on these rails gives it
    volts = round(target / REFERENCE_STEP) * REFERENCE_STEP
    volts = volts if source.nets[0] != GROUND else -volts
    edit = scene.level(source, volts)
    if edit is not None and before is not None and abs(volts - before) >= REFERENCE_STEP / 2:
        yield Candidate(
            edits=(edit,),
            what=f"{source.designator} = {si(volts, 'V')} instead of {si(before, 'V')}, the "
            f"reference of {stage.schematic}",
            choice="the middle of the output's range leaves a signal as much room on both sides",
        )


def _divided(stage: Stage, target: float, scene: Scene) -> Iterator[Candidate]:
    """Change one resistor of the divider that sets the level."""
    pin = stage.inputs.plus
    names = pin.divider.elements if pin.divider is not None else pin.path
    resistors = [e for d in names if (e := scene.elements.get(d)) and e.kind == "R" and e.value]
    for changed in resistors:
        for other in resistors:
            tap = next((n for n in changed.nets[:2] if n in other.nets[:2]), None)
            if other is changed or tap is None:
                continue
            ends = [_end(e, tap, scene) for e in (changed, other)]
            if ends[0] is None or ends[1] is None or not other.value:
                continue
            here, there = ends[0] - target, target - ends[1]
            if here * there <= 0:
                continue
            ohms = scene.fit("R", other.value * here / there, at=changed)
            edit = scene.value(changed, ohms)
            if edit is not None:
                yield Candidate(
                    edits=(edit,),
                    what=with_value(changed, ohms),
                    choice=f"it puts {tap} at {si(target, 'V')}, so that the output rests in the "
                    "middle of its range; smaller resistors would take more supply current, "
                    "larger ones make more of bias current",
                )


def _end(element: Element, tap: str, scene: Scene) -> float | None:
    """Return the level at a divider resistor's far end, V."""
    net = element.nets[1] if element.nets[0] == tap else element.nets[0]
    if net == GROUND:
        return 0.0
    rail = next((r for r in scene.design.rails if r.net == net), None)
    return rail.level if rail is not None else None


def _moved(stage: Stage, target: float, scene: Scene) -> Iterator[Candidate]:
    """Tie the resistor that biases a coupled input to another level."""
    pin = stage.inputs.plus
    ties = [e for e in scene.on(pin.net, "R") if e.value and pin.net in e.nets[:2]]
    for tie in ties:
        far = tie.nets[1] if tie.nets[0] == pin.net else tie.nets[0]
        if far in (stage.output.net, stage.inputs.minus.net) or not scene.stands(far):
            continue
        scene.forget()
        level = divider(stage, scene, tie, target)
        if level is None:
            return
        edit = scene.node(tie, far, level.net)
        if edit is None:
            continue
        yield Candidate(
            edits=tuple(sorted((edit, *joined(list(level.edits))))),
            what=f"tie {tie.designator} to {level.net} instead of {far}: {level.words}",
            choice="the middle of the output's range leaves a signal as much room on both sides",
        )


def _lifted(stage: Stage, target: float, scene: Scene) -> Iterator[Candidate]:
    """Give an inverting stage whose non-inverting input is on ground a level there."""
    if not stage.topology.startswith("inverting") or stage.inputs.plus.net != GROUND:
        return
    near = next(iter(scene.on(stage.inputs.minus.net, "R")), None)
    scene.forget()
    level = divider(stage, scene, near, target) if near is not None else None
    edit = scene.pin(stage, "plus", level.net) if level is not None else None
    if level is None or edit is None:
        return
    yield Candidate(
        edits=tuple(sorted((edit, *joined(list(level.edits))))),
        what=f"put the non-inverting input of {stage.schematic} on {level.net} instead of ground: "
        f"{level.words}",
        choice="the middle of the output's range leaves a signal as much room on both sides",
    )
