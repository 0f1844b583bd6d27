"""A flat circuit to a design: the analysis from beginning to end."""

from collections.abc import Iterable, Mapping

import msgspec

from railguard.analysis.allowed import allowed_inputs
from railguard.analysis.clamping import clamps_of, followers_replaced
from railguard.analysis.kind import kind_of
from railguard.analysis.loaded import loads_of
from railguard.analysis.network import Network
from railguard.analysis.parts import Part, independent, source_levels
from railguard.analysis.rails import packages_of, rails_of
from railguard.analysis.ranges import Clamp
from railguard.analysis.recognise import recognise
from railguard.analysis.signals import Prepared, prepare
from railguard.analysis.singular import explained
from railguard.analysis.solution import Options, Solution, solve
from railguard.analysis.solve import factor
from railguard.analysis.stage import Design, Loaded, Stage, Unrecognised
from railguard.analysis.stages import drafts_of, finished, unsolved
from railguard.analysis.supplies import Feed, feeds, supply_nets
from railguard.analysis.surroundings import MID_HERTZ, bridge_resistors
from railguard.analysis.unseen import spoiled, swinging, unseen_things
from railguard.circuit.model import GROUND, Circuit, Element
from railguard.devices.catalogue import Catalogue
from railguard.errors import SolveError
from railguard.notices import Problem, Remark
from railguard.settings.model import Settings

LARGEST_EXPLAINED = 1500
"""Unknowns up to which a singular part is taken apart: beyond, that costs more than the review."""
SHORTED_VOLTS = 1e-3
"""V across an inductor at DC from which the sources at its ends are shorted by it."""


def analyse(
    circuit: Circuit, settings: Settings, catalogue: Catalogue, options: Options | None = None
) -> Design:
    """Work a circuit out: who is an op-amp, what feeds it, what is asked of it, what it can do."""
    found = recognise(circuit, catalogue, settings)
    signs = supply_nets(found.amplifiers)
    fed = feeds(signs, circuit.elements, settings, found.amplifiers)
    kind, reason = kind_of(circuit, settings, fed)
    prepared = prepare(circuit.elements, settings, fed)
    exempt = bridge_resistors(prepared.elements, found.amplifiers)
    worker = _Worker(circuit, settings, fed, exempt, options)
    parts = independent(prepared, found.amplifiers) if found.amplifiers else ()
    done = [worker.worked_out(part) for part in parts]
    solved = [(one.solution, one.first) for one in done if one.solution is not None]
    by_name = {stage.designator: stage for one in done for stage in one.stages}
    problems = [*circuit.problems, *(p for one in done for p in one.problems)]
    remarks = [*circuit.remarks, *found.remarks, *_missing(prepared, settings)]
    if solved:
        lone = len(parts) == 1
        whole = (
            solved[0][0].answers.network if lone else Network(prepared.elements, found.amplifiers)
        )
        problems += _conflicts(whole, prepared)
        problems += _shorted(prepared)
        remarks += _islands(whole, prepared)
    return Design(
        circuit=circuit,
        settings=settings,
        kind=kind,
        kind_reason=reason,
        rails=rails_of(
            signs,
            fed,
            prepared.elements,
            found.amplifiers,
            _levels(solution for solution, _ in solved),
            settings,
        ),
        packages=packages_of(found.amplifiers),
        stages=finished(
            [by_name[a.designator] for a in found.amplifiers], allowed_inputs(solved), settings
        ),
        unrecognised=tuple(
            Unrecognised(
                designator=element.designator,
                name=match.name,
                sort=match.sort,
                pins=len(element.nets),
                nearest=match.nearest,
                location=element.location,
            )
            for element, match in (*found.unknown, *found.others)
        ),
        loads=tuple(load for one in done for load in one.loads),
        bridges=exempt,
        problems=tuple(problems),
        remarks=tuple(remarks),
    )


class _Done(msgspec.Struct, frozen=True):
    """One part worked out.

    first     its stages before any output was held to what it reaches
    solution  None where it has none
    loads     stated loads behind its outputs
    """

    stages: tuple[Stage, ...]
    first: tuple[Stage, ...] = ()
    solution: Solution | None = None
    loads: tuple[Loaded, ...] = ()
    problems: tuple[Problem, ...] = ()


class _Worker:
    """Works out one part of a circuit after the other."""

    def __init__(
        self,
        circuit: Circuit,
        settings: Settings,
        fed: dict[str, Feed],
        exempt: frozenset[str],
        options: Options | None,
    ) -> None:
        self._circuit = circuit
        self._settings = settings
        self._fed = fed
        self._exempt = exempt
        self._options = options

    def worked_out(self, part: Part) -> _Done:
        """Return a part's stages; what stands behind a saturated output takes its real level."""
        try:
            solution = settled = self._solved(part, {})
        except SolveError as error:
            problem = _unsolvable(error, part)
            return _Done(
                unsolved(part.amplifiers, problem.message, self._settings), problems=(problem,)
            )
        first = stages = self._drafts(part, solution)
        clamps: dict[str, Clamp] = {}
        while len(found := clamps_of(stages, clamps)) > len(clamps):
            clamps = found
            settled = self._solved(part, clamps)
            real = self._drafts(part, settled)
            stages = followers_replaced(stages, real, frozenset(clamps))
        return _Done(stages, first, solution, loads_of(settled, stages, self._settings))

    def _solved(self, part: Part, clamps: dict[str, Clamp]) -> Solution:
        return solve(
            part.prepared,
            part.amplifiers,
            self._fed,
            self._settings,
            self._exempt,
            clamps,
            self._options,
            self._circuit.models,
        )

    def _drafts(self, part: Part, solution: Solution) -> tuple[Stage, ...]:
        own = frozenset(a.element.designator for a in part.amplifiers)
        things = unseen_things(
            self._circuit,
            part.prepared.elements,
            own,
            part.prepared.unstated,
            self._settings,
            solution.answers,
            solution.boost,
        )
        things += swinging(solution.turning.unfollowed, part.amplifiers, solution.answers)
        hertz = solution.tops[0] if solution.tops else MID_HERTZ
        mid = solution.mid if hertz == MID_HERTZ else factor(solution.answers.network, hertz)
        flags = spoiled(solution.answers, things, mid)
        return drafts_of(solution, self._fed, self._settings, flags, frozenset(self._fed))


def _unsolvable(error: SolveError, part: Part) -> Problem:
    """Say which nets and elements leave a part without an answer; the other parts have theirs."""
    network = Network(part.prepared.elements, part.amplifiers)
    if network.size > LARGEST_EXPLAINED:
        names = tuple(a.designator for a in part.amplifiers)
        return Problem(rule="netlist-no-solution", message=error.what, designators=names)
    why, elements, nets = explained(network, part.prepared.elements)
    place = next((e.location for e in part.prepared.elements if e.designator in elements), None)
    return Problem(
        rule="netlist-no-solution",
        message=why,
        remedy="Give the net a resistance to a defined level, or take one of the sources out.",
        location=place,
        designators=tuple(elements),
        nets=tuple(nets),
    )


def _levels(solutions: Iterable[Solution]) -> Mapping[str, float]:
    """Return the DC level of every net of the solved parts."""
    levels = {}
    for solution in solutions:
        network, x = solution.answers.network, solution.answers.x
        levels.update({net: float(x[row]) for net, row in network.rows.items()})
    return levels


def _islands(network: Network, prepared: Prepared) -> list[Remark]:
    """Name the nets between capacitors: they have no DC level, whatever was solved round them."""
    inputs = {net for a in network.amplifiers for net in (a.plus, a.minus)}
    lost = network.floating - inputs
    if not lost:
        return []
    on_net: dict[str, list[str]] = {net: [] for net in sorted(lost)}
    others = set()
    for element in prepared.elements:
        if not element.fitted or element.kind == "K":
            continue
        for net in dict.fromkeys(element.nets):
            if element.kind == "C" and net in lost:
                on_net[net].append(element.designator)
            else:
                others.add(net)
    remarks = []
    for net, names in on_net.items():
        if len(names) > 1 and net not in others:
            shown = " and ".join(names[:3])
            remarks.append(
                Remark(f"Capacitors in series ({shown}) leave net {net} without DC level.")
            )
    return remarks


def _missing(prepared: Prepared, settings: Settings) -> list[Remark]:
    """Say once what the user's file states of nets this deck does not have."""
    if not prepared.missing:
        return []
    where = settings.file or "A directive"
    names = ", ".join(prepared.missing)
    return [Remark(message=f"{where} states what this deck does not have: {names}.")]


def _conflicts(network: Network, prepared: Prepared) -> list[Problem]:
    """Turn voltages that contradict each other into problems, named by net and element."""
    problems = []
    amplifiers = {a.designator for a in network.amplifiers}
    own = {e.designator: e for e in prepared.elements} if network.conflicts else {}
    levels = source_levels(prepared) if network.conflicts else {}
    for designator, *nets in network.conflicts:
        if designator in amplifiers:
            continue  # two outputs on one net are a matter of drive
        where = " and ".join(n for n in dict.fromkeys(nets) if n != GROUND)
        element = own.get(designator)
        same = element is not None and _agrees(element, levels)
        problems.append(
            Problem(
                rule="netlist-sources-fight",
                message=f"{designator} sets a voltage at {where} that other sources already set"
                + (", to the same level: most SPICE programs stop at that." if same else "."),
                remedy="Put a resistance in series, or take one of them out.",
                location=element.location if element is not None else None,
                designators=(designator,),
                nets=tuple(nets),
                severity="minor" if same else None,
            )
        )
    return problems


def _agrees(element: Element, levels: Mapping[str, float]) -> bool:
    """Tell whether a source sets the level that is there already, and no wave beside it."""
    source = element.source
    if source is None or source.wave is not None or not source.stated:
        return False
    high, low = (levels.get(net) for net in element.nets[:2])
    if high is None or low is None:
        return False
    return abs(high - low - source.level) <= SHORTED_VOLTS


def _shorted(prepared: Prepared) -> list[Problem]:
    """Name the inductors that stand across ideal sources of different levels: a short at DC."""
    coils = [e for e in prepared.elements if e.kind == "L" and e.fitted and len(e.nets) >= 2]
    if not coils:
        return []
    levels = source_levels(prepared)
    problems = []
    for coil in coils:
        a, b = coil.nets[:2]
        if a in levels and b in levels and abs(levels[a] - levels[b]) > SHORTED_VOLTS:
            where = " and ".join(net for net in (a, b) if net != GROUND)
            volts = abs(levels[a] - levels[b])
            problems.append(
                Problem(
                    rule="netlist-sources-fight",
                    message=f"{coil.designator} shorts the {volts:.4g} V that sources set at "
                    f"{where}: at DC an inductor is a wire.",
                    remedy="Put a resistance in series with it.",
                    location=coil.location,
                    designators=(coil.designator,),
                    nets=(a, b),
                )
            )
    return problems
