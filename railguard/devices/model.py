"""What a data sheet says of an op-amp family, as one value.

All figures SI. Voltages of inputs are relative to a rail: `input_low` to the negative rail
(positive: above it), `input_high` to the positive rail (negative: below it). Swing is the
distance the output keeps from a rail, so smaller is better. What is not known is None.
"""

from collections.abc import Mapping
from typing import Literal

import msgspec

from railguard.location import Location
from railguard.words import Basis

UNLISTED_CURRENT = "no output current is listed"
"""Begins the condition of a current that is only known from the load of a swing test."""


class SheetSource(msgspec.Struct, frozen=True):
    """The document a family's figures come from. `seen` is False where all are from memory."""

    title: str
    document: str = ""
    revision: str = ""
    publisher: str = ""
    seen: bool = True

    def __str__(self) -> str:
        """Return it as a report cites it: publisher, number and revision, title."""
        number = " ".join(filter(None, (self.document, self.revision)))
        return ", ".join(filter(None, (self.publisher, number, self.title)))


class Figure(msgspec.Struct, frozen=True):
    """One limit: typical and guaranteed values kept apart, with the basis of each.

    guaranteed  the minimum or the maximum the sheet guarantees, whichever binds
    hot         the guaranteed value over the sheet's temperature range, where listed
    """

    typical: float | None = None
    guaranteed: float | None = None
    hot: float | None = None
    typical_basis: Basis = "memory"
    guaranteed_basis: Basis = "memory"
    condition: str = ""

    @property
    def best(self) -> float | None:
        """The guaranteed value, or the typical one where none is guaranteed."""
        return self.guaranteed if self.guaranteed is not None else self.typical

    @property
    def best_basis(self) -> Basis:
        """Where `best` came from."""
        return self.guaranteed_basis if self.guaranteed is not None else self.typical_basis


class SwingPoint(msgspec.Struct, frozen=True):
    """The drop to a rail at one load.

    amps      output current at the test point, from the load and the sheet's supply
    supply    total supply of the test, V
    typical   drop, V
    guaranteed  worst drop, V
    light_sink  True where the figure holds only for the load to the negative rail, or for
                microamperes of sink current
    """

    amps: float
    typical: float | None = None
    guaranteed: float | None = None
    supply: float | None = None
    typical_basis: Basis = "memory"
    guaranteed_basis: Basis = "memory"
    light_sink: bool = False
    condition: str = ""


class Device(msgspec.Struct, frozen=True, kw_only=True):
    """An op-amp family.

    technology   "bipolar", "jfet", "cmos", ... as the catalogue spells it
    feedback     "voltage" or "current" (current-feedback amplifier)
    supply_*     total supply, V
    current_known  output current a device is known to give because its swing is tested at it
    theta        kelvin per watt by package name
    input_reach  input limit measured upward from the *negative* rail, V, where the sheet allows
                 inputs above the positive rail; it then stands in place of `input_high`
    """

    family: str
    description: str = ""
    technology: str = ""
    feedback: Literal["voltage", "current"] = "voltage"
    supply_low: float | None = None
    supply_high: float | None = None
    supply_absolute: float | None = None
    supply_basis: Mapping[str, Basis] = {}
    input_low: Figure = Figure()
    input_high: Figure = Figure()
    swing_high: tuple[SwingPoint, ...] = ()
    swing_low: tuple[SwingPoint, ...] = ()
    source_current: Figure = Figure()
    sink_current: Figure = Figure()
    short_circuit: Figure = Figure()
    gain_bandwidth: Figure = Figure()
    slew_rate: Figure = Figure()
    open_loop_gain: Figure = Figure()
    stable_gain: Figure = Figure()
    bias_current: Figure = Figure()
    offset_current: Figure = Figure()
    offset_voltage: Figure = Figure()
    supply_current: Figure = Figure()
    voltage_noise: Figure = Figure()
    current_noise: Figure = Figure()
    load_capacitance: Figure = Figure()
    input_capacitance: Figure = Figure()
    output_resistance: Figure = Figure()
    differential_input: Figure = Figure()
    feedback_resistor: Figure = Figure()
    phase_reversal: bool | None = None
    rail_to_rail_input: bool = False
    rail_to_rail_output: bool = False
    temperature: tuple[float, float] | None = None
    theta: Mapping[str, float] = {}
    theta_basis: Basis = "practice"
    input_reach: float | None = None
    conditions: str = ""
    sheet_supply: float | None = None
    source: SheetSource = SheetSource(title="")
    notes: str = ""
    location: Location | None = None


Sort = Literal[
    "op-amp",
    "comparator",
    "reference",
    "timer",
    "regulator",
    "instrumentation",
    "generic",
    "other",
    "unknown",
]
"""`generic` is an amplifier without a type: OPAMP, IDEAL_OPAMP. `other` is known, no op-amp."""


class Match(msgspec.Struct, frozen=True):
    """What a name in a netlist stands for.

    name      as written
    sort      op-amp, or what else it is known to be
    device    the family, for an op-amp that is in the catalogue
    channels  amplifiers in the package; None: not known
    also      other families the name could mean
    nearest   the nearest catalogue name, where nothing matched
    """

    name: str
    sort: Sort
    device: Device | None = None
    channels: int | None = None
    also: tuple[str, ...] = ()
    nearest: str = ""


Role = Literal["in+", "in-", "v+", "v-", "out", "other"]


class Channel(msgspec.Struct, frozen=True):
    """Where one amplifier's pins stand on a card: indexes into its nets; None: no such pin."""

    plus: int
    minus: int
    positive: int | None
    negative: int | None
    output: int
    suffix: str = ""


class PinOrder(msgspec.Struct, frozen=True):
    """The amplifiers on one card.

    basis   "user", "netlist" (header or comment says so) or "assumed" (the usual order)
    remark  one sentence for the report where the order was assumed or contradicted
    """

    channels: tuple[Channel, ...]
    basis: Basis
    remark: str = ""
