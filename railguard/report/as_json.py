"""The JSON report: the one conversion into its wire types."""

import math
from pathlib import Path
from typing import Literal

import msgspec

from railguard import __version__
from railguard.analysis.bound import Range
from railguard.analysis.loop import Filter, Loop
from railguard.analysis.stage import Allowed, Stage
from railguard.location import Location
from railguard.report.json_text import encoded
from railguard.report.json_types import (
    AllowedOut,
    Coverage,
    CurrentOut,
    DesignOut,
    Document,
    EndsOut,
    FilterOut,
    FindingOut,
    GainOut,
    NotCheckedOut,
    RangeOut,
    ReadingOut,
    SettingsUsed,
    SpreadOut,
    StageOut,
    SupplyOut,
    ThresholdsOut,
    Tool,
    WaiverUsed,
)
from railguard.report.places import from_root, posix
from railguard.report.words import near
from railguard.reviewing import DesignReview, Review
from railguard.rules.finding import Finding

SCHEMA = "railguard-report/1"


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
