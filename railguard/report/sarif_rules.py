"""What a SARIF report says of the rules themselves, and of the kinds of notification it has."""

from railguard.report import sarif_types as wire
from railguard.report.escaping import sarif
from railguard.report.grouping import with_consequences
from railguard.reviewing import Review
from railguard.rules.protocol import Limit, Rule
from railguard.rules.registry import RULES, limits_of
from railguard.settings.model import Settings
from railguard.units import si


def _message(text: str) -> wire.Message:
    return wire.Message(text=sarif(text))


NOTICES = {
    "not-read": wire.Descriptor(
        id="not-read",
        short_description=_message("A file or card that could not be read; the rest was."),
    ),
    "not-checked": wire.Descriptor(
        id="not-checked",
        short_description=_message("A judgement that stayed open, and what to state to get it."),
    ),
    "read-as": wire.Descriptor(
        id="read-as",
        short_description=_message("How something was read where it could be read otherwise."),
    ),
}


def descriptors(review: Review) -> tuple[wire.Descriptor, ...]:
    """Return every rule that ran or spoke, the house's in their order, then those of others."""
    ran = {name for design in review.designs for name in design.rules}
    spoke = [f for d in review.designs for f in with_consequences(d.findings)]
    spoke += with_consequences(review.findings)
    named = ran | {finding.rule for finding in spoke}
    known = {rule.name: rule for rule in (*RULES, *review.extra_rules)}
    return tuple(_rule(rule, review.settings) for name, rule in known.items() if name in named)


def _rule(rule: Rule, settings: Settings) -> wire.Descriptor:
    values = limits_of(rule, settings)
    limits = " ".join(_limit(limit, values[limit.name]) for limit in rule.limits)
    parts = [
        rule.reason,
        f"Source: {rule.source}." if rule.source else "",
        f"Silent: {rule.silent}" if rule.silent else "",
        f"Limits: {limits}" if limits else "",
    ]
    return wire.Descriptor(
        id=rule.name,
        short_description=_message(rule.judges),
        full_description=_message(rule.reason) if rule.reason else None,
        help=_message(" ".join(part for part in parts if part)),
        properties={"tags": [rule.family], "source": rule.source, "limits": dict(values)},
    )


def _limit(limit: Limit, value: float) -> str:
    shown = f"{value:g}" if limit.unit in ("", "share") else si(value, limit.unit)
    return f"{limit.name} {shown}: {limit.meaning} ({limit.source})."
