"""Where an input gets its level from: ground, a reference that is there, or a new divider."""

import msgspec

from railguard.analysis.stage import Stage
from railguard.circuit.model import GROUND, Element
from railguard.redline.decoupling import BULK
from railguard.redline.model import Edit
from railguard.redline.scene import Scene
from railguard.units import si

DIVIDER = 10e3
"""Ohm, each half of a divider with a capacitor at its tap: a common value, some 0.1 mA at 5 V."""


class Level(msgspec.Struct, frozen=True):
    """A net to tie an input to, the cards that make it, and where it stands, V."""

    net: str
    volts: float
    edits: tuple[Edit, ...] = ()
    words: str = ""


def wanted_level(stage: Stage, scene: Scene) -> float | None:
    """Return the middle of what the inputs allow, and the output at what it makes of it, V."""
    gain = grounded_gain(stage, scene)
    inner, outer = stage.inputs.available, stage.output.available
    lows = [v for v in (inner.low, _share(outer.low, gain)) if v is not None]
    highs = [v for v in (inner.high, _share(outer.high, gain)) if v is not None]
    supply = stage.supply
    if supply.positive is None or supply.negative is None:
        return None
    low = max([supply.negative, *lows])
    high = min([supply.positive / gain, *highs])
    return (low + high) / 2 if high > low else (supply.positive + supply.negative) / 2


def _share(volts: float | None, gain: float) -> float | None:
    return None if volts is None else volts / gain


def grounded_gain(stage: Stage, scene: Scene) -> float:
    """Return what multiplies the level of a non-inverting input: one where no DC leg is grounded.

    With a leg to another potential the level wanted is not multiplied from ground; it is near that
    potential.
    """
    gain, net = stage.loop.noise_gain_dc, stage.inputs.minus.net
    if not gain or net == stage.output.net:
        return 1.0
    legs = [e for e in scene.on(net, "R") if GROUND in e.nets[:2]]
    return max(gain, 1.0) if legs else 1.0


def is_allowed(volts: float, stage: Stage) -> bool:
    """Tell whether an input level leaves both ranges a tenth of the supply to each side."""
    supply = stage.supply
    if supply.positive is None or supply.negative is None:
        return False
    room = 0.1 * (supply.positive - supply.negative)
    lows = (supply.negative + room, stage.inputs.available.low)
    highs = (supply.positive - room, stage.inputs.available.high)
    return max(v for v in lows if v is not None) <= volts <= min(v for v in highs if v is not None)


def levels(stage: Stage, scene: Scene, after: Element | Stage) -> list[Level]:
    """Return where an input can be tied to, what is there already first."""
    found: list[Level] = []
    if is_allowed(0.0, stage):
        found.append(Level(GROUND, 0.0))
    found += references(stage, scene)
    made = divider(stage, scene, after, wanted_level(stage, scene))
    if made is not None and not (found and found[0].net == GROUND):
        found.append(made)
    return found


def references(stage: Stage, scene: Scene) -> list[Level]:
    """Return nets that something else holds at a level this input may stand at."""
    nets: dict[str, float] = {}
    rails = {r.net for r in scene.design.rails}
    for element in scene.design.circuit.elements:
        source = element.source
        if element.kind == "V" and source is not None and element.nets[1] == GROUND:
            still = source.wave is None and source.ac is None and source.stated
            if still and element.nets[0] not in rails:
                nets[element.nets[0]] = source.level
    for other in scene.design.stages:
        level = other.inputs.plus.level
        divided = other.inputs.plus.divider
        if other.designator == stage.designator or divided is None or level is None:
            continue
        if divided.bypass > 0:
            nets[other.inputs.plus.net] = level
    return [
        Level(net, volts)
        for net, volts in nets.items()
        if is_allowed(volts, stage) and "." not in net
    ]


def divider(
    stage: Stage, scene: Scene, after: Element | Stage, volts: float | None
) -> Level | None:
    """Make a divider from the stage's own rails with a capacitor at its tap."""
    supply = stage.supply
    high, low = supply.positive, supply.negative
    if volts is None or high is None or low is None or not low < volts < high:
        return None
    upper = scene.fit("R", DIVIDER * (high - volts) / ((high - low) / 2))
    lower = scene.fit("R", DIVIDER * (volts - low) / ((high - low) / 2))
    tap = scene.new_net("vmid")
    bottom = supply.negative_net or GROUND
    cards = [
        scene.added("R", (supply.positive_net, tap), upper, after),
        scene.added("R", (tap, bottom), lower, after),
        scene.added("C", (tap, GROUND), BULK, after),
    ]
    made = [card for card in cards if card is not None]
    if len(made) != len(cards):
        return None
    real = low + (high - low) * lower / (upper + lower)
    names = [name for _, name in made]
    return Level(
        tap,
        real,
        tuple(edit for edit, _ in made),
        f"a level of {si(real, 'V')} from {names[0]} ({si(upper, 'Ω')}) and {names[1]} "
        f"({si(lower, 'Ω')}) with {names[2]} ({si(BULK, 'F')}) at their tap",
    )
