"""From a family's table, as written, to the value the analysis works with."""

from collections.abc import Mapping

import msgspec

from railguard.devices.layout import FIGURES, FamilyTable, FigureTable, Seen, SwingTable
from railguard.devices.model import (
    UNLISTED_CURRENT,
    Device,
    Figure,
    SheetSource,
    SwingPoint,
)
from railguard.devices.packages import class_resistances
from railguard.location import Location
from railguard.units import si
from railguard.words import Basis


def device_of(
    table: FamilyTable, location: Location | None = None, stated_by_user: bool = False
) -> Device:
    """Turn a checked table into the value the analysis works with."""
    user: Basis | None = "user" if stated_by_user else None
    figures = {name: _figure(getattr(table, name), user) for name in FIGURES}
    high = tuple(point for entry in table.swing_high for point in _swing(entry, table, True, user))
    low = tuple(point for entry in table.swing_low for point in _swing(entry, table, False, user))
    if figures["source_current"].best is None:
        figures["source_current"] = _tested_current(high)
    if figures["sink_current"].best is None:
        figures["sink_current"] = _tested_current(low)
    theta, theta_basis = _theta(table, user)
    return Device(
        family=table.family,
        description=table.description,
        technology=table.technology,
        feedback=table.feedback,
        supply_low=table.supply.low,
        supply_high=table.supply.high,
        supply_absolute=table.supply.absolute,
        supply_basis={
            name: user or ("catalogue" if name in table.supply.seen else "memory")
            for name in ("low", "high", "absolute")
        },
        swing_high=high,
        swing_low=low,
        input_reach=table.input_reach,
        phase_reversal=table.phase_reversal,
        rail_to_rail_input=table.rail_to_rail_input,
        rail_to_rail_output=table.rail_to_rail_output,
        temperature=table.temperature,
        theta=theta,
        theta_basis=theta_basis,
        conditions=table.conditions,
        sheet_supply=table.sheet_supply,
        source=_source(table, location, stated_by_user),
        notes=table.notes,
        location=location,
        **figures,
    )


def _figure(table: FigureTable, user: Basis | None) -> Figure:
    return Figure(
        typical=table.typical,
        guaranteed=table.guaranteed,
        hot=table.hot,
        typical_basis=user or _basis(table.seen, "typical"),
        guaranteed_basis=user or _basis(table.seen, "guaranteed"),
        condition=table.condition,
    )


def _basis(seen: Seen, half: Seen) -> Basis:
    return "catalogue" if seen in ("all", half) else "memory"


def _swing(
    entry: SwingTable, table: FamilyTable, upper: bool, user: Basis | None
) -> tuple[SwingPoint, ...]:
    """Return one point, or two where a resistor draws less at the guaranteed than at the typical.

    Each value then stands at the current it was tested at.
    """
    supply = entry.supply if entry.supply is not None else table.sheet_supply
    typical, assisted = _load_current(entry, supply, upper, entry.typical)
    guaranteed, _assisted = _load_current(entry, supply, upper, entry.guaranteed)
    point = SwingPoint(
        amps=typical,
        typical=entry.typical,
        guaranteed=entry.guaranteed,
        supply=supply,
        typical_basis=user or _basis(entry.seen, "typical"),
        guaranteed_basis=user or _basis(entry.seen, "guaranteed"),
        light_sink=assisted or entry.light_sink,
        condition=entry.condition or _load_words(entry, supply),
    )
    if entry.typical is None:
        return (msgspec.structs.replace(point, amps=guaranteed),)
    if entry.guaranteed is None or guaranteed == typical:
        return (point,)
    return (
        msgspec.structs.replace(point, guaranteed=None),
        msgspec.structs.replace(point, amps=guaranteed, typical=None),
    )


def _load_current(
    entry: SwingTable, supply: float | None, upper: bool, drop: float | None
) -> tuple[float, bool]:
    """Return the current into the load with the output at its limit, and whether the load helps.

    A load to the rail the output is near asks for no current from it: the figure then holds for
    microamperes only. Without a test supply the smallest usable one, 5 V, is taken: a smaller
    current makes the curve more careful.
    """
    if entry.amps is not None:
        return entry.amps, False
    if entry.ohms is None:
        return 0.0, True
    volts = (supply if supply is not None else 5.0) - (drop or 0.0)
    if entry.to == "middle":
        half = (supply if supply is not None else 5.0) / 2
        return max((volts - half) / entry.ohms, 0.0), False
    if (entry.to == "negative") == upper:
        return max(volts / entry.ohms, 0.0), False
    return 0.0, True


_ENDS = {"middle": "mid-supply", "negative": "the negative rail", "positive": "the positive rail"}


def _load_words(entry: SwingTable, supply: float | None) -> str:
    if entry.amps is not None:
        load = si(entry.amps, "A")
    elif entry.ohms is not None:
        load = f"{si(entry.ohms, 'Ω')} to {_ENDS[entry.to]}"
    else:
        load = "no load"
    return load if supply is None else f"{load}, {si(supply, 'V')} supply"


def _tested_current(points: tuple[SwingPoint, ...]) -> Figure:
    """Return the heaviest guaranteed swing test: a current known to be given."""
    tested = [point for point in points if point.guaranteed is not None and point.amps > 0.0]
    if not tested:
        return Figure()
    heaviest = max(tested, key=lambda point: point.amps)
    return Figure(
        guaranteed=heaviest.amps,
        guaranteed_basis=heaviest.guaranteed_basis,
        condition=f"{UNLISTED_CURRENT}: swing is guaranteed at {heaviest.condition}",
    )


def _theta(table: FamilyTable, user: Basis | None) -> tuple[Mapping[str, float], Basis]:
    if not table.theta:
        return class_resistances(tuple(table.names)), "practice"
    return table.theta, user or ("catalogue" if table.theta_seen else "memory")


def _source(table: FamilyTable, location: Location | None, stated_by_user: bool) -> SheetSource:
    if table.source is None:
        return SheetSource(title=str(location.file) if location else "", seen=stated_by_user)
    return SheetSource(
        title=table.source.title,
        document=table.source.document,
        revision=table.source.revision,
        publisher=table.source.publisher,
        seen=stated_by_user or anything_seen(table),
    )


def anything_seen(table: FamilyTable) -> bool:
    """Tell whether any figure of the table was read in its document."""
    figures = (getattr(table, name).seen for name in FIGURES)
    swings = (entry.seen for entry in (*table.swing_high, *table.swing_low))
    return bool(table.supply.seen) or any(figures) or any(swings)
