"""Pins exchanged on an op-amp's card, and supplies' small resistors."""

from collections.abc import Iterator
from difflib import get_close_matches

from railguard.analysis.rail import Rail
from railguard.analysis.stage import Design
from railguard.circuit.model import GROUND
from railguard.redline.cards import replaced
from railguard.redline.scene import Candidate, Role, Scene, with_value
from railguard.rules.compose import stage_named
from railguard.rules.finding import Finding


def swapped_inputs(finding: Finding, scene: Scene) -> Iterator[Candidate]:
    """Exchange the two inputs."""
    yield from _swapped(finding, scene, "plus", "minus", "inputs")


def swapped_supply(finding: Finding, scene: Scene) -> Iterator[Candidate]:
    """Exchange the two supply pins of every card concerned."""
    yield from _swapped(finding, scene, "positive", "negative", "supply pins")


def _swapped(
    finding: Finding, scene: Scene, one: Role, other: Role, words: str
) -> Iterator[Candidate]:
    edits, names = set(), []
    for designator in finding.designators:
        stage = stage_named(designator, scene.design)
        if stage is None:
            return
        first, second = scene.pin_word(stage, one), scene.pin_word(stage, other)
        if first is None or second is None:
            return
        edits |= {replaced(*first, second[1].text), replaced(*second, first[1].text)}
        names.append(stage.schematic)
    if edits:
        listed = names[0] if len(names) == 1 else f"{', '.join(names[:-1])} and {names[-1]}"
        yield Candidate(
            edits=tuple(sorted(edits)),
            what=f"swap the {words} of {listed}",
            regains=True,
            wakes=True,
        )


def turned_source(finding: Finding, scene: Scene) -> Iterator[Candidate]:
    """Turn the source that gives a rail the wrong sign."""
    origins = {r.origin for r in scene.design.rails if r.net in finding.nets}
    for element in scene.design.circuit.elements:
        at_rail = set(element.nets[:2]) & (set(finding.nets) - {GROUND})
        if element.kind != "V" or not (at_rail or element.designator in origins):
            continue
        first, second = element.nets[:2]
        edits = {scene.node(element, first, scene.local(second, element)),
                 scene.node(element, second, scene.local(first, element))}  # fmt: skip
        made = [e for e in edits if e is not None]
        if len(made) == 2:
            yield Candidate(
                edits=tuple(sorted(made)), what=f"turn the source {element.designator} round",
                regains=True, wakes=True,
            )  # fmt: skip


def smaller_series(finding: Finding, scene: Scene) -> Iterator[Candidate]:
    """Lower the resistor a rail loses its voltage in."""
    rail = next((r for r in scene.design.rails if r.net in finding.nets), None)
    if rail is not None and finding.demand and finding.limit:
        yield from _lowered(rail, finding.limit / finding.demand, scene)


def less_drop(finding: Finding, scene: Scene) -> Iterator[Candidate]:
    """Lower the resistor that takes a stage's rail down, where it takes more than its allowance."""
    stage = scene.stage(finding)
    share = scene.limits("supply-drop")["share"]
    for rail in scene.design.rails:
        supply = stage.supply if stage is not None else None
        if supply is None or rail.net not in (supply.positive_net, supply.negative_net):
            continue
        if rail.drop and rail.level and abs(rail.drop) > share * abs(rail.level):
            yield from _lowered(rail, share * abs(rail.level / rail.drop), scene)


def _lowered(rail: Rail, ratio: float, scene: Scene) -> Iterator[Candidate]:
    for designator in rail.series:
        element = scene.elements.get(designator)
        if element is None or element.kind != "R" or not element.value:
            continue
        for share in (0.97, 0.9, 0.8, 0.6, 0.4, 0.1):
            ohms = scene.fit("R", element.value * share * ratio, "down", element)
            edit = scene.value(element, ohms)
            if edit is not None:
                yield Candidate(
                    edits=(edit,),
                    what=with_value(element, ohms),
                    choice="the largest of those tried that cures it, so that it filters as much "
                    "as it may",
                    regains=True,  # a level divided from the rail moves with it
                )


def fed_nets(design: Design) -> set[str]:
    """Return the nets that stand at a supply's level: rails, and what sources hold or feed."""
    found = {r.net for r in design.rails if r.level is not None}
    stated = {net for net, level in design.settings.nets.items() if level.volts}
    for element in design.circuit.elements:
        if element.kind == "V" and element.source is not None and element.source.level:
            found |= {n for n in element.nets[:2] if n != GROUND}
    fed = {
        n
        for e in design.circuit.elements
        if e.kind in "RL" and e.fitted and set(e.nets[:2]) & found and (e.value or 0.0) < 100.0
        for n in e.nets[:2]
    }
    return (found | stated | fed) - {GROUND}


def nearest_fed(net: str, design: Design) -> tuple[str, ...]:
    """Return the fed nets whose names are nearest to a misspelt one's."""
    names = {n.casefold(): n for n in fed_nets(design) if n != net}
    return tuple(names[n] for n in get_close_matches(net.casefold(), names, n=2, cutoff=0.6))


def fed(finding: Finding, scene: Scene) -> Iterator[Candidate]:
    """Put supply pins that nothing feeds on the rail whose name is nearest, if there is one."""
    for net in finding.nets:
        for rail in nearest_fed(net, scene.design):
            edits = set()
            for designator in finding.designators:
                stage = stage_named(designator, scene.design)
                if stage is None:
                    return
                role: Role = "positive" if stage.supply.positive_net == net else "negative"
                edits.add(scene.pin(stage, role, scene.local(rail, stage)))
            made = [e for e in edits if e is not None]
            if made and len(made) == len(edits):
                yield Candidate(
                    edits=tuple(sorted(made)),
                    what=f"put the supply pin on {rail} instead of {net}",
                    choice=f"of the fed rails the one whose name is nearest is {rail}",
                    regains=True,
                    wakes=True,
                )
