"""A flat circuit to a design: the analysis from beginning to end."""

from railguard.analysis.clamping import clamps_of, followers_replaced
from railguard.analysis.kind import kind_of
from railguard.analysis.rails import packages_of, rails_of
from railguard.analysis.ranges import Clamp
from railguard.analysis.recognise import Recognised, recognise
from railguard.analysis.signals import Prepared, prepare
from railguard.analysis.solution import Options, Solution, solve
from railguard.analysis.solve import factor
from railguard.analysis.stage import Design, Stage, Unrecognised
from railguard.analysis.stages import stages_of, unsolved
from railguard.analysis.supplies import Feed, feeds, supply_nets
from railguard.analysis.surroundings import MID_HERTZ
from railguard.analysis.unseen import spoiled, swinging, unseen_things
from railguard.circuit.model import GROUND, Circuit
from railguard.devices.catalogue import Catalogue
from railguard.errors import SolveError
from railguard.notices import Problem, Remark
from railguard.settings.model import Settings


def analyse(
    circuit: Circuit, settings: Settings, catalogue: Catalogue, options: Options | None = None
) -> Design:
    """Work a circuit out: who is an op-amp, what feeds it, what is asked of it, what it can do."""
    found = recognise(circuit, catalogue, settings)
    signs = supply_nets(found.amplifiers)
    fed = feeds(signs, circuit.elements, settings, found.amplifiers)
    kind, reason = kind_of(circuit, settings, fed)
    prepared = prepare(circuit.elements, settings, fed)
    problems = list(circuit.problems)
    solution: Solution | None = None
    stages: tuple[Stage, ...] = ()
    if found.amplifiers:
        try:
            solution = solve(prepared, found.amplifiers, fed, settings, options=options)
        except SolveError as error:
            problems.append(Problem(rule="netlist-no-solution", message=error.what))
            stages = unsolved(found.amplifiers, error.what, settings)
    if solution is not None:
        stages = _stages(circuit, settings, found, prepared, solution, fed)
        clamps: dict[str, Clamp] = {}
        while len(found_clamps := clamps_of(stages, clamps)) > len(clamps):
            clamps = found_clamps
            clamped = solve(prepared, found.amplifiers, fed, settings, clamps, options)
            real = _stages(circuit, settings, found, prepared, clamped, fed)
            stages = followers_replaced(stages, real, frozenset(clamps))
        problems += _conflicts(solution)
    return Design(
        circuit=circuit,
        settings=settings,
        kind=kind,
        kind_reason=reason,
        rails=rails_of(
            signs, fed, prepared.elements, found.amplifiers,
            solution.answers if solution is not None else None, settings,
        ),
        packages=packages_of(found.amplifiers),
        stages=stages,
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
        problems=tuple(problems),
        remarks=(
            *circuit.remarks,
            *found.remarks,
            *_missing(prepared, settings),
            *(_islands(solution) if solution is not None else ()),
        ),
    )  # fmt: skip


def _stages(
    circuit: Circuit,
    settings: Settings,
    found: Recognised,
    prepared: Prepared,
    solution: Solution,
    fed: dict[str, Feed],
) -> tuple[Stage, ...]:
    own = frozenset(a.element.designator for a in found.amplifiers)
    things = unseen_things(
        circuit, prepared.elements, own, prepared.unstated, settings, solution.answers
    )
    things += swinging(solution.turning.unfollowed, found.amplifiers, solution.answers)
    hertz = solution.tops[0] if solution.tops else MID_HERTZ
    mid = solution.mid if hertz == MID_HERTZ else factor(solution.answers.network, hertz)
    flags = spoiled(solution.answers, things, mid)
    return stages_of(solution, fed, settings, flags, frozenset(fed))


def _islands(solution: Solution) -> list[Remark]:
    """Name the nets between capacitors: they have no DC level, whatever was solved round them."""
    found = []
    inputs = {net for a in solution.amplifiers for net in (a.plus, a.minus)}
    for net in sorted(solution.answers.network.floating - inputs):
        on_net = [e for e in solution.ways.around.get(net, ()) if e.kind != "K"]
        if len(on_net) > 1 and all(e.kind == "C" for e in on_net):
            names = " and ".join(e.designator for e in on_net[:3])
            found.append(
                Remark(f"Capacitors in series ({names}) leave net {net} without DC level.")
            )
    return found


def _missing(prepared: Prepared, settings: Settings) -> list[Remark]:
    """Say once what the user's file states of nets this deck does not have."""
    if not prepared.missing:
        return []
    where = settings.file or "A directive"
    names = ", ".join(prepared.missing)
    return [Remark(message=f"{where} states what this deck does not have: {names}.")]


def _conflicts(solution: Solution) -> list[Problem]:
    """Turn voltages that contradict each other into problems, named by net and element."""
    problems = []
    amplifiers = {a.designator for a in solution.amplifiers}
    for designator, *nets in solution.answers.network.conflicts:
        if designator in amplifiers:
            continue  # two outputs on one net are a matter of drive
        where = " and ".join(n for n in dict.fromkeys(nets) if n != GROUND)
        problems.append(
            Problem(
                rule="netlist-sources-fight",
                message=f"{designator} sets a voltage at {where} that other sources already set.",
                remedy="Put a resistance in series, or take one of them out.",
                designators=(designator,),
                nets=tuple(nets),
            )
        )
    return problems
