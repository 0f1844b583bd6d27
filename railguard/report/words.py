"""Labels and short sentences of the reports, in one place."""

from collections import Counter
from collections.abc import Iterable, Sequence
from pathlib import Path

from railguard.analysis.bound import Range
from railguard.analysis.rail import Supply
from railguard.analysis.stage import Stage
from railguard.circuit.model import GROUND
from railguard.location import Location
from railguard.report.grouping import OpenGroup
from railguard.reviewing import DesignReview
from railguard.rules.finding import Finding, WaiverNote
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
ADD = "To check"
READING = "How it was read"
WAIVED = "Waived"
RUN = "The run as a whole"


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
    return f"on {' and '.join(ends)}"


def heading(stage: Stage) -> str:
    """Return what a stage is: device, topology, gain and rails."""
    gains = ", ".join(f"{gain:.4g} from {net}" for net, gain in stage.gain[:2])
    parts = [
        stage.device,
        stage.topology,
        f"gain {gains}" if gains else "",
        _noise_gain(stage),
        rails(stage.supply),
    ]
    return ", ".join(part for part in parts if part)


def with_ends(value: float, worst: Range, unit: str) -> str:
    """Return a figure with what tolerances make of it: `65.2° (63.1° to 67°)`.

    Without ends where they read as the figure does.
    """
    if worst.low is None or worst.high is None:
        return si(value, unit)
    digits = digits_apart((worst.low, value, worst.high), unit)
    own, low, high = (si(v, unit, digits) for v in (value, worst.low, worst.high))
    return own if low == own == high else f"{own} ({low} to {high})"


USUAL_DIGITS, MOST_DIGITS = 3, 5


def digits_apart(values: Sequence[float], unit: str) -> int:
    """Return the digits that tell figures apart: 21.1 from 21.06 and 21.14.

    The usual ones where not even the most do.
    """
    for digits in range(USUAL_DIGITS, MOST_DIGITS + 1):
        if len({si(value, unit, digits) for value in values}) == len(values):
            return digits
    return USUAL_DIGITS


def name(stage: Stage) -> str:
    """Return a stage's designator as on the schematic, and as in the netlist where they differ."""
    if stage.schematic == stage.designator:
        return stage.schematic
    return f"{stage.schematic} ({stage.designator})"


def _noise_gain(stage: Stage) -> str:
    """Return the noise gain at DC where the gains listed do not tell it anyway."""
    gain = stage.loop.noise_gain_dc
    if gain is None or gain < 1 + _SAME:
        return ""
    if any(abs(abs(listed) - gain) < _SAME * gain for _, listed in stage.gain):
        return ""
    return f"noise gain {gain:.3g}"


_SAME = 0.01
"""Share below which two gains are the same to a reader."""


def place(location: Location | None, deck: str) -> str:
    """Return where a finding stands, as said behind its rule: `, line 12 of filters.inc`."""
    if location is None:
        return ""
    inside = "" if location.file == deck else f" of {near(location.file)}"
    return f", line {location.line}{inside}"


def in_brackets(source: str) -> str:
    """Return a source set in brackets, those inside it made square."""
    return f"({source.translate(_SQUARE)})" if source else ""


_SQUARE = str.maketrans("()", "[]")


def open_point(group: OpenGroup) -> str:
    """Return what stays open, and why, as one sentence."""
    about = "; ".join(
        f"{_listed(subjects)} ({', '.join(rules)})" for subjects, rules in group.about
    )
    return f"{about}: {group.why}."


def _listed(names: Sequence[str]) -> str:
    return ", ".join(names)


def rank(design: DesignReview) -> tuple[int, ...]:
    """Return a key that puts the worst design first."""
    found = counts(design.findings)
    order = {"hold": 0, "incomplete": 1, "pass": 2}
    return (order[design.verdict], *(-found[s] for s in SEVERITIES), -design.open)


def left_to_the_table(total: int, held: int, shown: int) -> str:
    """Return what a report on many netlists leaves out."""
    if held == shown:
        what = "those on hold" if held else "none"
        return f"Of {total} netlists {what} are shown in full; review one alone for the rest of it."
    return (
        f"Of {held} netlists on hold the worst {shown} are shown in full; review one alone for its "
        "findings."
    )


def waiver(note: WaiverNote) -> str:
    """Return why, by whom and until when a finding is accepted."""
    who = f" by {note.by}" if note.by else ""
    until = f" until {note.until}" if note.until else ""
    return f"{note.reason}{who}{until}"


def near(path: str) -> str:
    """Return a path as seen from the folder the command runs in, where it lies below it."""
    try:
        return Path(path).relative_to(Path.cwd()).as_posix()
    except ValueError:
        return path


def covered(review: DesignReview) -> str:
    """Return how much was judged: `368 judged, 0 not checked`."""
    return f"{review.judged} judged, {review.open} not checked"


def verdict(review: DesignReview) -> str:
    """Return the one line a review comes to."""
    settings = review.design.settings
    found = count_words(review.findings).capitalize()
    match review.verdict:
        case "hold":
            return f"Verdict: hold at {settings.hold_at}. {found}; {covered(review)}."
        case "incomplete":
            return f"Verdict: incomplete. {found}; {covered(review)}, so it is no pass."
        case _:
            return f"Verdict: pass. {found}; {covered(review)}."


def kind(review: DesignReview) -> str:
    """Return what the deck was taken for, and why."""
    design = review.design
    if design.kind == "unstated":
        return "taken for a board: no evidence of either"
    return f"taken for a {design.kind}: {design.kind_reason}"
