"""The stage sheet: every op-amp, pass or not, with its numbers and where each came from.

Rows first (plain values), then one renderer a format; all show the same rows, so that the sheet
filed as review evidence and the one on the screen say the same.
"""

import csv
import io
import math

import msgspec

from railguard.analysis.stage import Rail, Range, Stage
from railguard.report.escaping import csv_cell, markdown
from railguard.report.json_text import encoded
from railguard.reviewing import DesignReview, Review
from railguard.units import si


class Row(msgspec.Struct, frozen=True, kw_only=True):
    """One line of the sheet. Numbers in SI units; None: not worked out, and `basis` says why."""

    file: str
    designator: str
    quantity: str
    unit: str = ""
    demand_low: float | None = None
    demand_high: float | None = None
    worst_low: float | None = None
    worst_high: float | None = None
    available_low: float | None = None
    available_high: float | None = None
    guaranteed_low: float | None = None
    guaranteed_high: float | None = None
    text: str = ""
    basis: str = ""


HEADINGS = ("quantity", "demand", "worst", "available", "guaranteed", "basis")


def rows(review: Review, only: str = "") -> tuple[Row, ...]:
    """Return the rows of every stage, or of the one called `only` in either spelling."""
    found: list[Row] = []
    for design in review.designs:
        for stage in design.design.stages:
            if not only or only in (stage.designator, stage.schematic):
                found += _stage(design, stage)
    return tuple(found)


def _stage(design: DesignReview, stage: Stage) -> list[Row]:
    def row(quantity: str, unit: str = "", **fields: object) -> Row:
        return Row(
            file=design.path,
            designator=stage.designator,
            quantity=quantity,
            unit=unit,
            **fields,  # type: ignore[arg-type]  # msgspec checks the names when the row is made
        )

    output, inputs, current, loop = stage.output, stage.inputs, stage.current, stage.loop
    unknown = {part: reason.why for part, reason in stage.unknown.items()}
    device = stage.family
    sheet = str(device.source) if device is not None else unknown.get("device", "no device known")
    use = stage.use if stage.use_stated else f"{stage.use} (worked out)"
    return [
        row("device", text=f"{stage.device}, {stage.topology}, {use}", basis=sheet),
        row(
            "supply",
            "V",
            demand_low=stage.supply.negative,
            demand_high=stage.supply.positive,
            worst_low=stage.supply.negative_worst.low,
            worst_high=stage.supply.positive_worst.high,
            available_high=device.supply_high if device else None,
            available_low=device.supply_low if device else None,
            basis=unknown.get("supply", stage.supply.basis),
        ),
        *(row("gain", "V/V", demand_high=gain, text=f"from {net}") for net, gain in stage.gain),
        row("output", "V", basis=_basis(stage, "output"), **_range(output)),
        row(
            "output current",
            "A",
            demand_low=_negative(current.demand_sink),
            demand_high=current.demand_source,
            worst_low=_negative(current.worst_sink),
            worst_high=current.worst_source,
            available_low=_negative(current.sink.typical),
            available_high=current.source.typical,
            guaranteed_low=_negative(current.available_sink),
            guaranteed_high=current.available_source,
            basis=_basis(stage, "current"),
        ),
        row("inputs", "V", basis=_basis(stage, "input"), **_range(inputs)),
        row(
            "slew rate",
            "V/s",
            demand_high=output.slew,
            available_high=device.slew_rate.typical if device else None,
            guaranteed_high=device.slew_rate.guaranteed if device else None,
            basis=unknown.get("output", "netlist"),
        ),
        row("bandwidth", "Hz", demand_high=loop.band, available_high=loop.crossover),
        row("noise gain", "V/V", demand_low=loop.noise_gain_dc, demand_high=loop.noise_gain),
        row("loop gain", "V/V", available_high=loop.loop_gain, text=_at(loop.band)),
        row(
            "phase margin",
            "°",
            available_high=loop.phase_margin,
            available_low=loop.margins.low,
            text="" if loop.phase_margin is not None else "bounds: not all of it is listed",
        ),
        row("dissipation", "W", demand_high=stage.dissipation, text=_junction(stage)),
        row("offset at output", "V", demand_high=output.offset),
        *(_rail(row("decoupling"), rail) for rail in _rails(design, stage)),
        row(
            "largest input",
            stage.allowed.unit if stage.allowed else "V",
            available_low=stage.allowed.low if stage.allowed else None,
            available_high=stage.allowed.high if stage.allowed else None,
            text=f"{stage.allowed.net}, limited by {stage.allowed.limited_by}"
            if stage.allowed
            else "not worked out",
        ),
    ]


def _range(part: object) -> dict[str, float | None]:
    ranges: dict[str, Range] = {
        name: getattr(part, name) for name in ("demand", "worst", "available", "guaranteed")
    }
    return {f"{n}_{end}": getattr(r, end) for n, r in ranges.items() for end in ("low", "high")}


def _basis(stage: Stage, part: str) -> str:
    reason = next((r.why for p, r in stage.unknown.items() if p == part), "")
    bound = {
        "output": stage.output.high,
        "current": stage.current.source,
        "input": stage.inputs.high,
    }[part]
    known = f"demand {bound.demand_basis}, limit {bound.guaranteed_basis}"
    if bound.condition:
        known += f" ({bound.condition})"
    return f"{known}; {reason}" if reason else known


def _negative(value: float | None) -> float | None:
    return None if value is None else -value


def _at(hertz: float | None) -> str:
    return f"at {si(hertz, 'Hz')}" if hertz else "no band stated"


def _junction(stage: Stage) -> str:
    if stage.junction is None:
        return "whole package"
    return f"whole package; junction at {stage.junction:.0f} °C in the worst listed case"


def _rails(design: DesignReview, stage: Stage) -> list[Rail]:
    nets = (stage.supply.positive_net, stage.supply.negative_net)
    return [rail for rail in design.design.rails if rail.net in nets]


def _rail(row: Row, rail: Rail) -> Row:
    fitted = ", ".join(f"{c.designator} {si(c.farads, 'F')}" for c in rail.decoupling) or "none"
    text = f"{rail.net}: {fitted}, for {len(rail.packages)} package" + "s" * (
        len(rail.packages) > 1
    )
    return msgspec.structs.replace(row, text=text, basis=rail.basis)


def cells(row: Row) -> tuple[str, ...]:
    """Return a row as the screen and Markdown show it, in the order of HEADINGS."""
    pairs = [
        _pair(getattr(row, f"{name}_low"), getattr(row, f"{name}_high"), row.unit)
        for name in ("demand", "worst", "available", "guaranteed")
    ]
    first = pairs[0] if pairs[0] else row.text
    basis = row.basis if first is row.text or not row.text else f"{row.text}; {row.basis}"
    return (row.quantity, first, *pairs[1:], basis.strip("; "))


def _pair(low: float | None, high: float | None, unit: str) -> str:
    known = [v for v in (low, high) if v is not None and math.isfinite(v)]
    if not known:
        return ""
    if len(known) == 1 or low == high:
        return si(known[0], unit)
    return f"{si(low, unit)} to {si(high, unit)}"


def as_csv(sheet: tuple[Row, ...]) -> bytes:
    """Return the sheet as CSV; a text that a spreadsheet would take for a formula is quoted."""
    out = io.StringIO()
    writer = csv.writer(out, lineterminator="\n")
    writer.writerow(Row.__struct_fields__)
    for row in sheet:
        writer.writerow([_plain(getattr(row, name)) for name in Row.__struct_fields__])
    return out.getvalue().encode()


def _plain(value: object) -> object:
    if isinstance(value, str):
        return csv_cell(value)
    return "" if value is None else value


def as_json(sheet: tuple[Row, ...]) -> bytes:
    """Return the sheet as a JSON array of rows."""
    return encoded(sheet)


def as_markdown(sheet: tuple[Row, ...]) -> bytes:
    """Return the sheet as one Markdown table a stage."""
    lines: list[str] = []
    before = ""
    for row in sheet:
        name = f"{row.file}: {row.designator}"
        if name != before:
            lines += ["", f"### {markdown(name)}", "", "| " + " | ".join(HEADINGS) + " |"]
            lines.append("|" + " --- |" * len(HEADINGS))
            before = name
        lines.append("| " + " | ".join(markdown(cell) for cell in cells(row)) + " |")
    return ("\n".join(lines).lstrip("\n") + "\n").encode()
