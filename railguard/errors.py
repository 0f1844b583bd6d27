"""What railguard raises: one base class, and the three questions each error answers."""

from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from railguard.location import Location


class RailguardError(Exception):
    """A request that cannot be carried out.

    what    what is wrong, one sentence
    where   the place, or None
    remedy  what to do about it, one sentence, or ""

    A fault of the *design* is never raised: it is a finding.
    """

    def __init__(self, what: str, where: "Location | None" = None, remedy: str = "") -> None:
        self.what = what
        self.where = where
        self.remedy = remedy
        super().__init__(what)

    def __str__(self) -> str:
        """Join the three answers into the text a user reads."""
        place = f" ({self.where})" if self.where else ""
        return f"{self.what}{place}" + (f" {self.remedy}" if self.remedy else "")


class UsageError(RailguardError):
    """An option or a file on the command line that makes no sense."""


class SettingsError(RailguardError):
    """A statement in the user's file that cannot be obeyed."""


class CatalogueError(RailguardError):
    """A device table that does not describe a possible device."""


class SolveError(RailguardError):
    """The circuit's equations have no single answer; `what` explains which net or element."""


class EngineError(RailguardError):
    """The simulator is missing, or its run gave nothing that can be trusted."""


class PluginError(RailguardError):
    """A third party's rule that cannot be used; `what` names it."""
