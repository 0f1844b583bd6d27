"""What the analysis hands to the rules: rails, packages, stages and the design as a whole.

Plain frozen values; nothing here computes. Volts are relative to ground, currents positive,
everything SI. A number that was not worked out is None, and `Stage.unknown` says why.
"""

from collections.abc import Mapping
from typing import Literal

import msgspec

from railguard.circuit.model import Circuit
from railguard.devices.model import Device
from railguard.location import Location
from railguard.notices import Problem, Remark
from railguard.settings.model import Settings
from railguard.words import Basis, Kind, Use


class Range(msgspec.Struct, frozen=True):
    """The lowest and the highest value of a quantity."""

    low: float | None = None
    high: float | None = None

    @property
    def span(self) -> float | None:
        """Width of the range."""
        return None if self.low is None or self.high is None else self.high - self.low


class Pair(msgspec.Struct, frozen=True):
    """A demand and the limit it meets, at one corner of the tolerances."""

    demand: float
    limit: float


class Bound(msgspec.Struct, frozen=True, kw_only=True):
    """One side of one quantity, and everything that stands against it.

    upper        True: demand must stay below the limits; False: above them
    demand       nominal
    level        the DC level alone, nominal
    span         of the whole demanded range (both sides)
    typical      the typical limit
    guaranteed   what the data sheet guarantees
    absolute     the rail itself, or an absolute maximum; `absolute_basis` where it came from
    stated       demand and guaranteed limit at the worst corner of tolerances the user stated
    default      the same with default tolerances, offset and bias added
    typical_basis, guaranteed_basis   where each limit came from
    demand_basis  where the demand came from, the least trusted of its parts
    culprits     designators that move the corner most, worst first
    condition    the load, current or supply the limit was taken at, in words
    unsure       how far the demand may be off by what is assumed: less beyond a limit is no proof
    """

    upper: bool
    demand: float | None = None
    level: float | None = None
    span: float | None = None
    typical: float | None = None
    guaranteed: float | None = None
    absolute: float | None = None
    stated: Pair | None = None
    default: Pair | None = None
    typical_basis: Basis = "catalogue"
    guaranteed_basis: Basis = "catalogue"
    absolute_basis: Basis = "netlist"
    demand_basis: Basis = "netlist"
    culprits: tuple[str, ...] = ()
    condition: str = ""
    unsure: float = 0.0

    @property
    def best(self) -> float | None:
        """The guaranteed limit, or the typical one where none is guaranteed."""
        return self.guaranteed if self.guaranteed is not None else self.typical

    @property
    def best_basis(self) -> Basis:
        """Where `best` came from."""
        return self.guaranteed_basis if self.guaranteed is not None else self.typical_basis


class Capacitor(msgspec.Struct, frozen=True):
    """A capacitor between a rail and another net.

    farads   None where its value is unknown
    to       the net of its other end
    behind   designator of a series element between it and the supply pins, or ""
    rating   V, where the card states one
    reversed  True where the card states a polarity and the level is the other way round
    """

    designator: str
    farads: float | None
    to: str
    behind: str = ""
    rating: float | None = None
    reversed: bool = False
    location: Location | None = None


class Rail(msgspec.Struct, frozen=True, kw_only=True):
    """A net that feeds supply pins.

    sign        "positive" or "negative": the pins it feeds
    level       volts; None: nothing states it
    worst       with the rail's tolerance
    basis       where the level came from
    origin      in words: `VP`, `the net's name`, `railguard.toml`
    tolerance   share, and whether the user stated it
    named       the level its name says, where it says one
    returns     nets that count as its return: ground, or the opposite rail where no ground is used
    decoupling  capacitors from the rail to a return
    across      capacitors from the rail to another rail
    packages    designators of packages fed
    ideal       True where an ideal source holds it directly
    series      designators between its source and its pins
    feed        "stated": a level is known; "outside": the net leaves what can be seen; "nothing":
                nothing on it could give it a level
    drop        V lost in `series` at the current its pins draw
    """

    net: str
    sign: Literal["positive", "negative"]
    level: float | None = None
    worst: Range = Range()
    basis: Basis = "netlist"
    origin: str = ""
    tolerance: float = 0.0
    tolerance_stated: bool = False
    named: float | None = None
    returns: tuple[str, ...] = ("0",)
    decoupling: tuple[Capacitor, ...] = ()
    across: tuple[Capacitor, ...] = ()
    upstream: tuple[Capacitor, ...] = ()
    packages: tuple[str, ...] = ()
    ideal: bool = False
    series: tuple[str, ...] = ()
    feed: Literal["stated", "outside", "nothing"] = "outside"
    drop: float | None = None
    location: Location | None = None


class Package(msgspec.Struct, frozen=True, kw_only=True):
    """What is soldered: its channels and the nets of its supply pins."""

    designator: str
    device: str
    family: str
    channels: tuple[str, ...]
    positive: tuple[str, ...]
    negative: tuple[str, ...]
    size: int | None = None
    location: Location | None = None


class Supply(msgspec.Struct, frozen=True, kw_only=True):
    """The rails of one stage, at its pins.

    total_low, total_high  total supply with the rails' tolerances
    """

    positive: float | None = None
    negative: float | None = None
    positive_net: str = ""
    negative_net: str = ""
    basis: Basis = "netlist"
    positive_worst: Range = Range()
    negative_worst: Range = Range()
    tolerance_stated: bool = False
    pins: bool = True

    @property
    def total(self) -> float | None:
        """V+ minus V-."""
        if self.positive is None or self.negative is None:
            return None
        return self.positive - self.negative


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


class Feedback(msgspec.Struct, frozen=True, kw_only=True):
    """The network between output and inverting input.

    elements     designators on the way from the output to the inverting input
    resistance   of that way at DC, ohm; 0 for a wire; None: no DC way
    seen         resistance at the inverting input to AC ground, output counted as ground, ohm
    load         resistance the network is to the output, ohm
    capacitance  across the feedback resistance, F
    current      peak current into the network, A
    """

    elements: tuple[str, ...] = ()
    resistance: float | None = None
    seen: float | None = None
    load: float | None = None
    capacitance: float | None = None
    current: float | None = None


class Balance(msgspec.Struct, frozen=True, kw_only=True):
    """The four resistors of a difference amplifier.

    elements   from the input to the inverting input, back from the output, and their fellows
    gain       of the difference, V/V
    tolerance  sum of the four, as a share; `stated` where each is
    reference  volts the output counts from
    sense      designator of the small resistor, or the source, the two inputs stand across, or ""
    """

    elements: tuple[str, ...]
    gain: float
    tolerance: float
    stated: bool
    reference: float = 0.0
    sense: str = ""


class Loop(msgspec.Struct, frozen=True, kw_only=True):
    """The stage's own loop, all other stages active.

    dc          sign of the feedback at DC
    beta_dc     feedback factor at DC, output to (inverting minus non-inverting input)
    noise_gain  |1/beta| at the top of the stated band, or the largest in band
    crossover   hertz where |A beta| is one: the bandwidth
    phase_margin  degrees; None where it hangs on a figure nobody lists
    band        top of the stated band, hertz
    loop_gain   |A beta| at the top of the band
    points      (hertz, |1/beta|, |A|, phase of A beta in degrees) for drawing
    holds       designators of other stages that hold the DC level where its own loop does not
    bridges     switches and unseen devices that may lead the output back where the loop is open
    noise_gain_worst  of `noise_gain_dc`, at the resistors' tolerances
    in_band_worst, at_crossover_worst  of `noise_gain` and `noise_gain_crossover`, with capacitors
    crossover_worst, phase_margin_worst, loop_gain_worst  with all tolerances, and the least and the
                typical gain-bandwidth product listed; unknown where the nominal figure is
    margins     phase margin with the most and with nothing of what is not listed, degrees
    thresholds  volts of its signal at which a stage with positive feedback switches; of the pin
                where more than one signal moves it
    lower_worst, upper_worst  of each threshold, with resistors, rails and its offset at their ends
    drive       the stated signal at that input, in the terms of `thresholds`
    switched    True where that signal goes well past both: no linear stage could follow it
    """

    dc: Literal["negative", "positive", "open"] | None = None
    beta_dc: float | None = None
    beta_plus: float | None = None
    noise_gain: float | None = None
    noise_gain_dc: float | None = None
    noise_gain_crossover: float | None = None
    crossover: float | None = None
    phase_margin: float | None = None
    noise_gain_worst: Range = Range()
    in_band_worst: Range = Range()
    at_crossover_worst: Range = Range()
    crossover_worst: Range = Range()
    phase_margin_worst: Range = Range()
    loop_gain_worst: Range = Range()
    margins: Range = Range()
    band: float | None = None
    loop_gain: float | None = None
    points: tuple[tuple[float, float, float, float], ...] = ()
    holds: tuple[str, ...] = ()
    bridges: tuple[str, ...] = ()
    capacitor_across_plus: str = ""
    thresholds: Range = Range()
    lower_worst: Range = Range()
    upper_worst: Range = Range()
    drive: Range = Range()
    switched: bool = False
    feeds_linear: bool = False


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


class Filter(msgspec.Struct, frozen=True):
    """A recognised filter stage: hertz, quality factor, magnitude of the gain in its pass band.

    frequency_worst, q_worst, gain_worst  with every part around it at its tolerance
    """

    kind: str
    frequency: float
    q: float
    gain: float = 1.0
    frequency_worst: Range = Range()
    q_worst: Range = Range()
    gain_worst: Range = Range()


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


class Design(msgspec.Struct, frozen=True, kw_only=True):
    """Everything the rules may look at.

    bridges  designators of the resistors of sensor bridges: no parts off the shelf
    """

    circuit: Circuit
    settings: Settings
    kind: Kind
    kind_reason: str
    rails: tuple[Rail, ...]
    packages: tuple[Package, ...]
    stages: tuple[Stage, ...]
    unrecognised: tuple[Unrecognised, ...] = ()
    bridges: frozenset[str] = frozenset()
    problems: tuple[Problem, ...] = ()
    remarks: tuple[Remark, ...] = ()
