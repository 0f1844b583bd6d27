"""The JSON report: its own wire types, and the one conversion into them.

Names here are a contract (`report.schema.json` ships with the package); inner names stay free to
change. Volts relative to ground, amperes positive, watts, hertz, ohms, farads, degrees. A number
that was not worked out is null.
"""

import math
from pathlib import Path
from typing import Literal

import msgspec

from railguard import __version__
from railguard.analysis.stage import Allowed, Filter, Loop, Range, Stage
from railguard.location import Location
from railguard.report.json_text import encoded
from railguard.report.places import from_root, posix
from railguard.report.words import near
from railguard.reviewing import DesignReview, Review
from railguard.rules.finding import Finding
from railguard.words import Basis, Family, Kind, Severity, Verdict

SCHEMA = "railguard-report/1"


class Tool(msgspec.Struct):
    """Who wrote the report."""

    name: str
    version: str


class SettingsUsed(msgspec.Struct):
    """What was stated about the run."""

    file: str | None
    hold_at: Severity
    rules_off: list[str]
    as_of: str


class Coverage(msgspec.Struct):
    """How many pairs of rule and subject were judged, and how many stayed open."""

    judged: int
    open: int


class WaiverUsed(msgspec.Struct):
    """The waiver a finding was accepted under."""

    reason: str
    by: str | None
    until: str | None
    file: str | None
    line: int | None


class FindingOut(msgspec.Struct):
    """One fault."""

    rule: str
    family: Family
    severity: Severity
    designators: list[str]
    nets: list[str]
    demand: float | None
    limit: float | None
    margin: float | None
    margin_share: float | None
    unit: str | None
    basis: list[Basis]
    corner: Literal["nominal", "worst-case"]
    message: str
    remedy: str
    source: str
    file: str | None
    line: int | None
    column: int | None
    fingerprint: str
    waiver: WaiverUsed | None
    consequences: list["FindingOut"]


class SupplyOut(msgspec.Struct):
    """Rails at a stage's pins."""

    positive: float | None
    negative: float | None
    basis: Basis


class RangeOut(msgspec.Struct):
    """What is asked of a range, and what the device reaches."""

    demand_low: float | None
    demand_high: float | None
    worst_low: float | None
    worst_high: float | None
    available_low: float | None
    available_high: float | None
    guaranteed_low: float | None
    guaranteed_high: float | None


class CurrentOut(msgspec.Struct):
    """Output current: asked for, at the worst corner, known to be given."""

    demand_source: float | None
    demand_sink: float | None
    worst_source: float | None
    worst_sink: float | None
    available_source: float | None
    available_sink: float | None


class AllowedOut(msgspec.Struct):
    """The largest input, and the rule and stage that limit it."""

    net: str
    low: float
    high: float
    limited_by: str


class EndsOut(msgspec.Struct):
    """What tolerances make of a figure at the most.

    One that hangs on a gain-bandwidth product: with the least and the typical one listed.
    """

    low: float
    high: float


class GainOut(msgspec.Struct):
    """From a net a signal arrives at to the output: V/V at DC or in mid-band, or V/A."""

    net: str
    unit: Literal["V/V", "V/A"]
    value: float | None
    spread: EndsOut | None


class FilterOut(msgspec.Struct):
    """A recognised filter of second order."""

    kind: str
    frequency: float | None
    q: float | None
    gain: float | None
    frequency_spread: EndsOut | None
    q_spread: EndsOut | None
    gain_spread: EndsOut | None


class ThresholdsOut(msgspec.Struct):
    """Where a stage with positive feedback switches, in volts of its signal."""

    low: float | None
    high: float | None
    low_spread: EndsOut | None
    high_spread: EndsOut | None


class SpreadOut(msgspec.Struct):
    """The ends of the stage's figures of the same names; null where a figure has none."""

    noise_gain: EndsOut | None
    noise_gain_dc: EndsOut | None
    noise_gain_crossover: EndsOut | None
    bandwidth: EndsOut | None
    phase_margin: EndsOut | None
    loop_gain: EndsOut | None
    slew: EndsOut | None
    high_pass: EndsOut | None
    dissipation: EndsOut | None
    junction: EndsOut | None


class StageOut(msgspec.Struct):
    """One op-amp channel."""

    designator: str
    device: str
    catalogue: str | None
    package: str
    topology: str
    supply: SupplyOut
    output: RangeOut
    current: CurrentOut
    input: RangeOut
    input_allowed: AllowedOut | None
    dc_loop: Literal["negative", "positive", "open"] | None
    noise_gain: float | None
    noise_gain_dc: float | None
    noise_gain_crossover: float | None
    bandwidth: float | None
    phase_margin: float | None
    loop_gain: float | None
    slew: float | None
    high_pass: float | None
    dissipation: float | None
    junction: float | None
    gain: list[GainOut]
    filter: FilterOut | None
    thresholds: ThresholdsOut | None
    spread: SpreadOut
    file: str | None
    line: int | None


class NotCheckedOut(msgspec.Struct):
    """A judgement that stayed open, and what to state to get it."""

    subject: str
    rule: str
    why: str
    add: str


class ReadingOut(msgspec.Struct):
    """How something was read."""

    message: str
    file: str | None
    line: int | None
    column: int | None


class DesignOut(msgspec.Struct):
    """One deck."""

    path: str
    sha256: str
    kind: Kind
    verdict: Verdict
    coverage: Coverage
    findings: list[FindingOut]
    stages: list[StageOut]
    not_checked: list[NotCheckedOut]
    reading: list[ReadingOut]


class Document(msgspec.Struct):
    """The whole report."""

    schema: str
    tool: Tool
    settings: SettingsUsed
    designs: list[DesignOut]


def document(review: Review, root: Path | None = None) -> bytes:
    """Return the JSON report, indented, ending in a newline.

    root  the run's root, from which fingerprints name a deck; None: the current folder
    """
    settings = review.settings
    base = root or Path.cwd()
    out = Document(
        schema=SCHEMA,
        tool=Tool("railguard", __version__),
        settings=SettingsUsed(
            file=near(settings.file) or None,
            hold_at=settings.hold_at,
            rules_off=list(settings.rules_off),
            as_of=settings.as_of.isoformat(),
        ),
        designs=[_design(design, review, base) for design in review.designs],
    )
    return encoded(out)


def schema() -> bytes:
    """Return the JSON Schema of the report; `report.schema.json` holds the same text."""
    made = msgspec.json.schema(Document)
    made["$schema"] = "https://json-schema.org/draft/2020-12/schema"
    made["title"] = "railguard report"
    return encoded(made, order="sorted")


def _finite(value: float | None) -> float | None:
    return value if value is not None and math.isfinite(value) else None


def _place(place: Location | None) -> tuple[str | None, int | None, int | None]:
    return (posix(place.file), place.line, place.column) if place is not None else (None,) * 3


def _design(review: DesignReview, run: Review, root: Path) -> DesignOut:
    circuit = review.design.circuit
    deck = from_root(review.path, root).encode("utf-8", "replace").decode("utf-8")
    findings = review.findings
    if review is run.designs[0]:
        findings = (*findings, *run.findings)
    reading = []
    for remark in review.design.remarks:
        file, line, column = _place(remark.location)
        reading.append(ReadingOut(remark.message, file, line, column))
    return DesignOut(
        path=posix(review.path),
        sha256=circuit.sha256,
        kind=review.design.kind,
        verdict=review.verdict,
        coverage=Coverage(review.judged, review.open),
        findings=[_finding(finding, deck) for finding in findings],
        stages=[_stage(stage) for stage in review.design.stages],
        not_checked=[NotCheckedOut(n.subject, n.rule, n.why, n.add) for n in review.not_checked],
        reading=reading,
    )


def _finding(finding: Finding, deck: str) -> FindingOut:
    """Convert one finding with its consequences; `deck` as its fingerprint names it."""
    file, line, column = _place(finding.location)
    note = finding.waiver
    waiver = None
    if note is not None:
        told, at, _ = _place(note.location)
        waiver = WaiverUsed(note.reason, note.by or None, note.until or None, told, at)
    return FindingOut(
        rule=finding.rule,
        family=finding.family,
        severity=finding.severity,
        designators=list(finding.designators),
        nets=list(finding.nets),
        demand=_finite(finding.demand),
        limit=_finite(finding.limit),
        margin=_finite(finding.margin),
        margin_share=_finite(finding.margin_share),
        unit=finding.unit or None,
        basis=list(finding.basis),
        corner=finding.corner,
        message=finding.message,
        remedy=finding.remedy,
        source=finding.source,
        file=file,
        line=line,
        column=column,
        fingerprint=finding.fingerprint(deck),
        waiver=waiver,
        consequences=[_finding(inner, deck) for inner in finding.consequences],
    )


def _range(*ranges: Range) -> RangeOut:
    """Convert demand, worst, available and guaranteed, in this order."""
    return RangeOut(*(_finite(end) for one in ranges for end in (one.low, one.high)))


def _allowed(allowed: Allowed | None) -> AllowedOut | None:
    if allowed is None or not (math.isfinite(allowed.low) and math.isfinite(allowed.high)):
        return None
    return AllowedOut(allowed.net, allowed.low, allowed.high, allowed.limited_by)


def _ends(span: Range) -> EndsOut | None:
    low, high = _finite(span.low), _finite(span.high)
    return None if low is None or high is None else EndsOut(low, high)


def _gains(stage: Stage) -> list[GainOut]:
    spans = {"V/V": dict(stage.gain_worst), "V/A": dict(stage.transfer_worst)}
    every: tuple[tuple[Literal["V/V", "V/A"], str, float], ...] = (
        *(("V/V", net, value) for net, value in stage.gain),
        *(("V/A", net, value) for net, value in stage.transfer),
    )
    return [
        GainOut(net, unit, _finite(value), _ends(spans[unit].get(net, Range())))
        for unit, net, value in every
    ]


def _filter(found: Filter | None) -> FilterOut | None:
    if found is None:
        return None
    return FilterOut(
        kind=found.kind,
        frequency=_finite(found.frequency),
        q=_finite(found.q),
        gain=_finite(found.gain),
        frequency_spread=_ends(found.frequency_worst),
        q_spread=_ends(found.q_worst),
        gain_spread=_ends(found.gain_worst),
    )


def _thresholds(loop: Loop) -> ThresholdsOut | None:
    low, high = _finite(loop.thresholds.low), _finite(loop.thresholds.high)
    if low is None and high is None:
        return None
    return ThresholdsOut(low, high, _ends(loop.lower_worst), _ends(loop.upper_worst))


def _spread(stage: Stage) -> SpreadOut:
    loop = stage.loop
    return SpreadOut(
        noise_gain=_ends(loop.in_band_worst),
        noise_gain_dc=_ends(loop.noise_gain_worst),
        noise_gain_crossover=_ends(loop.at_crossover_worst),
        bandwidth=_ends(loop.crossover_worst),
        phase_margin=_ends(loop.phase_margin_worst),
        loop_gain=_ends(loop.loop_gain_worst),
        slew=_ends(stage.output.slew_worst),
        high_pass=_ends(stage.high_pass_worst),
        dissipation=_ends(stage.dissipation_worst),
        junction=_ends(stage.junction_worst),
    )


def _stage(stage: Stage) -> StageOut:
    output, inputs, current, loop = stage.output, stage.inputs, stage.current, stage.loop
    file, line, _ = _place(stage.location)
    return StageOut(
        designator=stage.designator,
        device=stage.device,
        catalogue=stage.family.family if stage.family is not None else None,
        package=stage.package,
        topology=stage.topology,
        supply=SupplyOut(
            _finite(stage.supply.positive), _finite(stage.supply.negative), stage.supply.basis
        ),
        output=_range(output.demand, output.worst, output.available, output.guaranteed),
        current=CurrentOut(
            _finite(current.demand_source),
            _finite(current.demand_sink),
            _finite(current.worst_source),
            _finite(current.worst_sink),
            _finite(current.available_source),
            _finite(current.available_sink),
        ),
        input=_range(inputs.demand, inputs.worst, inputs.available, inputs.guaranteed),
        input_allowed=_allowed(stage.allowed),
        dc_loop=loop.dc,
        noise_gain=_finite(loop.noise_gain),
        noise_gain_dc=_finite(loop.noise_gain_dc),
        noise_gain_crossover=_finite(loop.noise_gain_crossover),
        bandwidth=_finite(loop.crossover),
        phase_margin=_finite(loop.phase_margin),
        loop_gain=_finite(loop.loop_gain),
        slew=_finite(output.slew),
        high_pass=_finite(stage.high_pass),
        dissipation=_finite(stage.dissipation),
        junction=_finite(stage.junction),
        gain=_gains(stage),
        filter=_filter(stage.filter),
        thresholds=_thresholds(loop),
        spread=_spread(stage),
        file=file,
        line=line,
    )
