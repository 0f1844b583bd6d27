"""Path, text or circuit to Review: the library's entry."""

import msgspec

from railguard.analysis.stage import Design
from railguard.notices import NotChecked
from railguard.rules.finding import Finding
from railguard.settings.model import Settings
from railguard.words import SEVERITIES, Severity, Verdict, at_or_above


class DesignReview(msgspec.Struct, frozen=True, kw_only=True):
    """What was found in one deck.

    path         as the user gave it
    findings     worst first; consequences hang under their cause
    not_checked  what could not be judged, and what to state to get it judged
    judged       number of (rule, subject) pairs judged; `open` the number that stayed open
    rules        names of the rules that ran
    """

    path: str
    design: Design
    verdict: Verdict
    findings: tuple[Finding, ...]
    not_checked: tuple[NotChecked, ...]
    judged: int
    open: int
    rules: tuple[str, ...]

    def worst(self) -> Severity | None:
        """Return the worst severity among findings that are not waived."""
        live = [f.severity for f in self.findings if f.waiver is None]
        return min(live, key=SEVERITIES.index, default=None)

    def holds(self, level: Severity) -> bool:
        """Tell whether anything not waived stands at `level` or above."""
        worst = self.worst()
        return worst is not None and at_or_above(worst, level)


class Review(msgspec.Struct, frozen=True, kw_only=True):
    """What was found in all decks of one run. `findings` are those about the run itself."""

    designs: tuple[DesignReview, ...]
    settings: Settings
    findings: tuple[Finding, ...] = ()
