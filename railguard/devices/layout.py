"""The layout of a family's TOML table, as values.

The catalogue's own files and a user's `[[devices]]` have the same layout (see `data/README.md`).
All numbers SI. `seen` says which of a figure's values were read in the named document: "typical",
"guaranteed" or "all"; what is not said is from memory.
"""

from collections.abc import Mapping
from typing import Literal

import msgspec

from railguard.errors import CatalogueError
from railguard.location import Location

Seen = Literal["", "typical", "guaranteed", "all"]

FIGURES = (
    "input_low",
    "input_high",
    "source_current",
    "sink_current",
    "short_circuit",
    "gain_bandwidth",
    "slew_rate",
    "open_loop_gain",
    "stable_gain",
    "bias_current",
    "offset_current",
    "offset_voltage",
    "supply_current",
    "voltage_noise",
    "current_noise",
    "load_capacitance",
    "input_capacitance",
    "output_resistance",
    "differential_input",
    "feedback_resistor",
)
"""Names that are `Figure` both in the table and in `Device`."""


class FigureTable(msgspec.Struct, frozen=True, forbid_unknown_fields=True):
    """One limit as written."""

    typical: float | None = None
    guaranteed: float | None = None
    hot: float | None = None
    seen: Seen = ""
    condition: str = ""


class SwingTable(msgspec.Struct, frozen=True, forbid_unknown_fields=True):
    """The drop to a rail at one load.

    ohms, to  load resistance and where its other end is; `to` counts for `ohms` only
    amps      load current, where the sheet states that; neither: without load
    supply    total, V; none: the sheet's own
    light_sink  True: the figure holds for microamperes only
    """

    typical: float | None = None
    guaranteed: float | None = None
    ohms: float | None = None
    amps: float | None = None
    to: Literal["middle", "negative", "positive"] = "middle"
    supply: float | None = None
    seen: Seen = ""
    light_sink: bool = False
    condition: str = ""


class SupplyTable(msgspec.Struct, frozen=True, forbid_unknown_fields=True):
    """Total supply, V, and which of the three were read in the document."""

    low: float | None = None
    high: float | None = None
    absolute: float | None = None
    seen: tuple[Literal["low", "high", "absolute"], ...] = ()


class SourceTable(msgspec.Struct, frozen=True, forbid_unknown_fields=True):
    """The data sheet."""

    title: str
    document: str = ""
    revision: str = ""
    publisher: str = ""


class FamilyTable(msgspec.Struct, frozen=True, forbid_unknown_fields=True, kw_only=True):
    """A family as written.

    names  what its order codes begin with, by the number of amplifiers in the package
    """

    family: str
    names: Mapping[int, tuple[str, ...]] = {}
    description: str = ""
    technology: str = ""
    feedback: Literal["voltage", "current"] = "voltage"
    source: SourceTable | None = None
    conditions: str = ""
    sheet_supply: float | None = None
    supply: SupplyTable = SupplyTable()
    swing_high: tuple[SwingTable, ...] = ()
    swing_low: tuple[SwingTable, ...] = ()
    input_reach: float | None = None
    phase_reversal: bool | None = None
    rail_to_rail_input: bool = False
    rail_to_rail_output: bool = False
    temperature: tuple[float, float] | None = None
    theta: Mapping[str, float] = {}
    theta_seen: bool = False
    notes: str = ""
    input_low: FigureTable = FigureTable()
    input_high: FigureTable = FigureTable()
    source_current: FigureTable = FigureTable()
    sink_current: FigureTable = FigureTable()
    short_circuit: FigureTable = FigureTable()
    gain_bandwidth: FigureTable = FigureTable()
    slew_rate: FigureTable = FigureTable()
    open_loop_gain: FigureTable = FigureTable()
    stable_gain: FigureTable = FigureTable()
    bias_current: FigureTable = FigureTable()
    offset_current: FigureTable = FigureTable()
    offset_voltage: FigureTable = FigureTable()
    supply_current: FigureTable = FigureTable()
    voltage_noise: FigureTable = FigureTable()
    current_noise: FigureTable = FigureTable()
    load_capacitance: FigureTable = FigureTable()
    input_capacitance: FigureTable = FigureTable()
    output_resistance: FigureTable = FigureTable()
    differential_input: FigureTable = FigureTable()
    feedback_resistor: FigureTable = FigureTable()


def read_table(data: Mapping[str, object], location: Location | None = None) -> FamilyTable:
    """Check a table's layout.

    Raises:
        CatalogueError: an unknown or missing field, or a value of the wrong kind.
    """
    try:
        return msgspec.convert(data, FamilyTable, str_keys=True)
    except msgspec.ValidationError as wrong:
        name = data.get("family", "without a name")
        raise CatalogueError(
            f"The device table of {name} cannot be used: {wrong}.",
            location,
            "The fields are those of the shipped catalogue; `railguard devices NAME` shows one.",
        ) from wrong
