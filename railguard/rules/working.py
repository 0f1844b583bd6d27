"""Whether a stage works at all, so that its ranges mean something."""

from collections.abc import Iterator

from railguard.analysis.stage import Stage, Unknown
from railguard.notices import NotChecked

NO_VOLTS = 0.1
"""V between the supply pins below which there is no supply at all."""

NO_LINEAR_RANGE = Unknown(
    "its feedback does not hold the output, so it has no linear range",
    "close the loop, or state what the stage is meant to be: use = comparator under [stages]",
)
NO_SUPPLY = Unknown(
    "its supply pins leave it no voltage to work with", "see the finding on its supply"
)
NO_PATH = Unknown(
    "one of its inputs floats, so its level is not defined", "see the finding on its input"
)


def loop_is_broken(stage: Stage) -> bool:
    """Tell whether a stage has no working feedback at DC, so that its output has no linear range.

    A stage whose level another stage holds is not broken.
    """
    return stage.loop.dc == "positive" or (stage.loop.dc == "open" and not stage.loop.holds)


def standstill(stage: Stage) -> Unknown | None:
    """Return why a stage does not work, or None.

    The loop counts only where the stage is meant to be linear.
    """
    if stage.supply.total is not None and stage.supply.total <= NO_VOLTS:
        return NO_SUPPLY
    if stage.use == "linear" and loop_is_broken(stage):
        return NO_LINEAR_RANGE
    if "floating" in (stage.inputs.plus.state, stage.inputs.minus.state):
        return NO_PATH
    return None


def stands_still(rule: str, stage: Stage) -> Iterator[NotChecked]:
    """Yield that a rule could not judge a stage that does not work; nothing where it does."""
    reason = standstill(stage)
    if reason is not None:
        yield NotChecked(stage.designator, rule, reason.why, reason.add)
