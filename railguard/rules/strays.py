"""Statements about stages that no netlist has: a designator misspelt, or changed since.

A statement in a comment card speaks of its own netlist. One in a settings file speaks of all
netlists the file holds for: it is left over only where no netlist of the run has the stage, and
not at all where the file stands in a folder above all of them, as it is then for others too. An
audit, which judges its netlists one by one, speaks of comment cards alone.
"""

from collections.abc import Iterable, Sequence
from pathlib import Path

from railguard.analysis.stage import Design
from railguard.rules.finding import Finding
from railguard.rules.waivers import same_designator
from railguard.settings.model import Settings
from railguard.settings.names import nearest

STRAY = "netlist-stage-unknown"


def met(settings: Settings, design: Design) -> frozenset[str]:
    """Return the names of stages, as stated, that a netlist has."""
    own = [stage.designator for stage in design.stages]
    own += [other.designator for other in design.unrecognised]
    return frozenset(
        name
        for name in settings.stages_at
        if any(same_designator(name, designator) for designator in own)
    )


def left_over(settings: Settings, known: Iterable[str], designs: Sequence[Design]) -> list[Finding]:
    """Return a remark for each stage stated that none of some netlists has.

    known  names that are met, or told of elsewhere
    """
    if STRAY in settings.rules_off:
        return []
    done = frozenset(known)
    near = {
        spelling: None
        for design in designs
        for stage in design.stages
        for spelling in (stage.designator, stage.schematic)
    }
    return [
        _remark(name, settings, tuple(near), len(designs))
        for name in settings.stages_at
        if name not in done
    ]


def _remark(name: str, settings: Settings, near: tuple[str, ...], decks: int) -> Finding:
    place = settings.stages_at[name]
    where = "[stages]" if place.file == settings.file else "A directive"
    has = "this netlist does not have" if decks == 1 else "no netlist of this run has"
    close = nearest(name, near)
    return Finding(
        rule=STRAY,
        family="netlist",
        severity=settings.severities.get(STRAY, "remark"),
        designators=(name,),
        basis=("user",),
        message=f"{where} speaks of {name}, an op-amp {has}, so what it states is of no effect.",
        remedy=f"The nearest is {close}: write that, or remove it."
        if close
        else "Correct its designator, or remove it.",
        source="common practice, no source",
        location=place,
    )


def is_for_others(settings: Settings, decks: Iterable[str]) -> bool:
    """Tell whether a settings file stands in a folder above all the netlists it was found for."""
    if not settings.file:
        return False
    home = Path(settings.file).absolute().parent
    folders = [Path(deck).absolute().parent for deck in decks]
    return bool(folders) and all(home in folder.parents for folder in folders)
