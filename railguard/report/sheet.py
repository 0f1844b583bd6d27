"""The stage sheet: every op-amp, pass or not, with its numbers and where each came from.

Rows first (plain values); `report.sheet_forms` writes them, and every form shows the same rows, so
that the sheet filed as review evidence and the one on the screen say the same.
"""

from collections.abc import Iterator
from typing import Protocol

import msgspec

from railguard import __version__
from railguard.analysis.bound import Bound, Range
from railguard.analysis.corners import DEFAULT_CAPACITOR, DEFAULT_RESISTOR
from railguard.analysis.rail import Rail
from railguard.analysis.stage import Current, Stage
from railguard.devices.model import Device, Figure
from railguard.report.sheet_basis import bases, figure_basis, phase_basis, why
from railguard.report.sheet_row import PARTS, Row, cleaned
from railguard.report.words import near, with_ends
from railguard.reviewing import DesignReview, Review
from railguard.rules.finding import Finding
from railguard.rules.wording import listed, of_gain, of_volts, origin
from railguard.units import percent, si


class _Maker(Protocol):
    """Makes a row of one stage."""

    def __call__(self, quantity: str, unit: str = "", **fields: object) -> Row: ...


def rows(review: Review, only: str = "") -> tuple[Row, ...]:
    """Return the rows of every deck and stage.

    only  a designator in either spelling, or a package's, whatever its case: that one's rows
    """
    found: list[Row] = []
    for design in review.designs:
        stages = [s for s in design.design.stages if not only or _is_called(s, only)]
        if stages or not only:
            found += _deck(design)
        for stage in stages:
            found += _stage(design, stage)
    return tuple(found)


def _is_called(stage: Stage, name: str) -> bool:
    names = (stage.designator, stage.schematic, stage.package)
    return name.casefold() in (n.casefold() for n in names)


def _deck(design: DesignReview) -> Iterator[Row]:
    """Yield what a sheet must say to be evidence: which text was read, with which statements."""
    settings, tolerances = design.design.settings, design.design.settings.tolerances

    def said(quantity: str, text: str) -> Row:
        return Row(file=design.path, designator="", quantity=quantity, text=text)

    yield said("deck", f"{design.path}, sha256 {design.design.circuit.sha256}")
    yield said("reviewed", f"by railguard {__version__}, as of {settings.as_of.isoformat()}")
    yield said("statements", near(settings.file) or "in the netlist alone")
    yield said("taken for", f"a {design.design.kind}: {design.design.kind_reason}")
    shares = [
        f"{name} {percent(default if stated is None else stated)} "
        f"({'default' if stated is None else 'stated'})"
        for name, stated, default in (
            ("resistors", tolerances.resistor, DEFAULT_RESISTOR),
            ("capacitors", tolerances.capacitor, DEFAULT_CAPACITOR),
        )
    ]
    yield said("tolerances", f"{listed(shares)}, where no card states its own")
    cold, hot = settings.ambient or (25.0, 25.0)
    yield said("ambient", f"{si(cold, '°C')} to {si(hot, '°C')}")
    yield said("verdict", f"{design.verdict}: {design.judged} judged, {design.open} not checked")


def _stage(design: DesignReview, stage: Stage) -> Iterator[Row]:
    def row(quantity: str, unit: str = "", **fields: object) -> Row:
        return Row(
            file=design.path,
            designator=stage.designator,
            quantity=quantity,
            unit=unit,
            **fields,  # type: ignore[arg-type]  # msgspec checks the names when the row is made
        )

    use = stage.use if stage.use_stated else f"{stage.use} (worked out)"
    device = stage.family
    yield row(
        "device",
        text=f"{stage.device}, {stage.topology}; {use}",
        demand_basis=f"netlist, {stage.location}" if stage.location else "netlist",
        guaranteed_basis=str(device.source) if device is not None else why(stage, "device"),
    )
    yield from _supply(design, stage, row)
    for unit, gains, spans in (
        ("V/V", stage.gain, stage.gain_worst),
        ("V/A", stage.transfer, stage.transfer_worst),
    ):
        ends = dict(spans)
        for net, gain in gains:
            yield row("gain", unit, text=f"from {net}", **_solved(gain, ends.get(net, Range())))
    yield _ranges(row, "output", "V", stage.output, stage, "output")
    yield cleaned(row("output current", "A", **_current(stage)))
    yield _ranges(row, "inputs", "V", stage.inputs, stage, "input")
    yield from _thresholds(stage, row)
    if stage.high_pass is not None:
        corner = _solved(stage.high_pass, stage.high_pass_worst)
        yield row("coupling corner", "Hz", text="-3 dB, behind capacitors in series", **corner)
    yield from _filter(stage, row)
    yield from _dynamics(stage, row)
    yield row(
        "dissipation",
        "W",
        demand_high=stage.dissipation,
        text=_junction(stage),
        demand_basis=why(stage, "dissipation")
        or f"whole package, every channel at its worst level; supply current "
        f"{figure_basis(device.supply_current if device else Figure())}",
        **_ends(stage.dissipation_worst, "rails and output range at their ends"),
        guaranteed_basis=f"thermal resistance {origin(device.theta_basis)}"
        if device is not None and stage.junction is not None
        else "",
    )
    yield row(
        "offset at output",
        "V",
        worst_high=stage.output.offset,
        worst_basis=f"offset and bias current of this stage and those before; offset "
        f"{figure_basis(device.offset_voltage if device else Figure())}",
    )
    yield from (_decoupling(row("decoupling"), rail) for rail in _rails(design, stage))
    yield _largest(row("largest input", stage.allowed.unit if stage.allowed else "V"), stage)
    yield row("findings", text=_findings(design, stage))
    yield row("not checked", text=_open(design, stage))


def _supply(design: DesignReview, stage: Stage, row: _Maker) -> Iterator[Row]:
    supply, device = stage.supply, stage.family
    for word, level, worst, net in (
        ("positive", supply.positive, supply.positive_worst, supply.positive_net),
        ("negative", supply.negative, supply.negative_worst, supply.negative_net),
    ):
        rail = next((r for r in design.design.rails if r.net == net), None)
        told = rail.origin if rail is not None and rail.origin else origin(supply.basis)
        share = percent(rail.tolerance) if rail is not None else ""
        sort = "stated" if rail is not None and rail.tolerance_stated else "default"
        yield row(
            f"{word} supply",
            "V",
            demand_high=level,
            worst_low=worst.low,
            worst_high=worst.high,
            text=f"net {net}" if net else "no such pin",
            demand_basis=why(stage, "supply") or told,
            worst_basis=f"tolerance {share} ({sort})" if rail is not None and level else "ground",
        )
    basis = device.supply_basis if device is not None else {}
    yield row(
        "total supply",
        "V",
        demand_high=supply.total,
        demand_basis=why(stage, "supply") or "positive less negative supply",
        guaranteed_low=device.supply_low if device else None,
        guaranteed_high=device.supply_high if device else None,
        guaranteed_basis=f"recommended range, {origin(basis.get('high', 'memory'))}"
        if device is not None
        else "",
    )


def _ranges(row: _Maker, quantity: str, unit: str, part: object, stage: Stage, name: str) -> Row:
    fields: dict[str, float | None] = {}
    for kind in PARTS:
        found: Range = getattr(part, kind, Range())
        fields |= {f"{kind}_low": found.low, f"{kind}_high": found.high}
    bounds: tuple[Bound, Bound] = (part.high, part.low)  # type: ignore[attr-defined]
    return cleaned(row(quantity, unit, **fields, **bases(bounds, stage, name)))


def _current(stage: Stage) -> dict[str, float | str | None]:
    current = stage.current
    return {
        "demand_low": _negative(current.demand_sink),
        "demand_high": current.demand_source,
        "worst_low": _negative(current.worst_sink),
        "worst_high": current.worst_source,
        "sampled_low": current.sampled.low,
        "sampled_high": current.sampled.high,
        "available_low": _negative(current.sink.typical),
        "available_high": current.source.typical,
        "guaranteed_low": _negative(current.sink.guaranteed),
        "guaranteed_high": current.source.guaranteed,
        "text": _where_to(current),
        **bases((current.source, current.sink), stage, "current"),
    }


def _where_to(current: Current) -> str:
    """Say what an output drives: the smallest resistor at it, and its transistors."""
    words = [f"mostly into {current.into}"] if current.into else []
    for carrier in current.carriers:
        takes = f"; base current {si(carrier.takes, 'A')}" if carrier.gain is not None else ""
        words.append(
            f"{listed(carrier.designators)} {of_gain(carrier)}{takes}; {of_volts(carrier)}"
        )
    return "; ".join(words)


TOLERANCES = "extreme values of tolerances"


def _solved(value: float | None, ends: Range, told: str = "") -> dict[str, float | str | None]:
    """Return the fields of a figure that the netlist alone gives, with its ends."""
    return {
        "demand_high": value,
        **_ends(ends, TOLERANCES),
        "demand_basis": told or ("netlist, solved" if value is not None else ""),
    }


def _ends(ends: Range, basis: str) -> dict[str, float | str | None]:
    return {
        "worst_low": ends.low,
        "worst_high": ends.high,
        "worst_basis": basis if ends.low is not None else "",
    }


def _speeds(device: Device | None) -> str:
    """Say what the ends of a figure rest on that hangs on the gain-bandwidth product."""
    listed = device.gain_bandwidth if device is not None else Figure()
    both = listed.typical is not None and listed.guaranteed is not None
    return f"{TOLERANCES}{', gain-bandwidth typical and guaranteed' if both else ''}"


def _thresholds(stage: Stage, row: _Maker) -> Iterator[Row]:
    loop, inputs = stage.loop, stage.inputs
    basis = f"{TOLERANCES} of resistors and rails, and offset"
    for name, value, ends in (
        ("upper threshold", loop.thresholds.high, loop.upper_worst),
        ("lower threshold", loop.thresholds.low, loop.lower_worst),
    ):
        if value is not None:
            told = {**_solved(value, ends), **_ends(ends, basis)}
            yield row(name, "V", text="volts of the signal that moves it", **told)
    if inputs.differential is not None:
        found = _solved(inputs.differential, inputs.differential_worst)
        yield row("input difference", "V", **found)


def _filter(stage: Stage, row: _Maker) -> Iterator[Row]:
    found = stage.filter
    if found is None:
        return
    yield row(
        "natural frequency",
        "Hz",
        text=found.kind,
        **_solved(found.frequency, found.frequency_worst),
    )
    yield row("quality factor", "", **_solved(found.q, found.q_worst))
    yield row("gain in pass band", "V/V", **_solved(found.gain, found.gain_worst))


_CLOSES = "where the loop closes"


def _dynamics(stage: Stage, row: _Maker) -> Iterator[Row]:
    loop, device = stage.loop, stage.family
    speed = device.gain_bandwidth if device is not None else Figure()
    slew = device.slew_rate if device is not None else Figure()
    at = f"at {si(loop.band, 'Hz')}" if loop.band else ""
    open_loop = why(stage, "loop") or figure_basis(speed)
    yield row(
        "slew rate",
        "V/s",
        demand_high=stage.output.slew,
        **_ends(stage.output.slew_worst, TOLERANCES),
        available_high=slew.typical,
        guaranteed_high=slew.guaranteed,
        demand_basis=why(stage, "output") or origin(stage.output.high.demand_basis),
        available_basis=origin(slew.typical_basis) if slew.typical is not None else "",
        guaranteed_basis=origin(slew.guaranteed_basis) if slew.guaranteed is not None else "",
    )
    yield row(
        "bandwidth",
        "Hz",
        demand_high=loop.band,
        available_high=loop.crossover,
        **_ends(loop.crossover_worst, f"of the bandwidth, {_speeds(device)}"),
        demand_basis="top of the stated band" if loop.band else "no band is stated",
        available_basis=f"where the loop gain is one; gain-bandwidth {open_loop}",
    )
    told = why(stage, "loop")
    for where, value, ends in (
        ("at DC", loop.noise_gain_dc, loop.noise_gain_worst),
        (at or "in band", loop.noise_gain, loop.in_band_worst),
        (_CLOSES, loop.noise_gain_crossover, loop.at_crossover_worst),
    ):
        if value is None and where == _CLOSES:
            continue
        text = where if value is not None else f"{where}: not worked out"
        yield row("noise gain", "V/V", text=text, **_solved(value, ends, told))
    yield row(
        "loop gain",
        "V/V",
        available_high=loop.loop_gain,
        **_ends(loop.loop_gain_worst, _speeds(device)),
        text=at,
        available_basis=f"gain-bandwidth {open_loop}" if loop.band else "no band is stated",
    )
    bounds = loop.phase_margin is None and loop.margins.low is not None
    yield row(
        "phase margin",
        "°",
        available_low=loop.margins.low if bounds else None,
        available_high=loop.margins.high if bounds else loop.phase_margin,
        **_ends(loop.phase_margin_worst, _speeds(device)),
        text="between these, as not every figure is listed" if bounds else "",
        available_basis=why(stage, "loop") or phase_basis(stage),
    )


def _largest(row: Row, stage: Stage) -> Row:
    allowed = stage.allowed
    if allowed is None:
        reason = "no signal reaches it alone, or none keeps every stage in range"
        return msgspec.structs.replace(row, text=f"not worked out: {reason}")
    return cleaned(
        msgspec.structs.replace(
            row,
            guaranteed_low=allowed.low,
            guaranteed_high=allowed.high,
            text=f"at {allowed.net}, limited by {allowed.limited_by}",
            guaranteed_basis="this input moved alone, all others at rest; guaranteed limits, "
            "typical ones where nothing is guaranteed",
        )
    )


def _findings(design: DesignReview, stage: Stage) -> str:
    def about(findings: tuple[Finding, ...]) -> Iterator[str]:
        for finding in findings:
            names = {stage.designator, stage.package, stage.schematic}
            if names & set(finding.designators):
                waived = ", waived" if finding.waiver is not None else ""
                yield f"{finding.rule} ({finding.severity}{waived})"
            yield from about(finding.consequences)

    return "; ".join(dict.fromkeys(about(design.findings))) or "none"


def _open(design: DesignReview, stage: Stage) -> str:
    names = {stage.designator, stage.schematic, stage.package}
    notes = [f"{n.rule}: {n.why}" for n in design.not_checked if n.subject in names]
    return "; ".join(notes) or "nothing"


def _negative(value: float | None) -> float | None:
    return None if value is None else -value


def _junction(stage: Stage) -> str:
    if stage.junction is None:
        return ""
    at = with_ends(stage.junction, stage.junction_worst, "°C")
    return f"junction at {at} in the case of most thermal resistance"


def _rails(design: DesignReview, stage: Stage) -> list[Rail]:
    nets = (stage.supply.positive_net, stage.supply.negative_net)
    return [rail for rail in design.design.rails if rail.net in nets]


def _decoupling(row: Row, rail: Rail) -> Row:
    fitted = ", ".join(f"{c.designator} {si(c.farads, 'F')}" for c in rail.decoupling) or "none"
    packages = f"{len(rail.packages)} package" + "s" * (len(rail.packages) != 1)
    return msgspec.structs.replace(
        row,
        text=f"{rail.net} to {listed(rail.returns) or '0'}: {fitted}, for {packages}",
        demand_basis="netlist, which knows no distance",
    )
