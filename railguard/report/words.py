"""Labels and short sentences of the reports, in one place."""

from collections import Counter
from collections.abc import Iterable
from pathlib import Path

from railguard.analysis.stage import Stage, Supply
from railguard.circuit.model import GROUND
from railguard.review import DesignReview
from railguard.rules.finding import Finding
from railguard.units import si
from railguard.words import SEVERITIES

CAUTION = (
    "railguard checks low-voltage signal stages against data-sheet limits. It is no approval: "
    "where mains, batteries, medical or safety circuits are concerned, local codes and licensed "
    "review decide."
)

FIT = "Remedy"
WHY = "Why"
SOURCE = "Source"
FOLLOWS = "It follows:"
NOT_CHECKED = "Not checked"
ADD = "To get it checked"
READING = "How it was read"
WAIVED = "Waived"


def plural(count: int, word: str) -> str:
    """Return `1 finding`, `2 findings`."""
    return f"{count} {word}{'' if count == 1 else 's'}"


def counts(findings: Iterable[Finding]) -> Counter[str]:
    """Count findings that are not waived by severity."""
    return Counter(f.severity for f in findings if f.waiver is None)


def count_words(findings: Iterable[Finding]) -> str:
    """Return `1 critical, 2 minor`, or `no findings`."""
    found = counts(findings)
    return ", ".join(f"{found[s]} {s}" for s in SEVERITIES if found[s]) or "no findings"


def rails(supply: Supply) -> str:
    """Return a stage's rails in words."""
    if not supply.pins:
        return "no supply pins in the netlist"
    ends = [
        "ground"
        if net == GROUND
        else f"{net} {si(level, 'V')}"
        if level is not None
        else f"{net} (not known)"
        for net, level in (
            (supply.positive_net, supply.positive),
            (supply.negative_net, supply.negative),
        )
    ]
    return " and ".join(ends)


def heading(stage: Stage) -> str:
    """Return what a stage is: device, topology, gain and rails."""
    gains = ", ".join(f"{gain:.4g} from {net}" for net, gain in stage.gain[:2])
    parts = [stage.device, stage.topology, f"gain {gains}" if gains else "", rails(stage.supply)]
    return ", ".join(part for part in parts if part)


def near(path: str) -> str:
    """Return a path as seen from the folder the command runs in, where it lies below it."""
    try:
        return Path(path).relative_to(Path.cwd()).as_posix()
    except ValueError:
        return path


def verdict(review: DesignReview) -> str:
    """Return the one line a review comes to."""
    settings = review.design.settings
    found = count_words(review.findings).capitalize()
    covered = f"{review.judged} judged, {review.open} not checked"
    match review.verdict:
        case "hold":
            return f"Verdict: hold at {settings.hold_at}. {found}; {covered}."
        case "incomplete":
            return f"Verdict: incomplete. {found}; {covered}, so it is no pass."
        case _:
            return f"Verdict: pass. {found}; {covered}."


def kind(review: DesignReview) -> str:
    """Return what the deck was taken for, and why."""
    design = review.design
    if design.kind == "unstated":
        return "taken for a board: no evidence of either"
    return f"taken for a {design.kind}: {design.kind_reason}"
