"""A divider before an input, where the signal itself is too large for the stage."""

import math
from collections.abc import Iterator

from railguard.analysis.stage import Stage
from railguard.circuit.model import GROUND
from railguard.redline.decoupling import joined
from railguard.redline.gain import shares_that_fit
from railguard.redline.isolation import own_network
from railguard.redline.level import references
from railguard.redline.scene import Candidate, Scene
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
