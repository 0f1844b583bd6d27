"""Capacitors for rails and references: added at the pins, enlarged, rated, turned round."""

import re
from collections.abc import Iterator

from railguard.analysis.rail import Capacitor, Rail
from railguard.circuit.model import GROUND, Element
from railguard.redline.cards import replaced
from railguard.redline.model import Edit
from railguard.redline.scene import Candidate, Scene, all_of
from railguard.rules.compose import rail_at
from railguard.rules.decoupling.capacitors import USUAL, return_net
from railguard.rules.finding import Finding
from railguard.units import si

BULK = 10e-6
"""F; a common value of tantalum and ceramic bulk capacitors."""
SMALL = 1e-9
"""F; beside 100 nF for devices beyond some 50 MHz: common practice, no source."""
RATINGS = (4.0, 6.3, 10.0, 16.0, 25.0, 35.0, 50.0, 63.0, 100.0)
"""V; rated voltages capacitors are made for (the R5 and R10 steps makers list)."""


def one_a_package(finding: Finding, scene: Scene) -> Iterator[Candidate]:
    """Add 100 nF from each rail named to its return, one for each package on it."""
    rails = [r for net in finding.nets if (r := rail_at(net, scene.design)) is not None]
    each = [(r, USUAL, max(len(r.packages), 1)) for r in rails]
    yield from _with_others(scene, each, "one of 100 nF at the pins of each package")


def missing(finding: Finding, scene: Scene) -> Iterator[Candidate]:
    """Add as many of 100 nF as a rail lacks."""
    rail = rail_at(finding.nets[0], scene.design)
    if rail is not None and finding.demand is not None and finding.limit is not None:
        lacking = max(1, round(finding.demand - finding.limit))
        yield from _with_others(scene, [(rail, USUAL, lacking)], "so that each package has its own")


def _with_others(
    scene: Scene, each: list[tuple[Rail, float, int]], where: str
) -> Iterator[Candidate]:
    """Add capacitors alone, then with the bulk or the small one their rails lack as well."""
    for further in ((), (BULK,), (SMALL,), (BULK, SMALL)):
        scene.forget()
        more = [(rail, farads, 1) for rail, _, _ in each for farads in further]
        yield from _added(scene, [*each, *more], where)


def bulk(finding: Finding, scene: Scene) -> Iterator[Candidate]:
    """Add a large capacitor to a rail."""
    rail = rail_at(finding.nets[0], scene.design)
    if rail is not None:
        yield from _added(scene, [(rail, BULK, 1)], "where the rail enters the sheet")


def small(finding: Finding, scene: Scene) -> Iterator[Candidate]:
    """Add a small capacitor beside the usual one of a fast device."""
    rail = rail_at(finding.nets[0], scene.design)
    if rail is not None:
        yield from _added(scene, [(rail, SMALL, 1)], "in the smallest case at the pins")


def _added(scene: Scene, wanted: list[tuple[Rail, float, int]], where: str) -> Iterator[Candidate]:
    edits: list[Edit] = []
    words: list[str] = []
    for rail, farads, count in wanted:
        after = _anchor(rail, scene)
        if after is None:
            return
        names = []
        for _ in range(count):
            made = scene.added("C", (rail.net, return_net(rail)), farads, after)
            if made is None:
                return
            edits.append(made[0])
            names.append(made[1])
        listed = names[0] if count == 1 else f"{', '.join(names[:-1])} and {names[-1]}"
        words.append(f"{listed} of {si(farads, 'F')} from {rail.net} to {return_net(rail)}")
    if edits:
        yield Candidate(edits=joined(edits), what=f"add {' and '.join(words)}, {where}")


def joined(edits: list[Edit]) -> tuple[Edit, ...]:
    """Put lines added at one place into one edit, in the order they were made."""
    found: dict[tuple[str, int, int, int], str] = {}
    for edit in edits:
        key = (edit.file, edit.line, edit.column, edit.length)
        found[key] = found.get(key, "") + edit.text
    return tuple(sorted(Edit(*key, text) for key, text in found.items()))


def _anchor(rail: Rail, scene: Scene) -> Element | None:
    """Return the card new capacitors go behind: the last one at the rail, else a device of it."""
    here = [e for e in scene.on(rail.net, "C") if scene.card(e.location) is not None]
    if here:
        return here[-1]
    packages = {s.designator for s in scene.design.stages
                if rail.net in (s.supply.positive_net, s.supply.negative_net)}  # fmt: skip
    around = [
        e
        for e in scene.design.circuit.elements
        if (e.designator in packages or (e.kind in "VRL" and rail.net in e.nets[:2]))
        and scene.card(e.location) is not None
        and "." not in e.designator
    ]
    fallback = [e for e in scene.design.circuit.elements if e.designator in packages]
    return next(iter([*around, *fallback]), None)


def reference(finding: Finding, scene: Scene) -> Iterator[Candidate]:
    """Bypass the tap of a divider; where a signal enters there, give the divider its own tap."""
    stage = scene.stage(finding)
    if stage is None or stage.inputs.plus.divider is None:
        return
    divider, net = stage.inputs.plus.divider, stage.inputs.plus.net
    resistors = [scene.elements[d] for d in divider.elements if d in scene.elements]
    if not resistors:
        return
    made = scene.added("C", (net, GROUND), BULK, resistors[-1])
    if made is not None:
        yield Candidate(edits=(made[0],), what=f"add {made[1]} of {si(BULK, 'F')} from {net} to 0")
    scene.forget()
    tap = scene.new_net(net)
    moved = [scene.node(r, net, tap) for r in resistors if net in r.nets[:2]]
    capacitor = scene.added("C", (tap, GROUND), BULK, resistors[-1])
    ohms = scene.fit("R", max(divider.resistance, 1.0), "up")
    lead = scene.added("R", (tap, net), ohms, resistors[-1])
    if capacitor is None or lead is None:
        return
    edits = all_of(*moved)
    if edits is not None:
        yield Candidate(
            edits=tuple(sorted((*edits, *joined([capacitor[0], lead[0]])))),
            what=f"give the divider a tap of its own ({tap}) with {capacitor[1]} of "
            f"{si(BULK, 'F')} to 0, and lead it to {net} through {lead[1]} of {si(ohms, 'Ω')}",
            choice=f"{lead[1]} as large as the divider was, so that the signal sees no less "
            "resistance than before",
        )


def rating(finding: Finding, scene: Scene) -> Iterator[Candidate]:
    """Rate a capacitor for its rail, or turn a polarised one round."""
    element = scene.elements.get(finding.designators[0]) if finding.designators else None
    rail = rail_at(finding.nets[0], scene.design)
    if element is None or rail is None:
        return
    capacitor = next(
        (c for c in (*rail.decoupling, *rail.upstream) if c.designator == element.designator), None
    )
    if capacitor is None:
        return
    if finding.limit is None:
        first, second = element.nets[:2]
        edits = all_of(scene.node(element, first, scene.local(second, element)),
                       scene.node(element, second, scene.local(first, element)))  # fmt: skip
        if edits is not None:
            yield Candidate(edits=edits, what=f"turn {element.designator} round")
        return
    yield from _rated(element, capacitor, rail, scene)


def _rated(element: Element, capacitor: Capacitor, rail: Rail, scene: Scene) -> Iterator[Candidate]:
    line = scene.card(element.location)
    if line is None or capacitor.rating is None or rail.level is None:
        return
    wanted = abs(rail.level) / scene.limits("decoupling-rating")["share"]
    volts = next((v for v in RATINGS if v >= wanted * (1 - 1e-9)), None)
    found = re.search(rf"(?i)(?<![\d.]){capacitor.rating:g}(?=\s*V)", line.text)
    if volts is None or found is None:
        return
    from railguard.redline.cards import Word

    yield Candidate(
        edits=(replaced(line, Word(found[0], found.start()), f"{volts:g}"),),
        what=f"{element.designator} rated {volts:g} V instead of {capacitor.rating:g} V",
        choice=f"the next rating made at or above {si(wanted, 'V')}",
    )
