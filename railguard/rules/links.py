"""Which finding can be the cause of which, and by what two of them are seen to belong together."""

from collections.abc import Callable

import msgspec

from railguard.analysis.stage import Design, Stage
from railguard.circuit.model import GROUND
from railguard.rules.compose import stage_named
from railguard.rules.finding import Finding
from railguard.rules.remedies import reached_unloaded
from railguard.rules.severity import breach
from railguard.words import SEVERITIES

Related = Callable[[Finding, Finding, Design], str]
"""related(cause, finding, design): the designator or net they have in common, or ""."""


class Link(msgspec.Struct, frozen=True):
    """Which rules' findings can follow from which, and how two findings are seen to belong.

    follows  names of rules, or of whole families
    """

    causes: tuple[str, ...]
    follows: tuple[str, ...]
    related: Related


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


def _shared_designator(cause: Finding, finding: Finding, design: Design) -> str:
    return next((d for d in cause.designators if d in finding.designators), "")


def _shared_supply(cause: Finding, finding: Finding, design: Design) -> str:
    """Relate by a common channel, or by the rail itself where the finding is about a rail."""
    nets = [n for n in cause.nets if n in finding.nets and n != GROUND]
    return _shared_designator(cause, finding, design) or next(iter(nets), "")


def _too_low_a_supply(cause: Finding, finding: Finding, design: Design) -> str:
    if cause.corner != "nominal" or cause.demand is None or cause.limit is None:
        return ""
    low = cause.demand < cause.limit
    return _shared_designator(cause, finding, design) if low else ""


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


def _rests_on_value(cause: Finding, finding: Finding, design: Design) -> str:
    """Relate a misread value to what was worked out with it."""
    names = set(finding.designators) | _rail_elements(finding, design)
    for designator in finding.designators:
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


def _saturated_before(cause: Finding, finding: Finding, design: Design) -> str:
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


def _dead_before(cause: Finding, finding: Finding, design: Design) -> str:
    """Relate a stage that does not work to the ranges of itself and of the stages behind it."""
    first, later = _stage_of(cause, design), _stage_of(finding, design)
    if first is None or later is None or cause.severity not in ("critical", "major"):
        return ""
    behind = first.designator in upstream(later, design)
    return first.designator if behind else ""


def _switching(cause: Finding, finding: Finding, design: Design) -> str:
    """Relate two findings about a stage that is meant to switch."""
    stage = _stage_of(finding, design)
    meant = stage is not None and stage.use in ("comparator", "oscillator")
    return _shared_designator(cause, finding, design) if meant else ""


def _no_linear_loop(cause: Finding, finding: Finding, design: Design) -> str:
    """Relate a loop that does not hold its stage; one that is meant to switch is no cause."""
    grave = cause.severity in ("critical", "major")
    return _shared_designator(cause, finding, design) if grave else ""


def _stage_of(finding: Finding, design: Design) -> Stage | None:
    return stage_named(finding.designators[0], design) if finding.designators else None


def _heavy_load(cause: Finding, finding: Finding, design: Design) -> str:
    """Relate an output that lacks range to a load that takes it: unloaded, it would reach."""
    stage = _stage_of(finding, design)
    same = _shared_designator(cause, finding, design)
    return same if stage is not None and _unloaded(stage, finding) else ""


def _heavy_network(cause: Finding, finding: Finding, design: Design) -> str:
    """Relate an output that lacks range to a feedback network that alone takes it."""
    alone = cause.margin is not None and cause.margin < 0
    return _heavy_load(cause, finding, design) if alone else ""


def _unloaded(stage: Stage, finding: Finding) -> bool:
    if finding.demand is None or finding.limit is None:
        return False
    return reached_unloaded(stage, finding.demand, finding.demand > finding.limit)


def _only_unclipped(cause: Finding, finding: Finding, design: Design) -> str:
    """Relate a demand that is too much only because the output's range is: clipped, it fits."""
    same, stage = _shared_designator(cause, finding, design), _stage_of(cause, design)
    load = finding.rule in ("drive-current", "feedback-low")
    if stage is not None and load and _unloaded(stage, cause):
        return ""
    numbers = (cause.demand, cause.limit, finding.demand, finding.limit)
    if not same or any(n is None for n in numbers) or not cause.demand:
        return ""
    demand, limit, asked, allowed = (abs(n or 0.0) for n in numbers)
    return same if limit < demand and asked * limit / demand <= allowed else ""


def _only_at_a_corner(cause: Finding, finding: Finding, design: Design) -> str:
    """Relate a range that is too wide only with offset and bias current to what amplifies them."""
    nominal = finding.rule == "headroom-output" and finding.corner == "nominal"
    return "" if nominal else _same_or_before(cause, finding, design)


def _same_or_before(cause: Finding, finding: Finding, design: Design) -> str:
    """Relate what is about one stage to what is about it or a stage behind it."""
    return _shared_designator(cause, finding, design) or _dead_before(cause, finding, design)


def _graver(cause: Finding, finding: Finding, design: Design) -> str:
    """Relate two findings about one stage, the graver as the cause."""
    rank = SEVERITIES.index(cause.severity) - SEVERITIES.index(finding.severity)
    leads = rank < 0 or (rank == 0 and cause.rule < finding.rule)
    return _shared_designator(cause, finding, design) if leads else ""


def _one_rail(cause: Finding, finding: Finding, design: Design) -> str:
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


def _one_load(cause: Finding, finding: Finding, design: Design) -> str:
    """Relate two outputs that one element between them loads; the first is the cause."""
    first, second = _stage_of(cause, design), _stage_of(finding, design)
    if first is None or second is None or not first.current.into:
        return ""
    same = first.current.into == second.current.into
    before = cause.designators < finding.designators
    return first.current.into if same and before else ""


def _on_the_tied_net(cause: Finding, finding: Finding, design: Design) -> str:
    """Relate a rail that an output is tied to to what is said of the rail."""
    return next((n for n in cause.nets if n in finding.nets and n != GROUND), "")


def _network_alone(cause: Finding, finding: Finding, design: Design) -> str:
    alone = cause.margin is not None and cause.margin < 0
    return _shared_designator(cause, finding, design) if alone else ""


def _same_side(cause: Finding, finding: Finding, design: Design) -> str:
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
    return _shared_designator(cause, finding, design) if same and milder else ""


_RUNNING = (
    "headroom",
    "drive-current",
    "drive-power",
    "drive-capacitive",
    "drive-input-above-rail",
    "dynamics",
    "stability",
    "bias-level",
    "bias-current-error",
    "feedback-low",
    "feedback-high",
)
"""What has a meaning only for a stage that works."""

_VALUES = tuple(
    f"netlist-value-{kind}" for kind in ("suffix", "second-number", "form", "missing", "sign")
)

LINKS: tuple[Link, ...] = (
    Link(
        _VALUES,
        ("supply", "decoupling", "headroom", "drive", "bias", "feedback", "dynamics", "stability"),
        _rests_on_value,
    ),
    Link(
        ("supply-missing", "supply-reversed"),
        (*_RUNNING, "supply-range", "supply-drop", "supply-name-disagrees"),
        _shared_supply,
    ),
    # A net that nothing feeds is most often a misspelt one; its capacitors are on the right one.
    Link(("supply-missing",), ("decoupling-absent", "decoupling-few"), _shared_supply),
    Link(("supply-missing", "supply-reversed"), ("supply-package-split",), _shared_designator),
    Link(("drive-tied",), ("supply", "decoupling", "netlist-sources-fight"), _on_the_tied_net),
    Link(("supply-range",), ("supply-range",), _one_rail),
    Link(
        ("drive-joined", "drive-tied"),
        (*_RUNNING, "feedback-open", "feedback-reversed"),
        _shared_designator,
    ),
    # The thresholds of a comparator move with its rails.
    Link(("supply-range",), ("feedback-reversed",), _switching),
    Link(
        ("feedback-reversed", "feedback-open"),
        (*_RUNNING, "bias-no-dc-path"),
        _no_linear_loop,
    ),
    Link(("bias-no-dc-path",), _RUNNING, _shared_designator),
    Link(
        ("feedback-reversed", "feedback-open", "bias-no-dc-path", "drive-joined", "drive-tied"),
        ("headroom",),
        _dead_before,
    ),
    Link(
        ("supply-range",),
        ("headroom", "drive", "dynamics", "bias-current-error", "bias-level", "feedback-high"),
        _too_low_a_supply,
    ),
    Link(("feedback-low",), ("drive-current",), _network_alone),
    Link(("drive-current",), ("drive-power",), _shared_designator),
    Link(("feedback-low",), ("headroom-output",), _heavy_network),
    Link(("drive-current",), ("headroom-output",), _heavy_load),
    Link(("drive-current",), ("drive-current",), _one_load),
    # What is left of a loaded output's reach makes errors look large.
    Link(
        ("drive-current", "feedback-low"),
        ("bias-current-error", "bias-level", "headroom-offset"),
        _shared_designator,
    ),
    Link(
        ("dynamics-slew", "dynamics-loop-gain", "dynamics-filter"),
        ("dynamics-slew", "dynamics-loop-gain", "dynamics-filter"),
        _graver,
    ),
    Link(
        ("feedback-high",),
        ("stability-phase-margin", "stability-transimpedance", "bias-current-error"),
        _shared_designator,
    ),
    Link(("feedback-high",), ("headroom-offset", "headroom-output"), _only_at_a_corner),
    Link(("headroom-output",), ("headroom",), _saturated_before),
    Link(("headroom-output",), ("headroom-offset",), _shared_designator),
    Link(("headroom-output",), ("drive-current", "dynamics-slew", "feedback-low"), _only_unclipped),
    Link(("headroom-output",), ("headroom-input",), _same_side),
    Link(
        ("headroom-input",),
        ("headroom-phase-reversal", "drive-input-above-rail"),
        _shared_designator,
    ),
)
