"""Gains that two networks or two amplifiers share: a difference amplifier, a pair at a bridge."""

from collections.abc import Iterator

from railguard.analysis.stage import Stage
from railguard.circuit.model import GROUND, Element
from railguard.redline.scene import Candidate, Scene, with_value
from railguard.units import si

STEPS = (1.0, 0.97, 0.94, 0.9, 0.86, 0.8, 0.7, 0.55, 0.35)
"""Shares of the gain worked out that are tried in turn: load and offset take their part."""
OFF_BALANCE = 0.2
"""Share by which two ratios differ that were to be one, and are more than tolerance apart."""


def balanced(stage: Stage, scene: Scene) -> Iterator[Candidate]:
    """Give a difference amplifier's feedback resistor the ratio its other two resistors have.

    One of four has the wrong value where the stage multiplies one signal far more than the other.
    """
    four = _four(stage, scene)
    if four is None:
        return
    lead, back, first, fellow = four
    ratio = (fellow.value or 0.0) / (first.value or 1.0)
    wanted = (lead.value or 0.0) * ratio
    if abs((back.value or 0.0) - wanted) <= OFF_BALANCE * wanted:
        return
    ohms = scene.fit("R", wanted, at=back)
    edit = scene.value(back, ohms)
    if edit is not None:
        yield Candidate(
            edits=(edit,),
            what=with_value(back, ohms),
            choice=f"to {lead.designator} as {fellow.designator} is to {first.designator}, so that "
            f"both signals are multiplied by {si(ratio, '')} and what they share is not",
            regains=True,
            wakes=True,
        )


def _four(stage: Stage, scene: Scene) -> tuple[Element, Element, Element, Element] | None:
    """Return the four resistors of a difference amplifier, however far from balance they are."""
    out, minus, plus = stage.output.net, stage.inputs.minus.net, stage.inputs.plus.net
    if GROUND in (minus, plus) or plus == minus or out == minus:
        return None
    below = [e for e in scene.on(minus, "R") if e.value]
    above = [e for e in scene.on(plus, "R") if e.value]
    back = [e for e in below if out in e.nets[:2]]
    fellow = [e for e in above if scene.stands(_far(e, plus))]
    lead, first = ([e for e in on if e not in (*back, *fellow)] for on in (below, above))
    if not len(back) == len(fellow) == len(lead) == len(first) == 1:
        return None
    if scene.stands(_far(lead[0], minus)):
        return None  # a ground leg: the divider before the other input is no fellow of it
    return lead[0], back[0], first[0], fellow[0]


def common_leg(stage: Stage, factors: tuple[float, ...], scene: Scene) -> Iterator[Candidate]:
    """Raise the resistor between the inverting inputs of two amplifiers, which sets both gains."""
    net, own = stage.inputs.minus.net, set(stage.feedback.elements)
    others = {s.inputs.minus.net for s in scene.design.stages} - {net, GROUND}
    resistors = [e for e in scene.on(net, "R") if e.value and e.designator not in own]
    gain = _pair_gain(stage, resistors)
    if gain is None or _far(resistors[0], net) not in others:
        return
    leg = resistors[0]
    tried = set()
    for share in sorted({f * step for f in factors for step in STEPS}, reverse=True):
        if share * gain <= 1:
            return
        ohms = scene.fit("R", (leg.value or 0.0) * (gain - 1) / (share * gain - 1), "up", leg)
        edit = scene.value(leg, ohms)
        if edit is None or ohms in tried:
            continue
        tried.add(ohms)
        left = 1 + (gain - 1) * (leg.value or 0.0) / ohms
        yield Candidate(
            edits=(edit,),
            what=with_value(leg, ohms),
            choice=f"one resistor sets the gain of both amplifiers: for the difference it falls "
            f"from {si(gain, '')} to {si(left, '')}, and what both inputs share still passes once",
            regains=True,
        )


def _pair_gain(stage: Stage, leg: list[Element]) -> float | None:
    """Return what a pair makes of a difference, 1 + 2 R / RG; None where it is none."""
    resistance = stage.feedback.resistance
    if len(leg) != 1 or not resistance:
        return None
    return 1 + 2 * resistance / (leg[0].value or 1.0)


def _far(element: Element, net: str) -> str:
    return element.nets[1] if element.nets[0] == net else element.nets[0]
