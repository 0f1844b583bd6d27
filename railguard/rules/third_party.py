"""Rules of third parties, found by the package entry points of the group `railguard.rules`.

An entry point names a `Rule`, or several in a tuple or list. One that cannot be used is left out,
and a remark says why: a broken plug-in must not stop a review.
"""

import math
import os
import re
import sys
from collections.abc import Collection, Iterable
from pathlib import Path
from typing import TYPE_CHECKING, get_args

import msgspec

from railguard.errors import PluginError
from railguard.notices import Remark
from railguard.rules.protocol import SUBJECTS, Limit, Rule
from railguard.rules.registry import RULES
from railguard.words import Family

if TYPE_CHECKING:
    from importlib.metadata import EntryPoint

GROUP = "railguard.rules"

_NAME = re.compile(r"[a-z]+(-[a-z0-9]+)+")


class Installed(msgspec.Struct, frozen=True):
    """The rules found, and what was wrong with those that were not taken."""

    rules: tuple[Rule, ...] = ()
    remarks: tuple[Remark, ...] = ()


def installed() -> Installed:
    """Load the rules other packages bring."""
    if not _any_package_brings():
        return Installed()
    from importlib.metadata import entry_points

    rules: list[Rule] = []
    broken: list[Remark] = []
    taken: list[str] = []
    for point in sorted(entry_points(group=GROUP), key=lambda p: p.name):
        try:
            loaded = _load(point)
            _check(point, loaded, [*RULES, *rules])
        except PluginError as error:
            broken.append(Remark(str(error)))
        else:
            rules += loaded
            names = ", ".join(rule.name for rule in loaded)
            taken.append(f"{names} ({_package(point)})")
    listed = [Remark(f"Rules of other packages: {'; '.join(taken)}.")] if taken else []
    return Installed(tuple(rules), (*listed, *broken))


def _any_package_brings() -> bool:
    """Tell whether any installed package can bring rules, without opening each one's metadata.

    Python's own search through all packages costs as much as reviewing a netlist, and most people
    have no such package. Where packages may be found in another way than in folders, it is left to
    that search.
    """
    if any(hasattr(one, "find_distributions") and not _is_usual(one) for one in sys.meta_path):
        return True
    return any(_folder_brings(place or ".") for place in dict.fromkeys(sys.path))


def _is_usual(finder: object) -> bool:
    return getattr(finder, "__name__", "") == "PathFinder"


def _folder_brings(place: str) -> bool:
    try:
        names = os.listdir(place)  # noqa: PTH208 - an object for each name costs more than the rest
    except NotADirectoryError:
        return True  # an archive
    except OSError:
        return False
    for name in names:
        if name.endswith(".egg"):
            return True
        if name.endswith((".dist-info", ".egg-info")):
            try:
                text = Path(place, name, "entry_points.txt").read_bytes()
            except OSError:
                continue
            if GROUP.encode() in text:
                return True
    return False


def _package(point: "EntryPoint") -> str:
    """Return the package an entry point came with, and its version."""
    return f"{point.dist.name} {point.dist.version}" if point.dist is not None else point.value


def _load(point: "EntryPoint") -> tuple[Rule, ...]:
    try:
        found = point.load()
    except (Exception, SystemExit) as error:
        raise PluginError(
            f"The rules {point.name} ({point.value}) could not be loaded: "
            f"{type(error).__name__}: {error}."
        ) from error
    rules = (found,) if isinstance(found, Rule) else found
    if not isinstance(rules, tuple | list) or not all(isinstance(r, Rule) for r in rules):
        raise PluginError(
            f"The entry point {point.name} ({point.value}) is no rule and no tuple of rules."
        )
    return tuple(rules)


def _check(point: "EntryPoint", rules: Iterable[Rule], known: Iterable[Rule]) -> None:
    """Refuse rules that could not be told apart from others, not be run, or not be explained."""
    names = {rule.name for rule in known}
    for rule in rules:
        fault = _fault(rule, names)
        if fault:
            raise PluginError(f"The rules {point.name} ({_package(point)}): {fault}.")
        names.add(rule.name)


def _fault(rule: Rule, taken: Collection[str]) -> str:
    """Say what is wrong with a rule, or "" where nothing is. Its fields may be anything."""
    if not isinstance(rule.name, str) or not _NAME.fullmatch(rule.name):
        return f"{rule.name!r} is no name of small letters, digits and hyphens"
    if rule.name in taken:
        return f"there is a {rule.name} already"
    if rule.family not in get_args(Family):
        return f"the family of {rule.name}, {rule.family!r}, is none"
    if not rule.name.startswith(f"{rule.family}-"):
        return f"{rule.name} does not begin with its family, {rule.family}"
    if rule.looks_at not in SUBJECTS:
        return f"{rule.name} looks at {rule.looks_at!r}, not at one of {', '.join(SUBJECTS)}"
    if not callable(rule.judge):
        return f"the judge of {rule.name} is no function"
    for field in ("judges", "reason", "source"):
        if not isinstance(getattr(rule, field), str) or not getattr(rule, field).strip():
            return f"{rule.name} has no text for its {field}"
    if not isinstance(rule.limits, tuple) or not all(isinstance(n, Limit) for n in rule.limits):
        return f"the limits of {rule.name} are no tuple of limits"
    limits = [limit.name for limit in rule.limits]
    for limit in rule.limits:
        if limits.count(limit.name) > 1:
            return f"{rule.name} has two limits {limit.name}"
        if not isinstance(limit.default, int | float) or not math.isfinite(limit.default):
            return f"the default of {limit.name} of {rule.name} is no number"
    return ""
