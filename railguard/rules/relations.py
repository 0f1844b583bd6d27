"""By what two findings are seen to belong together: one is the cause, the other follows from it.

Each relation is a function `(cause, finding, design)` that returns the designator or net they have
in common, or "".
"""

from railguard.analysis.stage import Design, Stage
from railguard.circuit.model import GROUND
from railguard.rules.compose import stage_named
from railguard.rules.finding import Finding
from railguard.rules.remedies import reached_unloaded
from railguard.rules.severity import breach
from railguard.words import SEVERITIES


def upstream(stage: Stage, design: Design) -> frozenset[str]:
    """Return the designators of all stages whose output reaches a stage, through others too."""
    found: set[str] = set()
    waiting = list(stage.after)
    while waiting:
        name = waiting.pop()
        if name in found:
            continue
        found.add(name)
        before = stage_named(name, design)
        waiting += before.after if before is not None else ()
    return frozenset(found - {stage.designator})


def in_ring(stage: Stage, design: Design) -> bool:
    """Tell whether a stage's output comes back to its own inputs through other stages."""
    waiting, seen = list(stage.after), set()
    while waiting:
        name = waiting.pop()
        if name == stage.designator:
            return True
        before = None if name in seen else stage_named(name, design)
        seen.add(name)
        waiting += before.after if before is not None else ()
    return False


def shared_designator(cause: Finding, finding: Finding, design: Design) -> str:
    """Relate by a common channel or element."""
    return next((d for d in cause.designators if d in finding.designators), "")


def shared_supply(cause: Finding, finding: Finding, design: Design) -> str:
    """Relate by a common channel, or by the rail itself where the finding is about a rail."""
    nets = [n for n in cause.nets if n in finding.nets and n != GROUND]
    return shared_designator(cause, finding, design) or next(iter(nets), "")


def too_low_a_supply(cause: Finding, finding: Finding, design: Design) -> str:
    """Relate a total supply that is too low at nominal to what lacks range, current or speed."""
    if cause.corner != "nominal" or cause.demand is None or cause.limit is None:
        return ""
    low = cause.demand < cause.limit
    return shared_designator(cause, finding, design) if low else ""


def elements_of(stage: Stage, design: Design) -> frozenset[str]:
    """Return the designators of the elements a stage's numbers are known to rest on."""
    names = {
        *stage.feedback.elements,
        *stage.inputs.plus.path,
        *stage.inputs.minus.path,
    }
    for bound in (
        stage.output.high,
        stage.output.low,
        stage.inputs.high,
        stage.inputs.low,
        stage.current.source,
        stage.current.sink,
    ):
        names.update(bound.culprits)
    around = {stage.inputs.plus.net, stage.inputs.minus.net} - {GROUND}
    names.update(e.designator for e in design.circuit.elements if around & set(e.nets))
    return frozenset(names - {""})


def _rail_elements(finding: Finding, design: Design) -> frozenset[str]:
    names: set[str] = set()
    for rail in design.rails:
        if rail.net in finding.nets:
            names.update((rail.origin, *rail.series))
            names.update(c.designator for c in (*rail.decoupling, *rail.upstream, *rail.across))
    return frozenset(names)


FAR_APART = 2.0
"""Ratio of two readings of a value from which a stage is another one with either."""


def rests_on_value(cause: Finding, finding: Finding, design: Design) -> str:
    """Relate a misread value to what was worked out with it.

    Two readings that are about one value explain nothing: 6k8 is 6 kilohm or 6.8 kilohm.
    """
    readings = (abs(cause.demand or 0.0), abs(cause.limit or 0.0))
    if min(readings) > 0 and max(readings) < FAR_APART * min(readings):
        return ""
    names = set(finding.designators) | _rail_elements(finding, design)
    for designator in () if finding.family == "supply" else finding.designators:
        stage = stage_named(designator, design)
        if stage is None:
            continue
        for name in (designator, *upstream(stage, design)):
            before = stage_named(name, design)
            names |= elements_of(before, design) if before is not None else set()
        if finding.family == "drive":
            names.add(stage.current.into)
        elif finding.family == "feedback":
            at = stage.output.net
            names.update(e.designator for e in design.circuit.elements if at in e.nets)
    return next((d for d in cause.designators if d in names), "")


def saturated_before(cause: Finding, finding: Finding, design: Design) -> str:
    """Relate the clipped output of one stage to the ranges of the stages behind it."""
    if cause.severity not in ("critical", "major"):
        return ""
    first = _stage_of(cause, design)
    later = _stage_of(finding, design)
    if first is None or later is None or first.designator not in upstream(later, design):
        return ""
    ring = later.designator in upstream(first, design)
    return "" if ring and not _leads(cause, finding, design) else first.designator


def _leads(cause: Finding, finding: Finding, design: Design) -> bool:
    """In a ring of stages each comes after each: the gravest, then the first, leads."""
    order = [s.designator for s in design.stages]

    def rank(f: Finding) -> tuple[int, int, int]:
        place = order.index(f.designators[0])
        return SEVERITIES.index(f.severity), f.rule != "headroom-output", place

    return rank(cause) < rank(finding)


def dead_before(cause: Finding, finding: Finding, design: Design) -> str:
    """Relate a stage that does not work to the ranges of itself and of the stages behind it."""
    first, later = _stage_of(cause, design), _stage_of(finding, design)
    if first is None or later is None or cause.severity not in ("critical", "major"):
        return ""
    behind = first.designator in upstream(later, design)
    return first.designator if behind else ""


def switching(cause: Finding, finding: Finding, design: Design) -> str:
    """Relate two findings about a stage that is meant to switch."""
    stage = _stage_of(finding, design)
    meant = stage is not None and stage.use in ("comparator", "oscillator")
    return shared_designator(cause, finding, design) if meant else ""


def no_linear_loop(cause: Finding, finding: Finding, design: Design) -> str:
    """Relate a loop that does not hold its stage; one that is meant to switch is no cause."""
    grave = cause.severity in ("critical", "major")
    return shared_designator(cause, finding, design) if grave else ""


def _stage_of(finding: Finding, design: Design) -> Stage | None:
    return stage_named(finding.designators[0], design) if finding.designators else None


def heavy_load(cause: Finding, finding: Finding, design: Design) -> str:
    """Relate an output that lacks range to a load that takes it: unloaded, it would reach."""
    stage = _stage_of(finding, design)
    same = shared_designator(cause, finding, design)
    return same if stage is not None and _unloaded(stage, finding) else ""


def heavy_network(cause: Finding, finding: Finding, design: Design) -> str:
    """Relate an output that lacks range to a feedback network that alone takes it."""
    alone = cause.margin is not None and cause.margin < 0
    return heavy_load(cause, finding, design) if alone else ""


def _unloaded(stage: Stage, finding: Finding) -> bool:
    if finding.demand is None or finding.limit is None:
        return False
    return reached_unloaded(stage, finding.demand, finding.demand > finding.limit)


def only_unclipped(cause: Finding, finding: Finding, design: Design) -> str:
    """Relate a demand that is too much only because the output's range is: clipped, it fits."""
    same, stage = shared_designator(cause, finding, design), _stage_of(cause, design)
    load = finding.rule in ("drive-current", "feedback-low")
    if stage is not None and load and _unloaded(stage, cause):
        return ""
    numbers = (cause.demand, cause.limit, finding.demand, finding.limit)
    if not same or any(n is None for n in numbers) or not cause.demand:
        return ""
    demand, limit, asked, allowed = (abs(n or 0.0) for n in numbers)
    return same if limit < demand and asked * limit / demand <= allowed else ""


def only_at_a_corner(cause: Finding, finding: Finding, design: Design) -> str:
    """Relate a range that is too wide only with offset and bias current to what amplifies them."""
    ranged = finding.rule in ("headroom-output", "headroom-input")
    if (ranged and finding.corner == "nominal") or _milder(cause, finding):
        return ""
    return _same_or_before(cause, finding, design)


def made_by_offset(cause: Finding, finding: Finding, design: Design) -> str:
    """Relate an output's range that only offset and bias current make too wide to the two."""
    stage = _stage_of(finding, design)
    if stage is None or finding.corner == "nominal" or None in (finding.demand, finding.limit):
        return ""
    upper = (finding.demand or 0.0) > (finding.limit or 0.0)
    moved = (stage.output.high if upper else stage.output.low).culprits[:1]
    errors = ("offset of ", "bias current of ")
    return (
        shared_designator(cause, finding, design) if moved and moved[0].startswith(errors) else ""
    )


def makes_no_offset(cause: Finding, finding: Finding, design: Design) -> str:
    """Relate an output that clips to the error its lost range makes look large."""
    turned = made_by_offset(finding, cause, design)
    return "" if turned else shared_designator(cause, finding, design)


def _milder(cause: Finding, finding: Finding) -> bool:
    return SEVERITIES.index(cause.severity) > SEVERITIES.index(finding.severity)


def _same_or_before(cause: Finding, finding: Finding, design: Design) -> str:
    """Relate what is about one stage to what is about it or a stage behind it."""
    return shared_designator(cause, finding, design) or dead_before(cause, finding, design)


def by_bias_current(cause: Finding, finding: Finding, design: Design) -> str:
    """Relate large resistors to the error of a bias current where that is what is wrong with them.

    A remark on their pole explains no error, and nothing graver than itself.
    """
    return "" if _milder(cause, finding) else shared_designator(cause, finding, design)


def graver(cause: Finding, finding: Finding, design: Design) -> str:
    """Relate two findings about one stage, the graver as the cause."""
    rank = SEVERITIES.index(cause.severity) - SEVERITIES.index(finding.severity)
    leads = rank < 0 or (rank == 0 and cause.rule < finding.rule)
    return shared_designator(cause, finding, design) if leads else ""


def one_rail(cause: Finding, finding: Finding, design: Design) -> str:
    """Relate packages of different devices that one rail is wrong for, the graver as the cause."""
    rank = SEVERITIES.index(cause.severity) - SEVERITIES.index(finding.severity)
    same = cause.nets == finding.nets and cause.designators != finding.designators
    if not same or None in (cause.margin, cause.demand, cause.limit, finding.demand, finding.limit):
        return ""
    above = (cause.demand or 0.0) > (cause.limit or 0.0)
    if above != ((finding.demand or 0.0) > (finding.limit or 0.0)):
        return ""
    leads = rank < 0 or (rank == 0 and cause.designators < finding.designators)
    return next((n for n in cause.nets if n != GROUND), "") if leads else ""


def one_load(cause: Finding, finding: Finding, design: Design) -> str:
    """Relate two outputs that one element between them loads; the first is the cause."""
    first, second = _stage_of(cause, design), _stage_of(finding, design)
    if first is None or second is None or not first.current.into:
        return ""
    same = first.current.into == second.current.into
    before = cause.designators < finding.designators
    return first.current.into if same and before else ""


def touches(cause: Finding, finding: Finding, design: Design) -> str:
    """Relate a stage without a loop to one whose own network ends at its nets."""
    later = _stage_of(finding, design)
    if later is None or cause.severity not in ("critical", "major"):
        return ""
    outer = {GROUND, *(rail.net for rail in design.rails)}
    loose = set(cause.nets) - outer
    own = elements_of(later, design)
    touching = any(loose & set(e.nets) for e in design.circuit.elements if e.designator in own)
    return cause.designators[0] if touching and cause.designators != finding.designators else ""


def one_reference(cause: Finding, finding: Finding, design: Design) -> str:
    """Relate stages that rest beyond their range, at either end, for one reference's sake."""
    first, later = _stage_of(cause, design), _stage_of(finding, design)
    if first is None or later is None or first is later:
        return ""
    if not (_rests_outside(cause, first) and _rests_outside(finding, later)):
        return ""
    shared = sorted(_references(first, design) & _references(later, design))
    rank = SEVERITIES.index(cause.severity) - SEVERITIES.index(finding.severity)
    leads = rank < 0 or (rank == 0 and cause.designators < finding.designators)
    return shared[0] if shared and leads else ""


def _rests_outside(finding: Finding, stage: Stage) -> bool:
    """Tell whether it is the level at rest that is beyond the limit."""
    level = stage.output.level if finding.rule == "headroom-output" else stage.inputs.plus.level
    if level is None or finding.limit is None or finding.demand is None:
        return False
    return level > finding.limit if finding.demand > finding.limit else level < finding.limit


def _references(stage: Stage, design: Design) -> frozenset[str]:
    """Return the nets at a stage's network that a source holds and that are no rail."""
    outer = {GROUND, *(rail.net for rail in design.rails)}
    own = elements_of(stage, design)
    around = {stage.inputs.plus.net}
    held: set[str] = set()
    for element in design.circuit.elements:
        if element.designator in own:
            around.update(element.nets)
        if element.kind == "V":
            held.update(element.nets)
    return frozenset((around & held) - outer)


def on_the_tied_net(cause: Finding, finding: Finding, design: Design) -> str:
    """Relate a rail that an output is tied to to what is said of the rail."""
    return next((n for n in cause.nets if n in finding.nets and n != GROUND), "")


def network_alone(cause: Finding, finding: Finding, design: Design) -> str:
    """Relate a feedback network that alone asks for too much to what the output must give."""
    alone = cause.margin is not None and cause.margin < 0
    return shared_designator(cause, finding, design) if alone else ""


def same_side(cause: Finding, finding: Finding, design: Design) -> str:
    """Relate output and input of a stage at the same end, where one quantity sets both.

    The output of a stage that does not turn its signal over goes where its inputs go; that of one
    that does rests where its reference is. A difference amplifier's common level is another thing.
    """
    stage = _stage_of(cause, design)
    if stage is None or stage.topology == "difference":
        return ""
    if None in (cause.demand, cause.limit, finding.demand, finding.limit):
        return ""
    upper = (finding.demand or 0.0) > (finding.limit or 0.0)
    same = upper == ((cause.demand or 0.0) > (cause.limit or 0.0))
    # A finding names the worse end alone; a stage without gain may be beyond at both.
    same = same or breach(stage.output.high if upper else stage.output.low) is not None
    milder = SEVERITIES.index(cause.severity) <= SEVERITIES.index(finding.severity)
    return shared_designator(cause, finding, design) if same and milder else ""
