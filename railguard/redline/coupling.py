"""Coupling capacitors made as large as the bottom of the band asks for."""

import math
from collections.abc import Iterator
from itertools import combinations

from railguard.circuit.model import GROUND, Element
from railguard.redline.scene import Candidate, Scene, all_of, with_value
from railguard.rules.compose import stage_named
from railguard.rules.finding import Finding
from railguard.rules.relations import upstream
from railguard.units import si

RESERVE = (1.15, 1.5, 2.2, 4.7)
"""Beyond what the corner asks for: the next value up, then room for several corners in a row."""


def enlarged(finding: Finding, scene: Scene) -> Iterator[Candidate]:
    """Enlarge one coupling capacitor on the way to a stage, else two, else all of them."""
    stage = scene.stage(finding)
    if stage is None or not finding.demand or not finding.limit:
        return
    ratio = finding.demand / finding.limit
    names = [stage.designator, *stage.after, *sorted(upstream(stage, scene.design))]
    stages = [s for d in dict.fromkeys(names) if (s := stage_named(d, scene.design)) is not None]
    nets = [n for s in stages for n in (s.inputs.plus.net, s.inputs.minus.net)]
    found = list(dict.fromkeys(c.designator for n in nets for c in _coupling(n, scene)))
    elements = [scene.elements[d] for d in found][:6]
    for count in sorted({1, min(2, len(elements)), len(elements)} - {0}):
        for chosen in combinations(elements, count):
            for reserve in RESERVE:
                edits, words = [], []
                for element in chosen:
                    asked = max((element.value or 0.0) * ratio, _physical(element, finding, scene))
                    farads = scene.fit("C", asked * reserve, "up", element)
                    edits.append(scene.value(element, farads))
                    words.append(with_value(element, farads))
                made = all_of(*edits)
                if made is not None:
                    yield Candidate(
                        edits=made,
                        what=" and ".join(words),
                        choice=f"the corner comes down to {si(finding.limit, 'Hz')} or less; a "
                        "larger resistor behind it would do as well, at the price of noise and "
                        "bias error",
                        regains=True,  # the gain at the bottom of the band rises, as is meant
                    )


def _physical(element: Element, finding: Finding, scene: Scene) -> float:
    """Return the capacitance that puts its own corner with the resistors behind it where asked, F.

    The rule's figure is that of the whole way; one far too small capacitor hides behind it.
    """
    ohms = [
        r.value for net in element.nets[:2] if net != GROUND for r in scene.on(net, "R") if r.value
    ]
    if not ohms or not finding.limit:
        return 0.0
    return 1 / (2 * math.pi * finding.limit * min(ohms))


def _coupling(net: str, scene: Scene) -> Iterator[Element]:
    """Yield the capacitors that stand in series with what reaches an input."""
    rails = {r.net for r in scene.design.rails}
    outs = {s.output.net for s in scene.design.stages}
    if net == GROUND or net in rails:
        return
    for element in scene.on(net, "C"):
        if (
            element.value
            and not {GROUND, *rails} & set(element.nets[:2])
            and not _is_local(element, scene)
        ):
            yield element
    for resistor in scene.on(net, "R"):
        far = resistor.nets[1] if resistor.nets[0] == net else resistor.nets[0]
        here = [e for e in scene.on(far) if e.designator != resistor.designator]
        if far in outs or far == GROUND or len(here) != 1 or here[0].kind != "C":
            continue
        if here[0].value:
            yield here[0]


def _is_local(element: Element, scene: Scene) -> bool:
    """Tell whether a capacitor stands across a stage's own feedback."""
    ends = set(element.nets[:2])
    return any(ends == {s.output.net, s.inputs.minus.net} for s in scene.design.stages)
