"""The circuit solved: operating point, ranges, loops, passive view, all in one value."""

from collections.abc import Mapping
from types import MappingProxyType

import msgspec
import numpy as np

from railguard.analysis.available import output_reach
from railguard.analysis.boost import boosted
from railguard.analysis.closing import Closing
from railguard.analysis.corners import Nuisance, Spread, spread
from railguard.analysis.dcpaths import DcMap
from railguard.analysis.deviations import Off, off_of
from railguard.analysis.equations import Real
from railguard.analysis.lined import Boost
from railguard.analysis.lined import Part as Boostable
from railguard.analysis.loops import (
    OPEN_BETA,
    LoopSweep,
    Margin,
    conducting,
    local_betas,
    small_signal,
    sweep,
)
from railguard.analysis.margins import known_parasitics, margins_of
from railguard.analysis.network import Network
from railguard.analysis.oscillators import Oscillators, oscillators
from railguard.analysis.rails import rail_tolerance
from railguard.analysis.ranges import Answers, Clamp, quantity_at, standing_levels
from railguard.analysis.recognise import Amplifier
from railguard.analysis.sampling import Sampled, monte_carlo
from railguard.analysis.signals import Prepared
from railguard.analysis.solve import Factor, factor, return_ratios
from railguard.analysis.stamping import open_loop_gain
from railguard.analysis.supplies import Feed
from railguard.analysis.surroundings import (
    MID_HERTZ,
    Passive,
    Ways,
    load_capacitance,
    passive_view,
)
from railguard.analysis.thermal import bias_current, offset_current
from railguard.analysis.uses import charges_itself
from railguard.circuit.model import GROUND, Element, Model
from railguard.settings.model import Settings
from railguard.words import Use


class Options(msgspec.Struct, frozen=True):
    """How the corners of tolerance are worked out.

    exact    solve each corner anew instead of following the sensitivities to it
    samples  Monte Carlo samples to draw beside it; 0: none
    seed     same seed, same samples
    """

    exact: bool = False
    samples: int = 0
    seed: int = 1


class Solution(msgspec.Struct, frozen=True, kw_only=True):
    """Everything the stages are read from.

    forced   amplifiers without a working loop: their output stands at either limit
    margins  phase margin by amplifier; closings: where its loop closes, with the ends of both
    loop_network, off  the network the loops are looked at in, and what moves them
    through  amplifiers whose feedback runs through diodes: its sign is known, their range is not
    turning  amplifiers of circuits that move by themselves
    boost    transistors that are followed, and what they are to the amplifiers
    """

    prepared: Prepared
    amplifiers: tuple[Amplifier, ...]
    answers: Answers
    passive: Passive
    ways: Ways
    dc_map: DcMap
    swept: LoopSweep
    forced: frozenset[str]
    through: frozenset[str]
    turning: Oscillators
    margins: Mapping[str, Margin]
    closings: Mapping[str, Closing]
    loop_network: Network
    off: Off
    spread: Spread
    mid: Factor
    tops: tuple[float, ...]
    boost: Boost = Boost()
    exact: bool = False
    sampled: Sampled | None = None


def solve(
    prepared: Prepared,
    amplifiers: tuple[Amplifier, ...],
    feeds: Mapping[str, Feed],
    settings: Settings,
    exempt: frozenset[str] = frozenset(),
    clamps: Mapping[str, Clamp] = MappingProxyType({}),
    options: Options | None = None,
    models: Mapping[str, Model] = MappingProxyType({}),
) -> Solution:
    """Solve a circuit, or a part of one.

    exempt   designators that have no default tolerance
    clamps   outputs that cannot follow: each is held to what it reaches, at its own frequency
    options  how the corners are worked out
    models   of the deck, by lower-cased name

    Raises  SolveError
    """
    known = known_parasitics(amplifiers)
    elements, bent = small_signal(prepared.elements)
    network = Network(prepared.elements, amplifiers, extra=known)
    loop_network = Network(elements, amplifiers, extra=known) if bent else network
    signs = return_ratios(loop_network, np.zeros(1))[0].real
    passive = passive_view(network)
    uses = {a.designator: use for a in amplifiers if (use := stated_use(a, settings)) is not None}
    latched = _latched(amplifiers, uses, passive)
    if latched and len(latched) < len(amplifiers) and (signs < 0).any():
        without = loop_network.again(frozenset(latched), known)
        rest = return_ratios(without, np.zeros(1))[0].real
        own = (latched.get(a.designator) for a in amplifiers)
        signs = np.array([r if t is None else t for r, t in zip(rest, own, strict=True)])
    ways = Ways(prepared.elements, amplifiers)
    turning = oscillators(elements, amplifiers, ways, prepared, uses)
    relaxing = {a.designator for a in amplifiers if charges_itself(a, ways)}
    forced = _without_loop(amplifiers, signs, settings) | frozenset(clamps) | relaxing | turning.all
    if forced:
        network = network.again(forced, known)
        loop_network = loop_network.again(forced, known) if bent else network
    draws = _quiescent(amplifiers, feeds)
    held: dict[str, Clamp] = {}
    if forced:
        levels = standing_levels(network, amplifiers, prepared, draws)
        held = {**_limits(amplifiers, levels, forced), **clamps}
    part = Boostable(network, amplifiers, prepared, draws, held, known, models)
    network, answers, boost = boosted(part, bent)
    tops = tuple(sorted({t.top for t in prepared.tones if t.top > 0}))
    if boost.working:
        # What was found to work has its own numbers in the loops too.
        rest = tuple(e for e in elements if e.designator.partition(" ")[0] not in boost.names)
        loop_network = Network((*rest, *boost.lines), amplifiers, forced, known)
        lined = return_ratios(loop_network, np.zeros(1))[0].real
        signs = np.where([a.designator in forced for a in amplifiers], signs, lined)
    signs, through = _through_diodes(elements, amplifiers, signs)
    swept = sweep(loop_network, tops, signs)
    if network is not passive.of:
        passive = passive_view(network)
    local = local_betas(passive.network, swept, amplifiers)
    swept = msgspec.structs.replace(swept, local=local) if local else swept
    options = options or Options()
    spread_of = _spread(answers, prepared, amplifiers, feeds, settings, exempt, boost)
    off = off_of(loop_network, spread_of.shares)
    charged = frozenset(a.designator for a in amplifiers if load_capacitance(a, ways))
    margins, closing = margins_of(swept, loop_network, off, charged)
    return Solution(
        exact=options.exact,
        sampled=monte_carlo(answers, spread_of, options.samples, options.seed)
        if options.samples
        else None,
        prepared=prepared,
        amplifiers=amplifiers,
        answers=answers,
        passive=passive,
        ways=ways,
        dc_map=DcMap(prepared.elements, amplifiers, _stated(prepared, feeds, settings)),
        swept=swept,
        forced=forced,
        through=through,
        turning=turning,
        margins=margins,
        closings=closing,
        loop_network=loop_network,
        off=off,
        spread=spread_of,
        mid=factor(network, MID_HERTZ),
        tops=tops,
        boost=boost,
    )


def _through_diodes(
    elements: tuple[Element, ...], amplifiers: tuple[Amplifier, ...], signs: Real
) -> tuple[Real, frozenset[str]]:
    """Give open loops the sign their diodes give them once they conduct (rectifiers, limiters)."""
    gains = np.array([open_loop_gain(a) for a in amplifiers])
    is_open = np.abs(signs) / gains < OPEN_BETA
    if not is_open.any() or not any(e.kind == "D" for e in elements):
        return signs, frozenset()
    network = Network(conducting(elements), amplifiers)
    conducted = return_ratios(network, np.zeros(1))[0].real
    closed = is_open & (np.abs(conducted) / gains >= OPEN_BETA)
    names = frozenset(a.designator for a, c in zip(amplifiers, closed, strict=True) if c)
    return np.where(closed, conducted, signs), names


def _latched(
    amplifiers: tuple[Amplifier, ...], uses: Mapping[str, Use], passive: Passive
) -> dict[str, float]:
    """Return A*beta of the amplifiers that stand at a limit: their own network alone says so.

    They amplify nothing there. The loops of all others, which their gain would turn round over the
    resistance of a common rail, are to be looked at without them.
    """
    found = {}
    for amplifier in amplifiers:
        branch = passive.network.outputs.get(amplifier.designator, -1)
        if branch < 0:
            continue
        rows = [passive.network.row(amplifier.minus), passive.network.row(amplifier.plus)]
        minus, plus = (
            float(passive.dc.adjoint([row])[0, branch].real) if row >= 0 else 0.0 for row in rows
        )
        meant = uses.get(amplifier.designator) in ("comparator", "oscillator")
        if meant or plus - minus > OPEN_BETA:
            found[amplifier.designator] = (minus - plus) * open_loop_gain(amplifier)
    return found


def _without_loop(
    amplifiers: tuple[Amplifier, ...], signs: Real, settings: Settings
) -> frozenset[str]:
    forced = set()
    for amplifier, a_beta in zip(amplifiers, signs, strict=True):
        use = stated_use(amplifier, settings)
        if use in ("comparator", "oscillator") or a_beta / open_loop_gain(amplifier) < OPEN_BETA:
            forced.add(amplifier.designator)
    return frozenset(forced)


def stated_use(amplifier: Amplifier, settings: Settings) -> Use | None:
    """Return what the user says a stage is meant to be."""
    for name in (amplifier.designator, amplifier.schematic):
        if name in settings.uses:
            return settings.uses[name]
    return None


def _quiescent(amplifiers: tuple[Amplifier, ...], feeds: Mapping[str, Feed]) -> dict[str, float]:
    """Return the quiescent current each rail gives, A; positive is taken from the net.

    Every rail that something holds is in it: the outputs' currents come from there too.
    """
    draws: dict[str, float] = {}
    for amplifier in amplifiers:
        device = amplifier.match.device
        amps = (device.supply_current.typical if device is not None else None) or 0.0
        if not amplifier.has_supply:
            continue
        for net, sign in ((amplifier.positive, 1.0), (amplifier.negative, -1.0)):
            if net != GROUND and net in feeds and feeds[net].held:
                draws[net] = draws.get(net, 0.0) + sign * amps
    return draws


def _limits(
    amplifiers: tuple[Amplifier, ...], levels: Real, forced: frozenset[str]
) -> dict[str, Clamp]:
    """Return middle and half range of each forced output, V: its limits on its rails, unloaded.

    levels  DC value of every quantity
    """
    held: dict[str, Clamp] = {}
    for k, amplifier in enumerate(amplifiers):
        if amplifier.designator not in forced or not amplifier.has_supply:
            continue
        positive = float(levels[quantity_at(k, "positive")])
        negative = float(levels[quantity_at(k, "negative")])
        device = amplifier.match.device
        if positive <= negative:
            continue
        ends = []
        for upper in (True, False):
            reach = output_reach(device, positive, negative, upper, lambda _volts: 0.0)
            found = reach.typical if reach.typical is not None else reach.guaranteed
            ends.append(found if found is not None else (positive if upper else negative))
        held[amplifier.designator] = Clamp(sum(ends) / 2, abs(ends[0] - ends[1]) / 2)
    return held


def _stated(prepared: Prepared, feeds: Mapping[str, Feed], settings: Settings) -> set[str]:
    """Return the nets whose potential somebody states."""
    nets = set(settings.nets) | {f.net for f in feeds.values() if f.held}
    nets |= {f.at for f in feeds.values() if f.held and f.at}
    nets |= {net for signal in settings.signals for net in (signal.between or (signal.name,))}
    nets |= {
        net
        for element in prepared.elements
        if element.kind in ("V", "battery") and GROUND in element.nets[:2]
        for net in element.nets[:2]
    }
    return nets


def _spread(
    answers: Answers,
    prepared: Prepared,
    amplifiers: tuple[Amplifier, ...],
    feeds: Mapping[str, Feed],
    settings: Settings,
    exempt: frozenset[str],
    boost: Boost,
) -> Spread:
    rails = {name: (volts, share, False) for name, (volts, share) in boost.spread.items()}
    volts = {d.injection: d.value for d in prepared.levels}
    holders = {
        net: e.designator
        for e in prepared.elements
        if e.kind in ("V", "battery") and GROUND in e.nets[:2]
        for net in e.nets[:2]
        if net != GROUND
    }
    for feed in feeds.values():
        names = {feed.source, holders.get(feed.at, ""), *_chain(feed, prepared)}
        share, stated = rail_tolerance(feed, settings)
        for name in names:
            if name in volts:
                rails[name] = (volts[name], share, stated)
    for net, level in settings.nets.items():
        name = holders.get(net, "")
        if name in volts and level.tolerance is not None:
            rails[name] = (volts[name], level.tolerance, True)
    nuisances = {}
    for amplifier in amplifiers:
        device = amplifier.match.device
        if device is not None:
            nuisances[amplifier.designator] = Nuisance(
                device.offset_voltage.best or 0.0,
                bias_current(device, settings),
                offset_current(device, settings),
            )
    return spread(answers, prepared.elements, exempt, settings.tolerances, rails, nuisances)


def _chain(feed: Feed, prepared: Prepared) -> set[str]:
    """Return the sources stacked behind a rail's own: a split supply on top of a battery."""
    chain: set[str] = set()
    by_net: dict[str, list[tuple[str, str]]] = {}
    for element in prepared.elements:
        if element.kind in ("V", "battery"):
            a, b = element.nets[:2]
            by_net.setdefault(a, []).append((element.designator, b))
            by_net.setdefault(b, []).append((element.designator, a))
    queue, seen = [feed.at], {feed.at, GROUND}
    while queue:
        for name, other in by_net.get(queue.pop(), ()):
            chain.add(name)
            if other not in seen:
                seen.add(other)
                queue.append(other)
    return chain
