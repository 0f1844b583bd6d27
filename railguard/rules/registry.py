"""All rules of the house, and the run of all rules over one design."""

from collections.abc import Iterable, Mapping, Sequence
from typing import Any

import msgspec

from railguard.analysis.stage import Design
from railguard.errors import PluginError, UsageError
from railguard.notices import NotChecked
from railguard.rules import dynamics
from railguard.rules.bias import errors, path, unused
from railguard.rules.causes import merge
from railguard.rules.decoupling import presence, quality
from railguard.rules.drive import current, outputs, power
from railguard.rules.feedback import sign, size, special
from railguard.rules.finding import Finding
from railguard.rules.headroom import limits as beyond
from railguard.rules.headroom import ranges
from railguard.rules.netlist import circuit, reading
from railguard.rules.protocol import Limits, Outcome, Rule
from railguard.rules.stability import load, margin, noise_gain
from railguard.rules.supply import levels
from railguard.rules.supply import presence as supplies
from railguard.settings.model import Settings
from railguard.settings.names import advice

RULES: tuple[Rule, ...] = (
    *supplies.RULES,
    *levels.RULES,
    *presence.RULES,
    *quality.RULES,
    *ranges.RULES,
    *beyond.RULES,
    *current.RULES,
    *outputs.RULES,
    *power.RULES,
    *path.RULES,
    *errors.RULES,
    *unused.RULES,
    *sign.RULES,
    *size.RULES,
    *special.RULES,
    *dynamics.RULES,
    *noise_gain.RULES,
    *margin.RULES,
    *load.RULES,
    *reading.RULES,
    *circuit.RULES,
)


class Judgement(msgspec.Struct, frozen=True):
    """What all rules together said of one design.

    findings     worst first, consequences under their causes
    judged, open  numbers of (rule, subject) pairs that were judged, and that stayed open
    rules        names of the rules that ran
    """

    findings: tuple[Finding, ...]
    not_checked: tuple[NotChecked, ...]
    judged: int
    open: int
    rules: tuple[str, ...]


def rule(name: str, extra: Iterable[Rule] = ()) -> Rule:
    """Return a rule by its name.

    Raises UsageError: no such rule; its remedy names the nearest one.
    """
    found = {r.name: r for r in (*RULES, *extra)}
    if name not in found:
        raise UsageError(f'There is no rule "{name}".', None, advice(name, found))
    return found[name]


def known_limits(extra: Iterable[Rule] = ()) -> dict[str, dict[str, str]]:
    """Return the units of all limits by rule and limit, for checking what the user's file names."""
    return {r.name: {limit.name: limit.unit for limit in r.limits} for r in (*RULES, *extra)}


def limits_of(one: Rule, settings: Settings) -> Limits:
    """Return a rule's limits: its defaults with the user's values on top."""
    return {
        **{limit.name: limit.default for limit in one.limits},
        **settings.limits.get(one.name, {}),
    }


def judge(design: Design, extra: tuple[Rule, ...] = ()) -> Judgement:
    """Run every rule that is not switched off on each of its subjects.

    extra  rules of third parties; one that stops with an error leaves its subject not checked

    Raises PluginError: two rules of one name.
    """
    _refuse_doubles(extra)
    running = [r for r in (*RULES, *extra) if r.name not in design.settings.rules_off]
    found: list[Finding] = []
    missed: list[NotChecked] = []
    judged = left_open = 0
    for one in running:
        limits = limits_of(one, design.settings)
        for subject in subjects_of(one, design):
            outcomes = _outcomes(one, subject, limits, design, guarded=one in extra)
            points = [o for o in outcomes if isinstance(o, NotChecked)]
            found += [_reweighed(o, design.settings) for o in outcomes if isinstance(o, Finding)]
            missed += points
            left_open += bool(points)
            judged += not points
    return Judgement(
        findings=merge(found, design),
        not_checked=tuple(sorted(set(missed))),
        judged=judged,
        open=left_open,
        rules=tuple(r.name for r in running),
    )


def _refuse_doubles(extra: tuple[Rule, ...]) -> None:
    names = {r.name for r in RULES}
    for one in extra:
        if one.name in names:
            raise PluginError(
                f'A rule of the name "{one.name}" is there already.',
                None,
                "The plug-in's author must give it another name.",
            )
        names.add(one.name)


def subjects_of(one: Rule, design: Design) -> Sequence[Any]:
    """Return what a rule looks at in a design, one by one."""
    by_kind: Mapping[str, Sequence[Any]] = {
        "stage": design.stages,
        "rail": design.rails,
        "package": design.packages,
        "design": (design,),
    }
    return by_kind[one.looks_at]


def _outcomes(
    one: Rule,
    subject: Any,  # noqa: ANN401 - a subject is one of four structs
    limits: Limits,
    design: Design,
    *,
    guarded: bool,
) -> list[Outcome]:
    if not guarded:
        return list(one.judge(subject, limits, design))
    try:
        outcomes = list(one.judge(subject, limits, design))
        fault = next(filter(None, (_misfit(one, outcome) for outcome in outcomes)), "")
    except (Exception, SystemExit) as error:  # noqa: BLE001 - a third party's may raise anything
        fault = f"the rule stopped with {type(error).__name__}: {error}"
    if not fault:
        return outcomes
    name = getattr(subject, "designator", None) or getattr(subject, "net", None)
    add = "report it to the rule's author, or leave it out with --no-plugins"
    return [NotChecked(name or design.circuit.path, one.name, fault, add)]


def _misfit(one: Rule, outcome: object) -> str:
    """Say why what a third party's rule yielded cannot be taken, or "" where it can."""
    kind = Finding if isinstance(outcome, Finding) else NotChecked
    if not isinstance(outcome, kind):
        return f"the rule yielded {type(outcome).__name__}, which is no finding"
    if outcome.rule != one.name:
        return f'the rule yielded a finding of "{outcome.rule}"'
    try:
        msgspec.convert(msgspec.to_builtins(outcome), kind)
    except (msgspec.ValidationError, TypeError) as error:
        return f"the rule yielded a finding that is none: {error}"
    return ""


def _reweighed(finding: Finding, settings: Settings) -> Finding:
    """Give a finding the severity the user states for its rule."""
    severity = settings.severities.get(finding.rule)
    return finding if severity is None else msgspec.structs.replace(finding, severity=severity)
