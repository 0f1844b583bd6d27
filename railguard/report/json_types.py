"""The JSON report's wire types: its contract.

Names here are what programs rely on (`report.schema.json` ships with the package); inner names stay
free to change. Volts relative to ground, amperes positive, watts, hertz, ohms, farads, degrees. A
number that was not worked out is null.
"""

from typing import Literal

import msgspec

from railguard.words import Basis, Family, Kind, Severity, Verdict


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
