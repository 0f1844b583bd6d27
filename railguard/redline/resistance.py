"""Resistance at an input: lowered, or met by as much at the other one."""

from collections.abc import Iterator

from railguard.redline.scene import Candidate, Scene, all_of, with_value
from railguard.rules.finding import Finding
from railguard.units import si


def lowered(finding: Finding, scene: Scene) -> Iterator[Candidate]:
    """Lower the resistance at the non-inverting input, its coupling capacitor raised as much."""
    stage = scene.stage(finding)
    if stage is None or not finding.demand or not finding.limit:
        return
    pin = stage.inputs.plus
    share = finding.limit / finding.demand
    resistors = [e for d in pin.path if (e := scene.elements.get(d)) and e.kind == "R" and e.value]
    resistors = resistors or [e for e in scene.on(pin.net, "R") if e.value]
    coupling = [c for c in scene.on(pin.net, "C") if c.value]
    for chosen in (
        ([e] for e in resistors) if len(resistors) == 1 else (resistors, *([e] for e in resistors))
    ):
        for step in (1.0, 0.5, 0.1):
            edits, words = [], []
            for element in chosen:
                ohms = scene.fit("R", (element.value or 0.0) * share * step, "down", element)
                edits.append(scene.value(element, ohms))
                words.append(with_value(element, ohms))
            for capacitor in coupling:
                farads = scene.fit("C", (capacitor.value or 0.0) / (share * step), "up", capacitor)
                edits.append(scene.value(capacitor, farads))
                words.append(with_value(capacitor, farads))
            made = all_of(*edits)
            if made is not None:
                yield Candidate(
                    edits=made,
                    what=" and ".join(words),
                    choice="as much resistance as the bias error allows: less would load the "
                    "source and take more power" + ("; the corner stays" if coupling else ""),
                )


def balanced(finding: Finding, scene: Scene) -> Iterator[Candidate]:
    """Put as much resistance in a follower's feedback as its input sees, which undoes the error."""
    stage = scene.stage(finding)
    if stage is None or stage.feedback.resistance != 0 or not stage.inputs.plus.resistance:
        return
    net, out = scene.new_net(stage.inputs.minus.net), stage.output.net
    ohms = scene.fit("R", stage.inputs.plus.resistance)
    moved = scene.pin(stage, "minus", net)
    added = scene.added("R", (out, net), ohms, stage)
    if moved is None or added is None:
        return
    yield Candidate(
        edits=tuple(sorted((moved, added[0]))),
        what=f"add {added[1]} of {si(ohms, 'Ω')} between the output and the inverting input",
        choice="equal resistances at both inputs leave only the offset current",
    )
