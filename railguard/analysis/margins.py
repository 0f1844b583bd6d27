"""Phase margins with what a data sheet lists, and their bounds where it does not list all.

The bounds are margins too, each with a figure that common practice takes for what is not listed: at
most, so that the margin is at least so good; at least, so that it is no better.
"""

from collections.abc import Collection, Iterable, Mapping

import msgspec
import numpy as np

from railguard.analysis.closing import Closing, Seen, closings
from railguard.analysis.deviations import Off
from railguard.analysis.loops import LoopSweep, Margin, crossing, phase_margin
from railguard.analysis.network import Network
from railguard.analysis.recognise import Amplifier
from railguard.analysis.solve import return_ratios
from railguard.analysis.stamping import Parasitics

POINTS_A_DECADE = 8
"""Points near a crossover that what is not listed may shift."""
SURE_DEGREES = 5.0
"""A phase margin is given where what is not listed moves it by less than this."""
LARGEST_INPUT_FARADS = 20e-12
LARGEST_OUTPUT_OHMS = 200.0
"""What an unlisted input capacitance and output resistance may be at most: common practice."""
LEAST_OUTPUT_OHMS = 10.0
"""What an unlisted output resistance is at least: common practice, no source."""
THERMAL_VOLTS = 26e-3
"""kT/q at room temperature: two emitters that share a current I make kT/q / 2 I of resistance."""
SHIFT_LOW, SHIFT_HIGH = 1e-3, 4.0
"""How far what is not listed may move a crossover: microfarads at an output take it far down."""


def crossover_margins(network: Network, crossovers: Mapping[str, float]) -> dict[str, float]:
    """Return the phase margin of each amplifier in `network`, its crossover found anew near by."""
    if not crossovers:
        return {}
    # One grid for all, so that loops that close near one another share their points.
    steps = {
        step
        for f in crossovers.values()
        for step in range(
            int(np.floor(np.log10(SHIFT_LOW * f) * POINTS_A_DECADE)),
            int(np.ceil(np.log10(SHIFT_HIGH * f) * POINTS_A_DECADE)) + 1,
        )
    }
    hertz = np.array([10.0 ** (step / POINTS_A_DECADE) for step in sorted(steps)])
    ratios = return_ratios(network, hertz)
    margins = {}
    for column, amplifier in enumerate(network.amplifiers):
        near = crossovers.get(amplifier.designator)
        if near is None:
            continue
        beyond = 10.0 ** (1.0 / POINTS_A_DECADE)
        own = (hertz >= near * SHIFT_LOW / beyond) & (hertz <= near * SHIFT_HIGH * beyond)
        f, t = hertz[own], ratios[own, column]
        at = crossing(f, np.abs(t))
        if at is not None:
            margins[amplifier.designator] = phase_margin(f, t, at)
    return margins


def known_parasitics(amplifiers: Iterable[Amplifier]) -> dict[str, Parasitics]:
    """Return what is listed of input capacitance and output resistance."""
    return _parasitics(amplifiers, 0.0, 0.0)


def bounding_parasitics(amplifiers: Iterable[Amplifier]) -> dict[str, Parasitics]:
    """Return the same with the largest values for what is not listed."""
    return _parasitics(amplifiers, LARGEST_INPUT_FARADS, LARGEST_OUTPUT_OHMS)


def easing_ohms(amplifiers: Iterable[Amplifier]) -> dict[str, float]:
    """Return what the output resistances that are not listed are at least, ohm, by designator.

    Ten ohms; less where the device draws so much that its output stage's emitters or sources may
    have less. Where a sheet lists the load the device stands, that is the better answer.
    """
    found = {}
    for amplifier in amplifiers:
        device = amplifier.match.device
        if device is None or device.output_resistance.best is not None:
            continue
        if device.load_capacitance.best is not None:
            continue
        drawn = device.supply_current
        amps = max(drawn.typical or 0.0, drawn.guaranteed or 0.0)
        own = THERMAL_VOLTS / (2 * amps) if amps else LEAST_OUTPUT_OHMS
        found[amplifier.designator] = min(LEAST_OUTPUT_OHMS, own)
    return found


def _parasitics(
    amplifiers: Iterable[Amplifier], farads: float, ohms: float
) -> dict[str, Parasitics]:
    found = {}
    for amplifier in amplifiers:
        device = amplifier.match.device
        if device is None:
            continue
        listed_c = device.input_capacitance.best
        listed_r = device.output_resistance.best
        found[amplifier.designator] = Parasitics(
            farads if listed_c is None else listed_c, ohms if listed_r is None else listed_r
        )
    return found


def margins_of(
    swept: LoopSweep,
    network: Network,
    off: Off,
    charged: Collection[str],
) -> tuple[dict[str, Margin], dict[str, Closing]]:
    """Return phase margins, and where each loop closes with the ends of both, by designator.

    network  in which the loops are looked at
    charged  amplifiers with a capacitor straight at their output
    """
    amplifiers, forced = network.amplifiers, network.forced
    sights = {}
    for k, amplifier in enumerate(amplifiers):
        if amplifier.designator in forced or amplifier.match.device is None:
            continue
        at = crossing(swept.hertz, np.abs(swept.a_beta[:, k]))
        if at is not None:
            sights[k] = at, swept.margin(k, at)
    if not sights:
        return {}, {}
    names = {k: amplifiers[k].designator for k in sights}
    near = {names[k]: at for k, (at, _) in sights.items()}
    bounding = network.again(forced, bounding_parasitics(amplifiers))
    bounds = crossover_margins(bounding, near)
    seen = {
        k: Seen(
            at,
            margin,
            names[k] in bounds and abs(bounds[names[k]] - margin) <= SURE_DEGREES,
        )
        for k, (at, margin) in sights.items()
    }
    eased = easing_ohms(
        amplifiers[k] for k, sight in seen.items() if not sight.sure and names[k] in charged
    )
    tops = _eased(network, eased, near)
    found = closings(network, off, seen)
    margins = {}
    for k, sight in seen.items():
        margin = found[k].margin if k in found else sight.margin
        least, most = bounds.get(names[k]), min(margin, tops.get(names[k], margin))
        margins[names[k]] = Margin(
            margin if sight.sure else None,
            None if least is None else min(most, least),
            most,
            eased.get(names[k]),
        )
    return margins, {names[k]: closing for k, closing in found.items()}


def _eased(
    network: Network, ohms: Mapping[str, float], near: Mapping[str, float]
) -> dict[str, float]:
    """Return the phase margins of some amplifiers with these output resistances."""
    if not ohms:
        return {}
    known = known_parasitics(network.amplifiers)
    known |= {n: msgspec.structs.replace(known[n], output_ohms=r) for n, r in ohms.items()}
    return crossover_margins(network.again(network.forced, known), {n: near[n] for n in ohms})
