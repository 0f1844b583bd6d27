"""What goes round a stage: its feedback network, its loop, and the filter or difference it makes.

Plain frozen values; nothing here computes. SI units; None: not worked out.
"""

from typing import Literal

import msgspec

from railguard.analysis.bound import Range


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
    source     resistors of a bare divider that the reference comes from, else none; `source_ohms`
               stand in series with `fellow`, ohm, the resistor at the reference, and
               `source_farads` from there to a return
    """

    elements: tuple[str, ...]
    gain: float
    tolerance: float
    stated: bool
    reference: float = 0.0
    sense: str = ""
    source: tuple[str, ...] = ()
    source_ohms: float = 0.0
    source_farads: float = 0.0
    fellow: float = 0.0


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
    least_ohms  output resistance that common practice takes at least, which the upper of the
                margins rests on: none is listed, and a capacitor hangs on it; None: none taken
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
    least_ohms: float | None = None
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
