"""Rules of third parties, found by the package entry points of the group `railguard.rules`.

An entry point names a `Rule`, or several in a tuple or list. One that cannot be used is left out,
and a remark says why: a broken plug-in must not stop a review.
"""

from collections.abc import Iterable
from importlib.metadata import EntryPoint

import msgspec

from railguard.errors import PluginError
from railguard.notices import Remark
from railguard.rules.protocol import Rule
from railguard.rules.registry import RULES

GROUP = "railguard.rules"


class Installed(msgspec.Struct, frozen=True):
    """The rules found, and what was wrong with those that were not taken."""

    rules: tuple[Rule, ...] = ()
    remarks: tuple[Remark, ...] = ()


def installed() -> Installed:
    """Load the rules other packages bring."""
    # scanning the installed packages costs some 40 ms, so only a review that wants them pays
    from importlib.metadata import entry_points

    rules: list[Rule] = []
    remarks: list[Remark] = []
    for point in sorted(entry_points(group=GROUP), key=lambda p: p.name):
        try:
            loaded = _load(point)
            _check(point, loaded, [*RULES, *rules])
        except PluginError as error:
            remarks.append(Remark(str(error)))
        else:
            rules += loaded
    return Installed(tuple(rules), tuple(remarks))


def _load(point: EntryPoint) -> tuple[Rule, ...]:
    try:
        found = point.load()
    except Exception as error:
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


def _check(point: EntryPoint, rules: Iterable[Rule], known: Iterable[Rule]) -> None:
    """Refuse rules that could not be told apart from others, or not be run."""
    names = {rule.name for rule in known}
    for rule in rules:
        if rule.name in names:
            raise PluginError(f"The rules {point.name}: there is a {rule.name} already.")
        if not rule.name.startswith(f"{rule.family}-"):
            raise PluginError(
                f"The rules {point.name}: {rule.name} does not begin with its family, "
                f"{rule.family}."
            )
        if not callable(rule.judge):
            raise PluginError(f"The rules {point.name}: the judge of {rule.name} is no function.")
        names.add(rule.name)
