"""Making findings and open points from a stage, so that every rule fills the same fields."""

from collections.abc import Iterable, Iterator
from typing import Literal, cast

from railguard.analysis.rail import Package, Rail
from railguard.analysis.stage import Design, Part, Stage, Unknown
from railguard.location import Location
from railguard.notices import NotChecked
from railguard.rules.finding import Finding
from railguard.rules.severity import Breach
from railguard.words import Basis, Family, Severity

OWN_TABLE = (
    "give its limits in a [[devices]] table of railguard.toml, "
    "or measure its subcircuit with `railguard devices measure`"
)
"""What a user can add for a device the catalogue does not know."""


def family_of(rule: str) -> Family:
    """Return the family a rule's name begins with."""
    return cast("Family", rule.split("-", 1)[0])


def finding(
    rule: str,
    severity: Severity,
    message: str,
    *,
    designators: tuple[str, ...] = (),
    nets: tuple[str, ...] = (),
    demand: float | None = None,
    limit: float | None = None,
    margin: float | None = None,
    unit: str = "",
    basis: tuple[Basis, ...] = ("netlist",),
    remedy: str = "",
    source: str = "",
    location: Location | None = None,
    corner: Literal["nominal", "worst-case"] = "nominal",
) -> Finding:
    """Make a finding whose numbers were compared directly."""
    return Finding(
        rule=rule,
        family=family_of(rule),
        severity=severity,
        designators=designators,
        nets=nets,
        demand=demand,
        limit=limit,
        margin=margin,
        unit=unit,
        basis=tuple(dict.fromkeys(basis)),
        message=message,
        remedy=remedy,
        source=source,
        location=location,
        corner=corner,
    )


def stage_finding(
    rule: str,
    stage: Stage,
    severity: Severity,
    message: str,
    *,
    nets: tuple[str, ...] = (),
    demand: float | None = None,
    limit: float | None = None,
    margin: float | None = None,
    unit: str = "",
    basis: tuple[Basis, ...] = ("netlist",),
    remedy: str = "",
    source: str = "",
    corner: Literal["nominal", "worst-case"] = "nominal",
) -> Finding:
    """Make a finding about one stage."""
    return finding(
        rule,
        severity,
        message,
        designators=(stage.designator,),
        nets=nets,
        demand=demand,
        limit=limit,
        margin=margin,
        unit=unit,
        basis=basis,
        remedy=remedy,
        source=source,
        location=stage.location,
        corner=corner,
    )


def breach_finding(
    rule: str,
    stage: Stage,
    broken: Breach,
    unit: str,
    message: str,
    *,
    nets: tuple[str, ...] = (),
    remedy: str = "",
    source: str = "",
) -> Finding:
    """Make a finding about one stage from the limit it breaks."""
    return Finding(
        rule=rule,
        family=family_of(rule),
        severity=broken.severity,
        designators=(stage.designator,),
        nets=nets,
        demand=broken.demand,
        limit=broken.limit,
        margin=broken.margin,
        margin_share=broken.share,
        unit=unit,
        basis=broken.basis,
        corner="worst-case" if broken.at_corner else "nominal",
        message=message,
        remedy=remedy,
        source=source,
        location=stage.location,
    )


def first_unknown(stage: Stage, parts: Iterable[Part]) -> Unknown | None:
    """Return why the first of some parts of a stage was not worked out, or None."""
    for part in parts:
        if part in stage.unknown:
            return stage.unknown[part]
        if part == "device" and stage.family is None:
            return Unknown(_unknown_device(stage), OWN_TABLE)
    return None


def _unknown_device(stage: Stage) -> str:
    if stage.generic or not stage.device:
        return f"{stage.schematic} is an amplifier without a type, so no data sheet limits it"
    return f"the device catalogue does not know {stage.device}"


def open_point(
    rule: str,
    stage: Stage,
    parts: Iterable[Part],
    otherwise: Unknown | None = None,
) -> Iterator[NotChecked]:
    """Yield at most one open point: the first unknown part, else `otherwise`."""
    reason = first_unknown(stage, parts) or otherwise
    if reason is not None:
        yield NotChecked(stage.designator, rule, reason.why, reason.add)


def missing_figure(stage: Stage, words: str, field: str) -> Unknown:
    """Say that a device's table lacks a figure, and how to add it."""
    return Unknown(
        f"the {words} of {stage.device} is not in the catalogue",
        f"add {field} to a [[devices]] table of railguard.toml",
    )


def channels_of(package: Package, design: Design) -> tuple[Stage, ...]:
    """Return the stages that one package holds."""
    return tuple(
        s
        for s in design.stages
        if s.designator in package.channels or s.package == package.designator
    )


def rail_at(net: str, design: Design) -> Rail | None:
    """Return the rail of a net, or None where the net is ground or no rail."""
    return next((rail for rail in design.rails if rail.net == net), None)


def stage_named(designator: str, design: Design) -> Stage | None:
    """Return the stage of a designator."""
    return next((s for s in design.stages if s.designator == designator), None)
