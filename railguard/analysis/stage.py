"""What the analysis hands to the rules: stages, and the design as a whole.

Rails stand in `rail`, loops in `loop`, a figure against its limits in `bound`. Plain frozen values;
nothing here computes. Volts are relative to ground, currents positive, everything SI. A number that
was not worked out is None, and `Stage.unknown` says why.
"""

from collections.abc import Mapping
from typing import Literal

import msgspec

from railguard.analysis.bound import Bound, Range
from railguard.analysis.loop import Balance, Feedback, Filter, Loop
from railguard.analysis.rail import Package, Rail, Supply
from railguard.circuit.model import Circuit
from railguard.devices.model import Device
from railguard.location import Location
from railguard.notices import Problem, Remark
from railguard.settings.model import Settings
from railguard.words import Kind, Use


class Output(msgspec.Struct, frozen=True, kw_only=True):
    """The output's range. `level` is its DC level; `slew` the steepest demanded dv/dt, V/s.

    slew_worst  with the tolerances of elements
    rss     the worst range where all tolerances add as roots of squares
    sampled what Monte Carlo samples covered, where some were drawn
    offset  worst DC error at the output from offset and bias of this and all stages before, V
    """

    net: str
    level: float | None = None
    demand: Range = Range()
    worst: Range = Range()
    rss: Range = Range()
    sampled: Range = Range()
    available: Range = Range()
    guaranteed: Range = Range()
    high: Bound = Bound(upper=True)
    low: Bound = Bound(upper=False)
    frequency: float | None = None
    slew: float | None = None
    slew_worst: Range = Range()
    offset: float | None = None


class Carrier(msgspec.Struct, frozen=True, kw_only=True):
    """A transistor that an output drives and that works: it carries what the output need not.

    designators  one, or the two of a complementary pair

    carries  peak of its collector or drain current, A
    takes    peak of its base current, A; 0 for a gate
    gain     current gain; None for a gate; `gain_stated` where its model says it
    volts    most from base to emitter or gate to source; `volts_stated` where its model says it
    """

    designators: tuple[str, ...]
    carries: float
    takes: float = 0.0
    gain: float | None = None
    gain_stated: bool = True
    volts: float = 0.0
    volts_stated: bool = True


class Current(msgspec.Struct, frozen=True, kw_only=True):
    """The output's current. `load` the resistance it sees at DC, `into` the heaviest element.

    carriers  transistors it drives
    """

    demand_source: float | None = None
    demand_sink: float | None = None
    worst_source: float | None = None
    worst_sink: float | None = None
    sampled: Range = Range()
    available_source: float | None = None
    available_sink: float | None = None
    source: Bound = Bound(upper=True)
    sink: Bound = Bound(upper=True)
    short_circuit: float | None = None
    load: float | None = None
    load_capacitance: float | None = None
    into: str = ""
    carriers: tuple[Carrier, ...] = ()


class Divider(msgspec.Struct, frozen=True):
    """Resistors from a rail that set a pin's level.

    resistance  of the tap, ohm
    bypass      capacitance from the tap to a return, F; 0: none
    unvalued    designator of a capacitor there whose value is not known, or ""
    """

    elements: tuple[str, ...]
    resistance: float
    bypass: float = 0.0
    unvalued: str = ""


class Pin(msgspec.Struct, frozen=True, kw_only=True):
    """One input pin.

    state       "held": reaches a defined potential at DC; "open": leaves what can be seen;
                "floating": nothing at DC; "held-by-own-output": only through its own feedback
    resistance  seen from the pin at DC, ohm, own output counted as a source
    level       DC level, V
    path        designators of the DC path, or what the net hangs on
    series      least resistance between the pin and what drives it, ohm
    """

    net: str
    state: Literal["held", "open", "floating", "held-by-own-output"] = "held"
    resistance: float | None = None
    level: float | None = None
    demand: Range = Range()
    path: tuple[str, ...] = ()
    series: float | None = None
    divider: Divider | None = None


class Inputs(msgspec.Struct, frozen=True, kw_only=True):
    """Both inputs together: the common-mode range asked for and allowed."""

    plus: Pin
    minus: Pin
    demand: Range = Range()
    worst: Range = Range()
    available: Range = Range()
    guaranteed: Range = Range()
    high: Bound = Bound(upper=True)
    low: Bound = Bound(upper=False)
    differential: float | None = None
    differential_worst: Range = Range()


class Allowed(msgspec.Struct, frozen=True):
    """The largest input that keeps every stage inside its ranges, and what limits it.

    net   the net it enters at, or the name of a signal between two nets
    unit  of low and high: "V" or "A"
    """

    net: str
    low: float
    high: float
    limited_by: str
    unit: str = "V"


class Unknown(msgspec.Struct, frozen=True):
    """Why a part of a stage was not worked out, and what the user can state to get it."""

    why: str
    add: str


class Case(msgspec.Struct, frozen=True):
    """What a device is housed in, as its sheet calls it, and K/W from junction to ambient."""

    name: str
    resistance: float


Part = Literal["device", "supply", "output", "current", "input", "bias", "loop", "dissipation"]


class Stage(msgspec.Struct, frozen=True, kw_only=True):
    """One op-amp channel in its surroundings.

    A figure that tolerances move has its ends beside it, in a range named `worst` or `..._worst`.
    These have none: the largest input `allowed`, which is taken at guaranteed limits already;
    `Output.offset`, which is a worst value; `Loop.margins`, which are bounds; levels and ranges of
    one `Pin`, whose ends stand in `Inputs`; `Feedback.current`, whose ends stand in `Current`;
    frequencies that somebody states; and what the netlist itself says, or its DC resistance:
    loads, capacitances, `Pin.resistance`, `Feedback`.

    designator   as in the netlist, hierarchical: `XCH1.XU2`
    schematic    as on the schematic: `U2`
    device       as written: `TL072CP`
    family       the catalogue's family, or None
    dissipation  W, of the whole package with all its channels at their worst
    junction     degrees Celsius, at the hottest ambient with that heat
    transfer     from each net a current arrives at: (net, V/A); `transfer_worst` with tolerances
    gain         from each input net: (net, V/V at DC or in band); `gain_worst` with tolerances
    after        designators of stages whose output reaches this one's inputs
    generic      True for an amplifier without a type: OPAMP
    ac_coupled   True where every signal reaches it through a capacitor
    band         hertz, of the stated signals that reach it; low 0: DC counts
    high_pass    hertz, the corner that coupling capacitors give it
    junction     degrees Celsius at the hottest ambient; `dissipation` W; both of the whole package
    case         the one its heat was judged in
    balance      the four resistors of a difference amplifier, where it is one
    unknown      by part: why it was not worked out
    """

    designator: str
    schematic: str
    device: str
    family: Device | None
    package: str
    topology: str
    use: Use = "linear"
    use_stated: bool = False
    supply: Supply = Supply()
    output: Output
    current: Current = Current()
    inputs: Inputs
    loop: Loop = Loop()
    feedback: Feedback = Feedback()
    allowed: Allowed | None = None
    dissipation: float | None = None
    dissipation_worst: Range = Range()
    junction: float | None = None
    junction_worst: Range = Range()
    gain: tuple[tuple[str, float], ...] = ()
    transfer: tuple[tuple[str, float], ...] = ()
    transfer_worst: tuple[tuple[str, Range], ...] = ()
    gain_worst: tuple[tuple[str, Range], ...] = ()
    after: tuple[str, ...] = ()
    generic: bool = False
    ac_coupled: bool = False
    band: Range = Range()
    high_pass: float | None = None
    high_pass_worst: Range = Range()
    filter: Filter | None = None
    case: Case | None = None
    balance: Balance | None = None
    unknown: Mapping[Part, Unknown] = {}
    location: Location | None = None


class Unrecognised(msgspec.Struct, frozen=True):
    """A device on the netlist that was not taken for an op-amp.

    sort     "unknown" where nobody knows the name, else what it is: comparator, reference, ...
    pins     how many nets its card has
    nearest  the nearest name of the catalogue, or ""
    """

    designator: str
    name: str
    sort: str
    pins: int
    nearest: str = ""
    location: Location | None = None


class Loaded(msgspec.Struct, frozen=True, kw_only=True):
    """A stated load behind resistors: what it gets, V, and the designators that drive it."""

    net: str
    volts: Range
    drivers: tuple[str, ...]


class Design(msgspec.Struct, frozen=True, kw_only=True):
    """Everything the rules may look at.

    loads    stated loads with a limit of their own that stand on no output, but behind one

    bridges  designators of the resistors of sensor bridges: no parts off the shelf
    """

    circuit: Circuit
    settings: Settings
    kind: Kind
    kind_reason: str
    rails: tuple[Rail, ...]
    packages: tuple[Package, ...]
    stages: tuple[Stage, ...]
    loads: tuple[Loaded, ...] = ()
    unrecognised: tuple[Unrecognised, ...] = ()
    bridges: frozenset[str] = frozenset()
    problems: tuple[Problem, ...] = ()
    remarks: tuple[Remark, ...] = ()
