"""Each amplifier's own loop: sign, noise gain, bandwidth, phase margin.

The loop is broken at one amplifier with all others active, so outer loops, balanced loops and
composite amplifiers are judged as they work. A transistor inside a loop is taken at its
small-signal sign (follower +, common emitter -): that gives the loop its sign. Its numbers come
from the line of one that is known to work (`analysis.lined`).
"""

from collections.abc import Iterable, Mapping, Sequence
from functools import cached_property

import msgspec
import numpy as np

from railguard.analysis.bound import Range
from railguard.analysis.closing import Bands, Closing, InBand
from railguard.analysis.equations import Complex, Real
from railguard.analysis.loop import Loop
from railguard.analysis.network import Network
from railguard.analysis.recognise import Amplifier
from railguard.analysis.solve import factor, return_ratios
from railguard.analysis.stamping import gain_bandwidth, open_loop_gain
from railguard.circuit.model import Control, Element

OPEN_BETA = 1e-6
"""A feedback factor below this is no feedback: the loop gain of any op-amp is then below one."""
LOWEST_HERTZ = 1.0
POINTS = 41
BASE_OHMS = 1e3
CURRENT_GAIN = 100.0


class LoopSweep(msgspec.Struct, frozen=True, dict=True):
    """Loop transmission of all amplifiers over frequency.

    hertz   shape (frequencies,)
    a_beta  shape (frequencies, amplifiers)
    dc      A*beta at DC, shape (amplifiers,)
    local   by amplifier: its own network's feedback factor at DC and over frequency, where its
            loop also runs through an amplifier that multiplies it
    """

    hertz: Real
    a_beta: Complex
    dc: Real
    local: Mapping[int, tuple[float, Complex]] = {}

    @cached_property
    def phase(self) -> Real:
        """The phase of each loop without jumps, degrees, shape (frequencies, amplifiers)."""
        return _phase(self.a_beta)

    def margin(self, column: int, f: float) -> float:
        """Return `phase_margin` of one amplifier's loop."""
        return 180.0 + _at(self.hertz, self.phase[:, column], f)


class Margin(msgspec.Struct, frozen=True):
    """A phase margin, degrees.

    value  None where it hangs on a figure nobody lists
    least  with the largest values common practice knows for what is not listed
    most   with nothing of it, but for `ohms`
    ohms   the least output resistance taken for `most`, where a capacitor hangs on it; None: none
    """

    value: float | None = None
    least: float | None = None
    most: float | None = None
    ohms: float | None = None


def conducting(elements: Iterable[Element]) -> tuple[Element, ...]:
    """Replace diodes by resistances, so that feedback that runs through them shows its sign."""
    return tuple(
        Element(kind="R", designator=e.designator, nets=e.nets[:2], value=BASE_OHMS)
        if e.kind == "D" and e.fitted and len(e.nets) >= 2
        else e
        for e in elements
    )


def small_signal(elements: Iterable[Element]) -> tuple[tuple[Element, ...], bool]:
    """Replace transistors by what gives a loop its sign; tell whether there were any."""
    result: list[Element] = []
    any_found = False
    for element in elements:
        if element.kind not in ("Q", "J", "M") or len(element.nets) < 3 or not element.fitted:
            result.append(element)
            continue
        any_found = True
        collector, base, emitter = element.nets[:3]
        name = element.designator
        result.append(
            Element(kind="R", designator=f"{name} input", nets=(base, emitter), value=BASE_OHMS)
        )
        result.append(
            Element(
                kind="G",
                designator=f"{name} output",
                nets=(collector, emitter),
                control=Control(gain=CURRENT_GAIN / BASE_OHMS, nets=(base, emitter)),
            )
        )
    return tuple(result), any_found


def open_loop(amplifier: Amplifier, hertz: Real) -> Complex:
    """Return A(f) of one amplifier, shape (frequencies,)."""
    gbw = gain_bandwidth(amplifier)
    inverse = np.full(len(hertz), 1.0 / open_loop_gain(amplifier), dtype=np.complex128)
    if gbw:
        inverse += 1j * hertz / gbw
    return 1.0 / inverse


def _open_loop_at(amplifier: Amplifier, *hertz: float | None) -> list[float | None]:
    """Return |A| at some frequencies; None where one is not known."""
    return [
        None if f is None else float(np.abs(open_loop(amplifier, np.array([f])))[0]) for f in hertz
    ]


def sweep(network: Network, tops: Sequence[float], dc: Real) -> LoopSweep:
    """Sweep all loops up to ten times the fastest amplifier's gain-bandwidth product.

    tops  further frequencies of interest: the tops of the stated bands, hertz
    dc    A*beta at DC, which is worked out before anything is swept, shape (amplifiers,)
    """
    fastest = max((gain_bandwidth(a) or 0.0 for a in network.amplifiers), default=0.0) or 1e6
    grid = np.geomspace(LOWEST_HERTZ, 10 * fastest, POINTS)
    hertz = np.array(sorted({*grid.tolist(), *(t for t in tops if t > 0)}))
    return LoopSweep(hertz=hertz, a_beta=return_ratios(network, hertz), dc=dc)


MULTIPLIED = 1.05
"""A feedback factor above one comes from an amplifier inside the loop: passive networks divide."""


def local_betas(
    passive: Network, swept: LoopSweep, amplifiers: Sequence[Amplifier]
) -> dict[int, tuple[float, Complex]]:
    """Return the feedback factors of the amplifiers' own networks, where an outer loop hides them.

    In a composite amplifier the inner one's loop also runs through the outer one; its noise gain is
    that of its own network all the same.

    passive  the network with every output held
    """
    inner = [
        (column, branch, amplifier)
        for column, amplifier in enumerate(amplifiers)
        if (branch := passive.outputs.get(amplifier.designator)) is not None
        and swept.dc[column] / open_loop_gain(amplifier) > MULTIPLIED
    ]
    if not inner:
        return {}
    hertz = np.concatenate([[0.0], swept.hertz])
    units = np.zeros((passive.size, len(inner)), dtype=np.complex128)
    for place, (_, branch, _) in enumerate(inner):
        units[branch, place] = 1.0
    betas = np.zeros((len(hertz), len(inner)), dtype=np.complex128)
    for step, f in enumerate(hertz):
        x = factor(passive, float(f)).forward(units)
        for place, (_, _, amplifier) in enumerate(inner):
            for net, sign in ((amplifier.minus, 1.0), (amplifier.plus, -1.0)):
                row = passive.row(net)
                betas[step, place] += sign * x[row, place] if row >= 0 else 0.0
    return {
        column: (float(beta[0].real), beta[1:])
        for (column, _, _), beta in zip(inner, betas.T, strict=True)
        if beta[0].real > OPEN_BETA
    }


def crossing(hertz: Real, magnitude: Real) -> float | None:
    """Return the highest frequency at which a magnitude falls through one, hertz; None: never.

    Between two points both axes are taken as logarithmic.
    """
    above = np.flatnonzero((magnitude[:-1] >= 1.0) & (magnitude[1:] < 1.0))
    if not len(above):
        return None
    i = int(above[-1])
    m0, m1 = np.log(magnitude[i]), np.log(max(magnitude[i + 1], 1e-300))
    share = m0 / (m0 - m1) if m0 != m1 else 0.0
    return float(np.exp(np.log(hertz[i]) + share * (np.log(hertz[i + 1]) - np.log(hertz[i]))))


def _at(hertz: Real, values: Real, f: float) -> float:
    return float(np.interp(np.log(f), np.log(hertz), values))


def _phase(a_beta: Complex) -> Real:
    """Return the phase over frequency, the first axis, without jumps, degrees."""
    return np.asarray(np.degrees(np.unwrap(np.angle(a_beta), axis=0)))


def phase_margin(hertz: Real, a_beta: Complex, f: float) -> float:
    """Return 180 degrees plus the loop's phase at `f`, degrees."""
    return 180.0 + _at(hertz, _phase(a_beta), f)


def loop_of(
    amplifier: Amplifier,
    column: int,
    swept: LoopSweep,
    top: float | None,
    margin: Margin,
    closing: Closing | None,
) -> Loop:
    """Return one amplifier's loop, its ends in band left open.

    top     top of the band of the signals that reach it, hertz; None: nothing stated
    """
    beta_dc = float(swept.dc[column]) / open_loop_gain(amplifier)
    if abs(beta_dc) < OPEN_BETA:
        return Loop(dc="open", beta_dc=0.0, band=top)
    if beta_dc < 0:
        return Loop(dc="positive", beta_dc=beta_dc, band=top)
    a = open_loop(amplifier, swept.hertz)
    a_beta = swept.a_beta[:, column]
    magnitude = np.abs(a_beta)
    noise_gain = np.abs(a) / np.maximum(magnitude, 1e-300)
    if column in swept.local:
        beta_dc, beta = swept.local[column]
        noise_gain = 1.0 / np.maximum(np.abs(beta), 1e-300)
    known = gain_bandwidth(amplifier) is not None
    f_cross = crossing(swept.hertz, magnitude) if known else None
    at_cross, at_cross_worst = None, Range()
    if f_cross is not None:
        at_cross = float(np.exp(_at(swept.hertz, np.log(noise_gain), f_cross)))
    if f_cross is not None and closing is not None:
        f_cross = closing.hertz
        if column not in swept.local:
            at_cross, *ends = _open_loop_at(
                amplifier, f_cross, closing.bare_worst.high, closing.bare_worst.low
            )
            at_cross_worst = Range(*ends)
    if top:
        in_band = _at(swept.hertz, noise_gain, max(top, LOWEST_HERTZ))
    elif f_cross is not None:
        in_band = float(np.max(noise_gain[swept.hertz <= f_cross], initial=1.0 / beta_dc))
    else:
        in_band = 1.0 / beta_dc
    return Loop(
        dc="negative",
        beta_dc=beta_dc,
        noise_gain=in_band,
        noise_gain_dc=1.0 / beta_dc,
        noise_gain_crossover=at_cross,
        crossover=f_cross,
        phase_margin=margin.value,
        at_crossover_worst=at_cross_worst,
        crossover_worst=closing.hertz_worst if closing is not None and known else Range(),
        phase_margin_worst=closing.margin_worst if closing is not None else Range(),
        margins=Range(margin.least, margin.most),
        least_ohms=margin.ohms,
        band=top,
        loop_gain=_at(swept.hertz, magnitude, max(top, LOWEST_HERTZ)) if top and known else None,
        points=tuple(
            zip(
                swept.hertz.tolist(),
                noise_gain.tolist(),
                np.abs(a).tolist(),
                swept.phase[:, column].tolist(),
                strict=True,
            )
        )
        if known
        else (),
    )


def with_ends(loop: Loop, own_at_dc: Range, bands: Bands, k: int, *, local: bool) -> Loop:
    """Return a loop with the ends of its noise gain and of its loop gain.

    own_at_dc  of the noise gain at DC, its own network alone
    local      True where an outer loop hides the amplifier's own network: its noise gain has no
               ends beyond those at DC
    """
    if loop.dc != "negative":
        return loop
    at_dc = own_at_dc
    if not local and not _holds(own_at_dc, loop.noise_gain_dc):
        # Other amplifiers have a share in it: each feeds the other's divider, or one holds it.
        held = bands.at(k, 0.0)
        at_dc = held.noise_gain if held is not None else Range()
    hertz = _noise_gain_hertz(loop)
    found = None
    if loop.crossover is not None and hertz is not None:
        found = bands.at(k, hertz)
    ends = found or InBand(Range(), at_dc if hertz is None else Range())
    return msgspec.structs.replace(
        loop,
        noise_gain_worst=at_dc,
        in_band_worst=Range() if local and hertz is not None else ends.noise_gain,
        loop_gain_worst=Range() if loop.loop_gain is None else ends.loop_gain,
    )


def _holds(span: Range, value: float | None) -> bool:
    """Tell whether a range holds a value, but for rounding."""
    if span.low is None or span.high is None or value is None:
        return False
    return span.low * (1 - _ROUNDING) <= value <= span.high * (1 + _ROUNDING)


_ROUNDING = 1e-6


def _noise_gain_hertz(loop: Loop) -> float | None:
    """Return where the noise gain in band was taken; None: at DC."""
    if loop.band:
        return max(loop.band, LOWEST_HERTZ)
    within = [p for p in loop.points if loop.crossover is not None and p[0] <= loop.crossover]
    largest = max(within, key=lambda p: p[1], default=None)
    dc = loop.noise_gain_dc
    if largest is None or dc is None or largest[1] <= dc * _AS_AT_DC:
        return None
    return largest[0]


_AS_AT_DC = 1.001
"""A noise gain that rises by less than this in band is the one at DC."""
