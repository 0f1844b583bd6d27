"""What the user states about a design: rails, signals, loads, tolerances, limits, waivers.

One model with two readers: `settings.file` (railguard.toml) and `settings.directives` (comment
cards). All numbers are SI; tolerances are shares (0.01 is 1 %).
"""

import datetime as dt
from collections.abc import Mapping

import msgspec

from railguard.location import Location
from railguard.words import Severity, Use


class NetLevel(msgspec.Struct, frozen=True):
    """What a net is held at: volts relative to ground, and the share it may be off."""

    volts: float
    tolerance: float | None = None
    location: Location | None = None


class Signal(msgspec.Struct, frozen=True, kw_only=True):
    """What arrives from outside the deck.

    name     the net, or a free name where `between` says the nets
    between  (plus, minus) nets; empty: from `name` to ground
    current  False: volts; True: amperes into the net
    low      lowest value over time, V or A
    high     highest value over time, V or A
    common   level both nets of `between` sit at, V; None: not stated
    ohms     source resistance
    start    lowest frequency of the band, hertz; 0: the level itself counts (from DC)
    stop     highest frequency of the band, hertz; None: DC only
    group    signals of one group reach their extremes at the same instant
    """

    name: str
    between: tuple[str, ...] = ()
    current: bool = False
    low: float = 0.0
    high: float = 0.0
    common: float | None = None
    ohms: float = 0.0
    start: float = 0.0
    stop: float | None = None
    group: str = ""
    location: Location | None = None


class Load(msgspec.Struct, frozen=True, kw_only=True):
    """What hangs on a net outside the deck: ohms and farads to the net `to`."""

    net: str
    ohms: float | None = None
    farads: float | None = None
    to: str = "0"
    max_volts: float | None = None
    location: Location | None = None


class Tolerances(msgspec.Struct, frozen=True):
    """Shares by element class; None: the default of `analysis.corners`.

    rules  narrower statements, first match wins: (designator pattern, share); `*` and `?` stand
           for any letters and for one, case does not count
    """

    resistor: float | None = None
    capacitor: float | None = None
    inductor: float | None = None
    rail: float | None = None
    rules: tuple[tuple[str, float], ...] = ()


class Waiver(msgspec.Struct, frozen=True, kw_only=True):
    """An agreed, reasoned, dated acceptance of a finding.

    rule        its name
    designator  as in the netlist or the schematic; "" : any
    net         "" : any
    file        a glob on the deck's path relative to the settings file; "" : any. `*` stays
                within a folder, `**` is any number of folders
    accepted    the margin accepted, in the finding's unit; a worse one is a finding again
    until       last day it holds
    """

    rule: str
    reason: str
    designator: str = ""
    net: str = ""
    file: str = ""
    by: str = ""
    accepted: float | None = None
    until: dt.date | None = None
    location: Location | None = None


class Named(msgspec.Struct, frozen=True):
    """A rule a statement names, checked by `settings.names` once the rules are known.

    limit  the limit of it that is set, or ""
    unit   the unit written with the limit's value, or ""
    """

    rule: str
    limit: str = ""
    unit: str = ""
    location: Location | None = None


class Settings(msgspec.Struct, frozen=True, kw_only=True):
    """Everything stated, from every reader, in one value.

    file        the railguard.toml used, or ""
    hold_at     the level that stops a commit or a build
    kind        "board" or "bench"; "" : worked out
    nets, uses, pins  by name; `settings.spelling` makes it the netlist's own
    stages_at   where a stage is spoken of, by its name as stated there
    pins        pin names in the order of the card: `in+ in- v+ v- out`, `1out 1in- 1in+ ...`
    ambient     lowest and highest, degrees Celsius; None: 25 throughout
    limits      rule name -> limit name -> value
    severities  rule name -> severity used instead of the worked-out one
    rules_off   names of rules that are not run
    devices     device tables of the user's own, as read from TOML, with their line
    as_of       the day waivers are judged on
    require     families that count as a hold where they stay open
    named       every rule the file names, with its place
    bounds      bounds on reading that are not the reader's own: fields of `deck.bounds.Bounds`
    """

    file: str = ""
    hold_at: Severity = "major"
    kind: str = ""
    ambient: tuple[float, float] | None = None
    nets: Mapping[str, NetLevel] = {}
    signals: tuple[Signal, ...] = ()
    loads: tuple[Load, ...] = ()
    uses: Mapping[str, Use] = {}
    pins: Mapping[str, tuple[str, ...]] = {}
    stages_at: Mapping[str, Location] = {}
    tolerances: Tolerances = Tolerances()
    limits: Mapping[str, Mapping[str, float]] = {}
    severities: Mapping[str, Severity] = {}
    rules_off: tuple[str, ...] = ()
    waivers: tuple[Waiver, ...] = ()
    devices: tuple[tuple[Mapping[str, object], Location], ...] = ()
    as_of: dt.date = dt.date(1970, 1, 1)
    require: tuple[str, ...] = ()
    named: tuple[Named, ...] = ()
    bounds: Mapping[str, int] = {}
