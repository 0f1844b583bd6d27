"""What a rule is: a function of one signature, with its limits and its published reason beside it.

A rule looks at one subject (a stage, a rail, a package, or the whole design) and yields findings.
What it cannot judge for want of data it yields as `NotChecked`. It never parses and never solves:
every number it needs stands on the subject.
"""

from collections.abc import Callable, Iterator, Mapping
from typing import Any, Literal

import msgspec

from railguard.analysis.stage import Design
from railguard.notices import NotChecked
from railguard.rules.finding import Finding
from railguard.words import Family

Subject = Literal["stage", "rail", "package", "design"]
SUBJECTS: tuple[Subject, ...] = ("stage", "rail", "package", "design")

Limits = Mapping[str, float]
"""Named limits of one rule: the defaults with the user's values on top."""

Outcome = Finding | NotChecked

Judge = Callable[[Any, Limits, Design], Iterator[Outcome]]
"""judge(subject, limits, design): the one signature. `subject` is a Stage, Rail, Package or Design,
as the rule's `looks_at` says; `design` is for looking up neighbours."""


class Limit(msgspec.Struct, frozen=True):
    """A named limit a user can set under `[limits.RULE]`.

    default  in `unit`
    source   publication it comes from, or "common practice, no source"
    """

    name: str
    default: float
    unit: str
    meaning: str
    source: str


class Rule(msgspec.Struct, frozen=True, kw_only=True):
    """One rule of the house.

    name      `family-what`
    judges    one sentence: what it looks at and when it speaks
    reason    one or two sentences of physics
    source    publication, or "common practice, no source"
    silent    when it stays silent or yields *not checked*
    """

    name: str
    family: Family
    looks_at: Subject
    judges: str
    reason: str
    source: str
    silent: str = ""
    limits: tuple[Limit, ...] = ()
    judge: Judge
