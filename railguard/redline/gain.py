"""Gain to fit the range: feedback resistors lowered until the output stays where it can go."""

import math
from collections.abc import Iterator

from railguard.analysis.bound import Bound
from railguard.analysis.stage import Stage
from railguard.circuit.model import GROUND, Element
from railguard.redline import pairs
from railguard.redline.pairs import STEPS
from railguard.redline.scene import Candidate, Scene, all_of, with_value
from railguard.rules.compose import stage_named
from railguard.rules.finding import Finding
from railguard.rules.relations import upstream
from railguard.rules.remedies import fed_both_ways, level_amplified, own_gain
from railguard.units import si

TRIED_BEFORE = 4
"""Stages before the one that clips whose gain is tried."""
MOST_RAISED = 30.0
"""Times a resistor at an input may grow; beyond, the gain is one and something else is wrong."""
AT_AN_END = 0.02
"""Share of the swing by which the level a gain counts from may lie beyond a limit."""
LEAST_OHMS = 10.0
"""A resistor below this is a wire, and sets no gain: common practice, no source."""


def fitted(finding: Finding, scene: Scene) -> Iterator[Candidate]:
    """Lower the gain of a stage, or of one before it, so that its output or input fits."""
    stage = scene.stage(finding)
    if stage is None:
        return
    factors = shares_that_fit(finding, stage, scene)
    own = [stage] if finding.rule != "headroom-input" else []
    before = [s for s in (stage_named(d, scene.design) for d in _nearest(stage, scene)) if s]
    for one in [*own, *before[:TRIED_BEFORE]]:
        yield from pairs.balanced(one, scene)
        yield from pairs.common_leg(one, factors, scene)
        yield from _lowered(one, factors, scene, finding)
    for one in own:
        yield from _raised(one, factors, scene)


def _nearest(stage: Stage, scene: Scene) -> list[str]:
    far = upstream(stage, scene.design)
    return [*stage.after, *(d for d in sorted(far) if d not in stage.after)]


def shares_that_fit(finding: Finding, stage: Stage, scene: Scene) -> tuple[float, ...]:
    """Return the shares of a stage's gain that would just do, the larger first.

    What the gain multiplies may be the swing alone, its level coming from a reference, or the level
    too, so the share is worked out from the level and from zero.
    """
    if finding.demand is None or finding.limit is None:
        return ()
    if finding.rule not in RANGES:
        ratio = finding.limit / finding.demand if finding.demand else 0.0
        return (ratio,) if 0 < ratio < 1 else ()
    inner = finding.rule == "headroom-input"
    level = (stage.inputs.plus.level if inner else stage.output.level) or 0.0
    bounds = (stage.output.high, stage.output.low, stage.inputs.high, stage.inputs.low)
    reserve = scene.limits(finding.rule).get("reserve-share", 0.0)
    found = []
    for start in dict.fromkeys((level, 0.0)):
        of = bounds[2:] if inner else bounds[:2]
        shares = [s for bound in of for s in _shares(bound, start, reserve)]
        if shares and 0 < min(shares) < 1:
            found.append(min(shares))
    return tuple(sorted(found, reverse=True))


RANGES = ("headroom-output", "headroom-input", "headroom-stuck", "headroom-phase-reversal")
"""Rules whose limit is a level; the others' limit is a size."""


def _shares(bound: Bound, level: float, reserve: float) -> Iterator[float]:
    """Yield the share of the present swing that fits each limit of one side, at every corner."""
    room_kept = reserve * (bound.span or 0.0)
    pairs = [(bound.demand, bound.best), (bound.demand, bound.typical)]
    pairs += [(p.demand, p.limit) for p in (bound.stated, bound.default) if p is not None]
    for demand, limit in pairs:
        if demand is None or limit is None or demand == level:
            continue
        kept = room_kept if bound.upper else -room_kept
        outside = level - limit if bound.upper else limit - level
        if 0 <= outside < AT_AN_END * (bound.span or 0.0):
            continue  # zero of a signal on the rail itself: no gain brings it in, or takes it out
        if (demand > level) == bound.upper:
            yield (limit - kept - level) / (demand - level)


def _lowered(
    stage: Stage, factors: tuple[float, ...], scene: Scene, finding: Finding
) -> Iterator[Candidate]:
    """Lower the resistors that multiply a stage's signal, the largest gain that fits first."""
    resistors = scaling_resistors(stage, scene)
    if not resistors:
        return
    tried: set[tuple[float, ...]] = set()
    for share in sorted({f * step for f in factors for step in STEPS}, reverse=True):
        values = []
        for element in resistors:
            wanted = _resistance(stage, element, share)
            if wanted is None or wanted < LEAST_OHMS:
                return
            values.append(scene.fit("R", wanted, "down", element))
        key = tuple(values)
        if key in tried or any(
            v >= (e.value or 0.0) for v, e in zip(values, resistors, strict=True)
        ):
            continue
        tried.add(key)
        edits = [scene.value(e, v) for e, v in zip(resistors, values, strict=True)]
        words = [with_value(e, v) for e, v in zip(resistors, values, strict=True)]
        for capacitor in _across(stage, scene):
            farads = scene.fit(
                "C",
                (capacitor.value or 0.0) * (resistors[0].value or 0.0) / values[0],
                at=capacitor,
            )
            edits.append(scene.value(capacitor, farads))
            words.append(with_value(capacitor, farads))
        made = all_of(*edits)
        if made is not None:
            yield Candidate(
                edits=made,
                what=" and ".join(words),
                choice=_choice(stage, values[0] / (resistors[0].value or 1.0), finding),
                regains=True,
            )


def _raised(stage: Stage, factors: tuple[float, ...], scene: Scene) -> Iterator[Candidate]:
    """Raise the resistors that bring the signal in, or set the gain from the other side."""
    if stage.topology == "difference" or fed_both_ways(stage, scene.design):
        return  # one of them alone would cost the balance
    own = set(stage.feedback.elements)
    inputs = [e for e in scene.on(stage.inputs.minus.net, "R") if e.designator not in own]
    inputs = [e for e in inputs if e.value]
    if len(inputs) != 1 or not own:
        return
    element = inputs[0]
    for share in sorted({f * step for f in factors for step in STEPS}, reverse=True):
        if share * MOST_RAISED < 1:
            return
        ohms = scene.fit("R", (element.value or 0.0) / share, "up", element)
        edit = scene.value(element, ohms)
        if edit is not None:
            yield Candidate(
                edits=(edit,),
                what=with_value(element, ohms),
                choice="the gain falls with it; a larger resistor here loads the source less and "
                "makes more noise than a smaller one in the feedback would",
                regains=True,
            )


def _choice(stage: Stage, share: float, finding: Finding) -> str:
    gain = own_gain(stage)
    text = f"the gain of {stage.schematic} falls to {si(100 * share, '%')} of what it was"
    if gain is not None and stage.topology == "non-inverting" and gain > 1:
        text = f"the gain of {stage.schematic} falls from {si(gain, '')} to "
        text += si(1 + (gain - 1) * share, "")
    elif gain is not None:
        text = f"the gain of {stage.schematic} falls from {si(gain, '')} to {si(gain * share, '')}"
    return (
        f"{text}, the largest of those tried that keeps {finding.rule} quiet at every corner; "
        "the input resistor was left, so the source is loaded as before, and less feedback "
        "resistance means less noise"
    )


def scaling_resistors(stage: Stage, scene: Scene) -> tuple[Element, ...]:
    """Return the resistors that multiply a stage's signal: of its feedback, and their fellows.

    A difference amplifier has a second one, from its non-inverting input to its reference; where
    none is found, as in one of two amplifiers, its balance hangs on more than it has, and it is
    left alone.
    """
    if stage.topology == "difference" and stage.balance is not None:
        _lead, back, _first, fellow = stage.balance.elements
        pair = tuple(e for d in (back, fellow) if (e := scene.elements.get(d)))
        return pair if len(pair) == 2 and all(e.value and e.fitted for e in pair) else ()
    if fed_both_ways(stage, scene.design):
        return ()
    own = [e for d in stage.feedback.elements if (e := scene.elements.get(d))]
    resistors = [e for e in own if e.kind == "R" and e.value and e.fitted]
    if not resistors or len(resistors) > 2:
        return ()
    if stage.topology == "difference" and len(resistors) == 1:
        fellows = [
            e for e in scene.on(stage.inputs.plus.net, "R")
            if e.value and abs(e.value - (resistors[0].value or 0.0)) < 0.02 * e.value
        ]  # fmt: skip
        return (resistors[0], fellows[0]) if fellows else ()
    return tuple(resistors)


def _resistance(stage: Stage, element: Element, share: float) -> float | None:
    """Return the resistance that gives a share of a stage's gain, ohm."""
    ohms, noise_gain = element.value or 0.0, stage.loop.noise_gain_dc
    if stage.topology == "non-inverting" or (noise_gain and stage.topology.startswith("non-inv")):
        gain = own_gain(stage) or noise_gain
        if gain is None or gain <= 1:
            return None
        return ohms * max(gain * share - 1, 0.0) / (gain - 1) or None
    return ohms * share


def _across(stage: Stage, scene: Scene) -> tuple[Element, ...]:
    """Return capacitors straight across a stage's feedback, whose corner is to stay."""
    ends = {stage.output.net, stage.inputs.minus.net}
    if len(ends) < 2:
        return ()
    return tuple(e for e in scene.on(stage.output.net, "C") if set(e.nets[:2]) == ends and e.value)


def level_blocked(finding: Finding, scene: Scene) -> Iterator[Candidate]:
    """Take the level out of the gain where the signal comes through a capacitor anyway."""
    stage = scene.stage(finding)
    if stage is not None and stage.ac_coupled and level_amplified(stage):
        yield from blocked(finding, scene)


def blocked(finding: Finding, scene: Scene) -> Iterator[Candidate]:
    """Give the gain a capacitor in its ground leg, so that offset is amplified by one.

    Only where nothing below the stated band counts.
    """
    stage = scene.stage(finding)
    if stage is None or stage.topology != "non-inverting" or not stage.band.low:
        return
    net = stage.inputs.minus.net
    legs = [e for e in scene.on(net, "R") if e.value and GROUND in e.nets[:2]]
    for leg in legs:
        scene.forget()
        middle = scene.new_net(net)
        needed = 10 / (2 * math.pi * stage.band.low * (leg.value or 1.0))
        farads = scene.fit("C", needed, "up")
        moved, made = (
            scene.node(leg, GROUND, middle),
            scene.added("C", (middle, GROUND), farads, leg),
        )
        if moved is None or made is None:
            continue
        yield Candidate(
            edits=tuple(sorted((moved, made[0]))),
            what=f"put {made[1]} of {si(farads, 'F')} into the ground leg of {stage.schematic}, "
            f"between {leg.designator} and 0",
            choice=f"its corner stands at a tenth of {si(stage.band.low, 'Hz')}; the gain at DC "
            "is one, so neither level nor offset is amplified",
            regains=True,
        )
