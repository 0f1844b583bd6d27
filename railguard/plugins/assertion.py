"""One assertion for people's own tests: this circuit is sound."""

from collections.abc import Iterable
from pathlib import Path

from railguard.report.terminal import held
from railguard.reviewing import Review, review
from railguard.settings.model import Settings
from railguard.words import Family, Severity


def assert_sound(
    source: object,
    settings: Settings | Path | str | None = None,
    *,
    hold_at: Severity | None = None,
    require: Iterable[Family] = (),
    root: Path | None = None,
    plugins: bool = True,
) -> Review:
    """Review a circuit, and fail with what is wrong with it.

    source    as `railguard.review` takes it: a path, several, a text, a PySpice circuit
    settings  as `railguard.review` takes it
    hold_at   the severity that fails, over what the settings say [major]
    require   families that must not stay open
    root      the folder includes may lie below
    plugins   False leaves out the rules other packages bring

    Returns the review, for assertions of your own on its stages and findings.

    Raises:
        AssertionError: something stands at or above the hold level, a required family stayed
            open, or there was no op-amp to judge.
        SettingsError: the settings cannot be obeyed.
    """
    __tracebackhide__ = True
    changes: dict[str, object] = {}
    if hold_at is not None:
        changes["hold_at"] = hold_at
    if require:
        changes["require"] = tuple(require)
    found = review(source, settings, root=root, plugins=plugins, changes=changes)
    if found.held:
        raise AssertionError("\n" + held(found).decode())
    empty = [design for design in found.designs if not design.design.stages]
    if empty or not found.designs:
        raise AssertionError("\n".join(_nothing(design.path) for design in empty) or "no netlist")
    return found


def _nothing(path: str) -> str:
    return f"{path}: no op-amp was recognised, so nothing could be judged."
