"""Circuits that move by themselves: sine oscillators, relaxation oscillators, function generators.

What is assumed. No stated signal, no probe and no net that leaves the sheet reaches the inputs:
with a signal a stage is an amplifier, and one that would oscillate is a fault. Amplifiers are taken
as ideal (a constant gain): a circuit that is unstable even so was built to be, while a real fault
of stability needs the device's own poles. Then, with the amplifier's loop negative at DC,

- positive feedback at the highest frequency makes a switch (a capacitor on the inverting input, or
  an integrator round a Schmitt trigger): its output stands at either limit;
- positive feedback somewhere between makes a sine oscillator (Wien bridge, phase shift, two
  integrators): its output is taken to reach its limits, unless diodes or transistors stand in its
  loop: those set an amplitude which the built-in solver does not follow;
- a stage whose loop is closed only through a switch is a ramp: its output turns at the switch's
  thresholds, which are not followed either.
"""

from collections.abc import Mapping

import msgspec
import numpy as np

from railguard.analysis.dcpaths import leaves_sheet
from railguard.analysis.equations import Complex, Real
from railguard.analysis.network import Network
from railguard.analysis.recognise import Amplifier
from railguard.analysis.signals import Prepared
from railguard.analysis.solve import return_ratios
from railguard.analysis.stamping import OPEN_LOOP_GAIN
from railguard.analysis.surroundings import Ways
from railguard.circuit.model import GROUND, Element
from railguard.words import Use

LOWEST_HERTZ, HIGHEST_HERTZ, POINTS_A_DECADE = 1e-2, 1e7, 24
"""A Wien bridge a twentieth over its gain of three is positive over a third of a decade only."""
LARGEST_STACK = 500_000
"""Entries of the matrices solved at once: 8 MB."""
LADDER = 3
"""Capacitors it takes to turn a signal round by half a turn."""
_BENDS = frozenset({"D", "Q", "J", "M"})
_STEERED = frozenset({"E", "F", "G", "H", "B"})


class Oscillators(msgspec.Struct, frozen=True):
    """Designators of the amplifiers of circuits that move by themselves.

    switching  their output stands at either limit
    sine       their output swings
    ramps      they charge between the thresholds of a switching one
    unfollowed  sine and ramps whose amplitude something else than the rails sets
    """

    switching: frozenset[str] = frozenset()
    sine: frozenset[str] = frozenset()
    ramps: frozenset[str] = frozenset()
    unfollowed: frozenset[str] = frozenset()

    @property
    def all(self) -> frozenset[str]:
        """Every amplifier that belongs to one."""
        return self.switching | self.sine | self.ramps


def oscillators(
    elements: tuple[Element, ...],
    amplifiers: tuple[Amplifier, ...],
    ways: Ways,
    prepared: Prepared,
    uses: Mapping[str, Use],
) -> Oscillators:
    """Find the circuits that move by themselves.

    elements  with every transistor replaced by its small-signal sign
    uses      what is stated of amplifiers: any use but oscillator keeps one out
    """
    switched = frozenset(name for name, use in uses.items() if use == "comparator")
    moved = {name for tone in prepared.tones for name, _ in tone.drives}
    moved |= {item.injection for item in prepared.unstated}
    # A signal reaches these nets, or may: looked up once, a rail has many neighbours.
    reached = {
        net
        for net, near in ways.around.items()
        if any(e.designator in moved for e in near)
        or (net not in ways.held and any(map(leaves_sheet, near)))
    }
    by_output = {a.output: a for a in amplifiers}
    around = {
        a.designator: _surroundings(a, by_output, ways, reached)
        for a in amplifiers
        if uses.get(a.designator, "oscillator") == "oscillator"
    }
    alone = {name: found for name, found in around.items() if found is not None}
    if not alone:
        return Oscillators()
    elements, amplifiers = _concerned(alone, elements, amplifiers, ways)
    ideal = [_ideal(a) for a in amplifiers]
    decades = np.log10(HIGHEST_HERTZ / LOWEST_HERTZ)
    swept = np.geomspace(LOWEST_HERTZ, HIGHEST_HERTZ, int(decades * POINTS_A_DECADE))
    hertz = np.array([0.0, *swept.tolist()])
    network = Network(elements, ideal, switched)
    ratios = _swept(network, hertz)
    switching = set()
    sine = {name for name, use in uses.items() if use == "oscillator" and name in alone}
    for k, amplifier in enumerate(amplifiers):
        if amplifier.designator not in alone or ratios[0, k].real <= 1.0:
            continue
        if ratios[-1, k].real < -1.0:
            switching.add(amplifier.designator)
            sine.discard(amplifier.designator)
        elif _turns_round(ratios[:, k]):
            sine.add(amplifier.designator)
    if not switching and not sine:
        return Oscillators()
    still = return_ratios(network.again(switched | switching), np.zeros(1))[0].real
    ramps = frozenset(
        a.designator
        for k, a in enumerate(amplifiers)
        if a.designator in alone and abs(ratios[0, k].real) > 1.0 > abs(still[k])
    ) - frozenset(switching)
    bent = {n for n in sine if any(e.kind in _BENDS for e in alone[n].met)}
    return Oscillators(frozenset(switching), frozenset(sine) - ramps, ramps, ramps | bent)


class _Loop(msgspec.Struct, frozen=True):
    """What an amplifier's inputs hang on: elements met, and the amplifiers whose outputs were."""

    met: tuple[Element, ...]
    through: frozenset[str]


def _concerned(
    alone: Mapping[str, _Loop],
    elements: tuple[Element, ...],
    amplifiers: tuple[Amplifier, ...],
    ways: Ways,
) -> tuple[tuple[Element, ...], tuple[Amplifier, ...]]:
    """Return what the loops in question consist of: a large circuit is not swept for a small loop.

    Where a controlled source is about, its control may lie anywhere, so everything counts.
    """
    cards = {id(a.element) for a in amplifiers}
    if any(
        e.kind in _STEERED and id(e) not in cards and not e.designator.endswith(" output")
        for e in elements
    ):
        return elements, amplifiers
    names = set(alone).union(*(loop.through for loop in alone.values()))
    inner = tuple(a for a in amplifiers if a.designator in names)
    met = {id(e): e for loop in alone.values() for e in loop.met}
    nets = {net for e in met.values() for net in e.nets}
    nets |= {net for a in inner for net in (a.plus, a.minus)}
    for net in nets & ways.held:
        met |= {id(e): e for e in ways.around.get(net, ()) if e.kind in ("V", "battery")}
    bent = {e.designator.partition(" ")[0] for e in met.values() if e.kind in _BENDS}
    return tuple(
        e for e in elements if id(e) in met or e.designator.partition(" ")[0] in bent
    ), inner


def _ideal(amplifier: Amplifier) -> Amplifier:
    match = msgspec.structs.replace(amplifier.match, device=None)
    return msgspec.structs.replace(amplifier, match=match, gain=OPEN_LOOP_GAIN)


def _swept(network: Network, hertz: Real) -> Complex:
    """Return the loop transmissions, a few frequencies at a time so that the matrices stay small.

    returns  shape (frequencies, amplifiers)
    """
    step = max(1, LARGEST_STACK // max(network.size, 1) ** 2)
    parts = [return_ratios(network, hertz[i : i + step]) for i in range(0, len(hertz), step)]
    return np.concatenate(parts)


def _turns_round(ratio: Complex) -> bool:
    """Tell whether a loop transmission crosses the negative real axis beyond -1."""
    below = (ratio.real[:-1] < -1.0) & (ratio.real[1:] < -1.0)
    return bool(np.any(below & (np.sign(ratio.imag[:-1]) != np.sign(ratio.imag[1:]))))


def _surroundings(
    amplifier: Amplifier, by_output: Mapping[str, Amplifier], ways: Ways, reached: set[str]
) -> _Loop | None:
    """Return what reaches an amplifier's inputs, through others too; None where it cannot turn.

    It cannot where a signal reaches it, without a capacitor, and where its output comes back only
    to its inverting input through less than three of them.

    by_output  amplifiers by the net they drive
    reached    nets that a source which changes, or may, is on
    """
    seen = {amplifier.plus, amplifier.minus}
    queue = list(seen)
    met: dict[int, Element] = {}
    through = set()
    while queue:
        at = queue.pop()
        if at == GROUND:
            continue
        if at in reached:
            return None
        around = ways.around.get(at, ())
        behind = by_output.get(at)
        fresh: set[str] = set()
        if behind is not None:
            through.add(behind.designator)
            fresh = {behind.plus, behind.minus}
        elif at not in ways.held:
            met |= {id(e): e for e in around}
            fresh = {net for e in around for net in e.nets}
        queue += fresh - seen
        seen |= fresh
    capacitors = sum(e.kind == "C" for e in met.values())
    if amplifier.designator not in through or not capacitors:
        return None
    comes_back = len(through) > 1 or ways.shortest(amplifier.output, amplifier.plus) is not None
    if not comes_back and capacitors < LADDER:
        return None
    return _Loop(tuple(met.values()), frozenset(through))
