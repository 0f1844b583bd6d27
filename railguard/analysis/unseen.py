"""What the netlist does not tell, and which numbers that spoils.

A net that leaves the sheet may take or bring any current; a small-signal probe states no
amplitude; a conducting diode or a transistor follows no straight line. Each is an injection into
the solved circuit: a quantity it does not move stays known, one it moves at DC has no number, one
it moves only at signal frequencies keeps its DC number and is listed as not checked.
"""

import re
from collections.abc import Iterable

import msgspec
import numpy as np

from railguard.analysis.dcpaths import is_linear, leaves_sheet
from railguard.analysis.equations import Complex, Real
from railguard.analysis.lined import Boost
from railguard.analysis.network import Network
from railguard.analysis.ranges import QUANTITIES, Answers
from railguard.analysis.recognise import Amplifier
from railguard.analysis.signals import Unstated
from railguard.analysis.solve import Factor
from railguard.circuit.model import Circuit, Element
from railguard.settings.model import Settings

VOLTS_PER_VOLT = 1e-4
"""A transfer below this is no influence."""
VOLTS_PER_AMPERE = 10.0
"""A net moves by less than 10 mV per milliampere: it is held."""
AMPERES_PER_AMPERE = 1e-3
FORWARD_VOLTS = 0.3
"""Below this a silicon diode's current is microamperes: common practice, no source."""
BREAKDOWN_VOLTS = 2.0
_ZENER = re.compile(
    r"(?i)(BZ[VXT]|1N47\d\d|1N52\d\d|MMSZ|ZENER|ZPD|SMBJ|TVS|LM4040|LM385|TL431|REF)"
)


class Unseen(msgspec.Struct, frozen=True, kw_only=True):
    """One thing the netlist does not tell.

    sort  "signal" (no amplitude stated), "load" (the net leaves the sheet), "bend" (follows no
          straight line) or "floating" (nothing sets its DC level)
    rows  (row, sign) entries of b for one unit of it
    volts True: the unit is a volt; False: an ampere
    net   where it acts
    """

    sort: str
    why: str
    add: str
    rows: tuple[tuple[int, float], ...]
    volts: bool
    net: str


class Spoiled(msgspec.Struct, frozen=True):
    """Which unseen things move a quantity: at DC, and at signal frequencies only."""

    dc: tuple[Unseen, ...]
    ac: tuple[Unseen, ...]


def unseen_things(
    circuit: Circuit,
    elements: Iterable[Element],
    own: frozenset[str],
    unstated: Iterable[Unstated],
    settings: Settings,
    answers: Answers,
    boost: Boost,
) -> tuple[Unseen, ...]:
    """Collect everything the netlist does not tell about a solved circuit.

    own    designators of the amplifiers' cards
    boost  the transistors that were followed: they are seen
    """
    network = answers.network
    found: list[Unseen] = []
    for item in unstated:
        if item.injection in network.injections:
            row = network.injections[item.injection].row
            rows = ((row, 1.0),) if row >= 0 else ()
            found.append(
                Unseen(
                    sort="signal", why=item.what, add=item.add, rows=rows, volts=True, net=item.net
                )
            )
    told = {load.net for load in settings.loads} | set(settings.nets)
    told |= {net for signal in settings.signals for net in (signal.between or (signal.name,))}
    for element in elements:
        if element.designator in own or not element.fitted:
            continue
        if element.kind == "D":
            found += _diode(element, circuit, answers)
        elif element.kind in ("Q", "J", "M"):
            if element.designator not in boost.names:
                found += _transistor(element, network, boost.left.get(element.designator, ""))
        elif element.kind in ("B", "E", "G", "F", "H") and not is_linear(element):
            found += _expression(element, network, told)
        elif leaves_sheet(element):
            found += _leaving(element, network, told)
    return (*found, *_floating(network))


def swinging(
    names: frozenset[str], amplifiers: Iterable[Amplifier], answers: Answers
) -> tuple[Unseen, ...]:
    """Return the outputs of oscillators whose amplitude is not known."""
    return tuple(
        Unseen(
            sort="bend",
            why=f"the amplitude of the oscillator {a.schematic} is not followed",
            add="--engine ngspice",
            rows=((answers.network.injections[a.designator].row, 1.0),),
            volts=True,
            net=a.output,
        )
        for a in amplifiers
        if a.designator in names and a.designator in answers.network.injections
    )


def _expression(element: Element, network: Network, told: set[str]) -> list[Unseen]:
    """Return a source whose relation is more than a plain factor; what is stated needs none."""
    nets = [net for net in dict.fromkeys(element.nets[:2]) if net not in told]
    injection = network.injections.get(element.designator)
    if injection is not None and injection.row >= 0:
        rows: tuple[tuple[int, float], ...] = ((injection.row, 1.0),)
    else:
        rows = tuple((row, 1.0) for net in nets if (row := network.row(net)) >= 0)[:1]
    if not rows or not nets:
        return []
    return [
        Unseen(
            sort="bend",
            why=f"{element.designator} is an expression the built-in solver does not work out",
            add=f'[nets] "{nets[0]}", or --engine ngspice',
            rows=rows,
            volts=injection is not None,
            net=nets[0],
        )
    ]


def _floating(network: Network) -> list[Unseen]:
    """Return the inputs that nothing holds at DC: they have no level to be worked out."""
    inputs = dict.fromkeys(
        net for a in network.amplifiers for net in (a.plus, a.minus) if net in network.floating
    )
    return [
        Unseen(
            sort="floating",
            why=f"net {net} has no DC path, so nothing sets its level",
            add=f"a resistor from {net} to a defined level",
            rows=((network.row(net), 1.0),),
            volts=False,
            net=net,
        )
        for net in inputs
    ]


def _leaving(element: Element, network: Network, told: set[str]) -> list[Unseen]:
    found = []
    for net in dict.fromkeys(element.nets):
        row = network.row(net)
        if row < 0 or net in told:
            continue
        found.append(
            Unseen(
                sort="load",
                why=_leaves(net, element),
                add=f'[signals] "{net}" or [loads] "{net}"',
                rows=((row, 1.0),),
                volts=False,
                net=net,
            )
        )
    return found


def _leaves(net: str, element: Element) -> str:
    """Say where a net goes that is not followed."""
    if element.kind in ("S", "W"):
        return (
            f"net {net} goes to the switch {element.designator}, whose position the netlist does "
            "not tell"
        )
    if element.kind in ("X", "ic", "opaque"):
        return f"net {net} goes to {element.designator}, which is not worked out"
    return f"net {net} leaves the sheet at {element.designator}"


def _across(answers: Answers, a: str, b: str) -> tuple[float, float]:
    """Return the lowest and highest voltage between two nets over levels and tones."""
    network = answers.network
    rows = (network.row(a), network.row(b))

    def difference(x: Complex | Real) -> complex:
        first = x[rows[0]] if rows[0] >= 0 else 0.0
        second = x[rows[1]] if rows[1] >= 0 else 0.0
        return complex(first - second)

    level = difference(answers.x).real
    peak = sum(
        max((abs(difference(w.x)) for w in tone.worst), default=0.0) for tone in answers.tones
    )
    return level - peak, level + peak


def _diode(element: Element, circuit: Circuit, answers: Answers) -> list[Unseen]:
    if len(element.nets) < 2:
        return []
    anode, cathode = element.nets[:2]
    lowest, highest = _across(answers, anode, cathode)
    breakdown = _breakdown(element, circuit)
    if highest < FORWARD_VOLTS and (breakdown is None or -lowest < breakdown):
        return []
    network = answers.network
    rows = tuple(
        (row, sign)
        for row, sign in ((network.row(anode), -1.0), (network.row(cathode), 1.0))
        if row >= 0
    )
    return [
        Unseen(
            sort="bend",
            why=f"it rests on {element.designator}, which conducts",
            add="--engine ngspice",
            rows=rows,
            volts=False,
            net=anode,
        )
    ]


def _breakdown(element: Element, circuit: Circuit) -> float | None:
    model = circuit.models.get(element.model.lower())
    if model is not None and "bv" in model.parameters:
        return 0.9 * model.parameters["bv"]
    return BREAKDOWN_VOLTS if _ZENER.search(element.model) else None


def _transistor(element: Element, network: Network, why: str) -> list[Unseen]:
    return [
        Unseen(
            sort="bend",
            why=f"it rests on the transistor {element.designator}" + (f", {why}" if why else ""),
            add="--engine ngspice",
            rows=((network.row(net), 1.0),),
            volts=False,
            net=net,
        )
        for net in dict.fromkeys(element.nets[:3])
        if network.row(net) >= 0
    ]


def spoiled(answers: Answers, things: tuple[Unseen, ...], mid: Factor | None) -> list[Spoiled]:
    """Return, for each quantity, what it is moved by.

    mid  factor at a signal frequency; None where nothing is frequency dependent
    """
    rows = [int(r) for r in answers.rows]
    if not things:
        return [Spoiled((), ()) for _ in rows]
    dc = answers.dc.adjoint(rows)
    ac = dc if mid is None else mid.adjoint(rows)
    moved_dc = _moved(dc, things)
    # What has no DC path moves freely at DC only; at signal frequencies its capacitors hold it.
    moved_ac = _moved(ac, things) & np.array([t.sort != "floating" for t in things])
    # Quantities of one part are moved by the same things, mostly: each set is listed once.
    known: dict[tuple[bytes, bytes], Spoiled] = {}
    result = []
    for at_dc, at_ac in zip(moved_dc, moved_ac & ~moved_dc, strict=True):
        key = at_dc.tobytes(), at_ac.tobytes()
        if key not in known:
            known[key] = Spoiled(
                tuple(things[k] for k in np.flatnonzero(at_dc)),
                tuple(things[k] for k in np.flatnonzero(at_ac)),
            )
        result.append(known[key])
    return result


def _moved(
    adjoint: Complex, things: tuple[Unseen, ...]
) -> np.ndarray[tuple[int, int], np.dtype[np.bool_]]:
    total = np.zeros((len(adjoint), len(things)), dtype=np.complex128)
    # A thing has one or two entries: the first of all of them at once, then the second.
    for turn in range(max(len(thing.rows) for thing in things)):
        which = [k for k, thing in enumerate(things) if len(thing.rows) > turn]
        rows, signs = zip(*(things[k].rows[turn] for k in which), strict=True)
        total[:, which] += adjoint[:, rows] * np.array(signs)
    effect = np.abs(total)
    width = len(QUANTITIES)
    is_current = np.arange(len(adjoint)) % width == QUANTITIES.index("current")
    volts = np.array([t.volts for t in things])
    threshold = np.where(
        volts[None, :],
        np.where(is_current[:, None], VOLTS_PER_VOLT * 1e-4, VOLTS_PER_VOLT),
        np.where(is_current[:, None], AMPERES_PER_AMPERE, VOLTS_PER_AMPERE),
    )
    return np.asarray(effect > threshold)
