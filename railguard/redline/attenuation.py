"""A divider before an input, where the signal itself is too large for the stage.

Where a filter's network leads to the input, what brings the signal in is made a divider of the same
resistance or capacitance, so that the filter stays as it is (Thevenin).
"""

import math
from collections.abc import Iterator

from railguard.analysis.stage import Stage
from railguard.circuit.model import GROUND, Element
from railguard.redline.decoupling import joined
from railguard.redline.gain import shares_that_fit
from railguard.redline.isolation import own_network
from railguard.redline.level import references
from railguard.redline.scene import UNITS, Candidate, Scene, with_value
from railguard.rules.feedback.size import BOLTZMANN_4KT
from railguard.rules.finding import Finding
from railguard.units import si

SHUNTS = (10e3, 100e3, 1e6)
"""Ohm; the shunt arm: the first makes little noise and bias error, each next one loads ten times
less. Common practice, no source."""
LOADING = 20.0
"""The divider over the resistance of what drives it; below it takes more than 5 % of the level."""
STEPS = (1.0, 0.95, 0.9, 0.8, 0.65)
"""Shares of the attenuation worked out that are tried in turn."""
PLAIN = ("non-inverting", "follower", "buffer")
"""Topologies whose signal enters at the non-inverting input alone."""


def divided_input(finding: Finding, scene: Scene) -> Iterator[Candidate]:
    """Divide the signal down before the non-inverting input of a stage."""
    stage = scene.stage(finding)
    if stage is None or stage.topology not in PLAIN or stage.inputs.plus.net == GROUND:
        return
    if stage.inputs.plus.net == stage.output.net or own_network_at_input(stage, scene):
        return
    shares = shares_that_fit(finding, stage, scene)
    driven = LOADING * (stage.inputs.plus.resistance or 0.0)
    for shunt in sorted(SHUNTS, key=lambda ohms: 2 * ohms < driven):
        for net in (GROUND, *(level.net for level in references(stage, scene))):
            for step in STEPS:
                for share in shares:
                    made = _divided(stage, net, share * step, shunt, scene)
                    if made is not None:
                        yield made


def own_network_at_input(stage: Stage, scene: Scene) -> bool:
    """Tell whether the stage's own output leads back to its non-inverting input."""
    net = stage.inputs.plus.net
    return any(net in e.nets[:2] for e in own_network(stage, scene))


def _divided(stage: Stage, to: str, share: float, shunt: float, scene: Scene) -> Candidate | None:
    scene.forget()
    pin = stage.inputs.plus
    lower = scene.fit("R", shunt)
    upper = scene.fit("R", lower * (1 / share - 1), "up")
    net = scene.new_net(scene.local(pin.net, stage))
    moved = scene.pin(stage, "plus", net)
    series, across = (
        scene.added("R", (pin.net, net), upper, stage),
        scene.added("R", (net, to), lower, stage),
    )
    if moved is None or series is None or across is None:
        return None
    real = lower / (lower + upper)
    source = lower * upper / (lower + upper)
    noise = math.sqrt(BOLTZMANN_4KT * source)
    return Candidate(
        edits=tuple(sorted((moved, *joined([series[0], across[0]])))),
        what=f"divide the input of {stage.schematic} by {series[1]} of {si(upper, 'Ω')} and "
        f"{across[1]} of {si(lower, 'Ω')} to {to}",
        choice=f"{si(100 * real, '%')} of the signal is the most that fits, and what comes behind "
        f"gets that much less; {si(source, 'Ω')} at the input make {si(noise, 'V')}/√Hz of noise: "
        f"smaller resistors would load the source below {si(lower + upper, 'Ω')}, larger ones make "
        "more noise and bias error",
        regains=True,
    )


def divided_entry(finding: Finding, scene: Scene) -> Iterator[Candidate]:
    """Divide the signal where it enters a filter's network, the filter left as it is.

    The gain of such a filter sets its quality too, so this comes before a smaller one.
    """
    stage = scene.stage(finding)
    if stage is None or not own_network_at_filter(stage, scene):
        return
    entry = _entry(stage, scene)
    if entry is None:
        return
    element, net = entry
    levels = sorted(
        (abs(volts - (stage.inputs.plus.level or 0.0)), to)
        for to, volts in ((GROUND, 0.0), *((r.net, r.volts) for r in references(stage, scene)))
    )
    for _, to in levels:  # the nearest to where the signal rests moves its level least
        for step in STEPS:
            for share in shares_that_fit(finding, stage, scene):
                made = _entered(element, net, to, share * step, scene)
                if made is not None:
                    yield made


def own_network_at_filter(stage: Stage, scene: Scene) -> bool:
    """Tell whether the output leads into the network before its non-inverting input."""
    return stage.inputs.plus.net != GROUND and bool(_before(stage, scene) & _beside(stage, scene))


def _beside(stage: Stage, scene: Scene) -> set[str]:
    """Return the nets one element away from the output."""
    out = stage.output.net
    return {n for e in scene.on(out, "RC") for n in e.nets[:2]} - {out, stage.inputs.minus.net}


def _walls(stage: Stage, scene: Scene) -> set[str]:
    """Return the nets where a network ends: what something holds."""
    walls = {GROUND, stage.inputs.minus.net, *(r.net for r in scene.design.rails)}
    walls |= {s.output.net for s in scene.design.stages}
    walls |= {s.name for s in scene.design.settings.signals}
    return walls | {n for e in scene.design.circuit.elements if e.kind == "V" for n in e.nets[:2]}


def _before(stage: Stage, scene: Scene) -> set[str]:
    """Return the nets of the network before the non-inverting input."""
    walls, found, queue = _walls(stage, scene), set[str](), [stage.inputs.plus.net]
    while queue:
        net = queue.pop()
        if net in walls or net in found:
            continue
        found.add(net)
        queue += [n for e in scene.on(net, "RC") for n in e.nets[:2]]
    return found


def _entry(stage: Stage, scene: Scene) -> tuple[Element, str] | None:
    """Return the one element that brings the signal in, and its net inside the network."""
    inside = _before(stage, scene)
    found = []
    for element in scene.design.circuit.elements:
        if element.kind not in ("R", "C") or not element.value or not element.fitted:
            continue
        own = [n for n in element.nets[:2] if n in inside]
        far = [n for n in element.nets[:2] if n not in inside]
        if len(own) == len(far) == 1 and far[0] != stage.output.net and not scene.stands(far[0]):
            found.append((element, own[0]))
    return found[0] if len(found) == 1 else None


def _entered(element: Element, net: str, to: str, share: float, scene: Scene) -> Candidate | None:
    """Part the element that brings the signal in into one in its place and one to a level."""
    scene.forget()
    kind, value = element.kind, element.value or 0.0
    unit = UNITS[kind]
    # Both together are what the one was: in parallel for a resistor, and for a capacitor as well.
    if kind == "R":
        series = scene.fit("R", value / share, "up", element)
        across = scene.fit("R", value * series / (series - value), at=element)
        real = across / (series + across)
    else:
        series = scene.fit("C", value * share, "down", element)
        across = scene.fit("C", value - series, at=element)
        real = series / (series + across)
    edit, added = scene.value(element, series), scene.added(kind, (net, to), across, element)
    if edit is None or added is None:
        return None
    return Candidate(
        edits=tuple(sorted((edit, added[0]))),
        what=f"{with_value(element, series)} and add {added[1]} of {si(across, unit)} from {net} "
        f"to {to}",
        choice=f"{si(100 * real, '%')} of the signal is the most that fits; both together are the "
        f"{si(value, unit)} that stood there, so the filter stays as it is",
        regains=True,
    )
