"""Names a user may get wrong: the nearest valid one, and rules checked once they are known."""

import difflib
from collections.abc import Collection, Iterable, Mapping

from railguard.errors import SettingsError
from railguard.settings.model import Named, Settings
from railguard.units import canonical_unit

_MANY = 12
"""More valid names than this are not listed after the nearest one."""


def nearest(word: str, known: Iterable[str]) -> str:
    """Return the valid name that looks most like `word`, or "" where none does."""
    by_fold = {name.casefold().replace("_", "-"): name for name in known}
    folded = word.casefold().replace("_", "-")
    found = difflib.get_close_matches(folded, by_fold, n=1, cutoff=0.5)
    return by_fold[found[0]] if found else ""


def advice(word: str, known: Collection[str]) -> str:
    """Say which valid name is nearest to `word`, and which there are."""
    close = nearest(word, known)
    parts = [f'The nearest is "{close}".'] if close else []
    if len(known) <= _MANY:
        parts.append(f"Known here: {', '.join(sorted(known))}.")
    return " ".join(parts)


def check_names(settings: Settings, rules: Mapping[str, Collection[str]]) -> None:
    """Refuse rules and limits the user's file names that do not exist.

    rules  rule -> names of its limits; where that is a mapping to units, the unit written with a
           limit's value is checked as well

    Raises SettingsError at the first wrong name, with its line and the nearest valid one.
    """
    for named in settings.named:
        fault = misnamed(named, rules)
        if fault is not None:
            what, remedy = fault
            raise SettingsError(what, named.location, remedy)


def misnamed(named: Named, rules: Mapping[str, Collection[str]]) -> tuple[str, str] | None:
    """Say what is wrong with a named rule or limit, and what to write; None where all is well."""
    limits = rules.get(named.rule)
    if limits is None:
        return f'There is no rule "{named.rule}".', advice(named.rule, rules)
    if not named.limit:
        return None
    if named.limit not in limits:
        if not limits:
            return f'The rule {named.rule} has no limits, so no "{named.limit}".', ""
        return f'The rule {named.rule} has no limit "{named.limit}".', advice(named.limit, limits)
    wanted = limits[named.limit] if isinstance(limits, Mapping) else None
    if wanted is None or not named.unit or _fits(named.unit, wanted):
        return None
    noun = f"in {wanted}" if wanted else "a number without a unit"
    what = f"The limit {named.limit} of {named.rule} is {noun}, and the value is in {named.unit}."
    return what, ""


def _fits(written: str, wanted: str) -> bool:
    share = written == "%" and wanted in ("", "share", "%")
    return share or canonical_unit(written) == canonical_unit(wanted)
