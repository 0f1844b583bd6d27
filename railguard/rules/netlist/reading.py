"""What the netlist says otherwise than its author most likely meant."""

import math
from collections.abc import Callable, Iterator

import msgspec

from railguard.analysis.stage import Design
from railguard.circuit.model import Element
from railguard.notices import Problem
from railguard.rules.finding import Finding
from railguard.rules.protocol import Limits, Outcome, Rule
from railguard.rules.wording import NO_SOURCE, listed
from railguard.units import si
from railguard.words import Kind, Severity

SPICE_SOURCE = "SPICE reads it so: ngspice manual, chapter on circuit description"


class _Topic(msgspec.Struct, frozen=True):
    """One kind of reading trouble: its name, what it is about, and how bad it is."""

    what: str
    judges: str
    reason: str
    severity: Severity = "major"
    on_board: Severity | None = None
    source: str = SPICE_SOURCE
    silent: str = "What cannot be decided from the card alone."
    beside: Callable[[Design], Iterator[Outcome]] | None = None


def undefined(design: Design) -> Iterator[Outcome]:
    """Name what a deck made to simulate calls and defines nowhere, once for all of it."""
    if design.kind == "board" or any(p.rule == "netlist-include" for p in design.problems):
        return
    known = {s.designator for s in design.stages}
    known |= {u.designator for u in design.unrecognised if u.sort != "unknown"}
    defined = (*design.circuit.models, *design.circuit.subcircuits)
    names = {key.rpartition(".")[2] for key in defined}
    lost: dict[str, list[Element]] = {}
    for element in design.circuit.elements:
        word = element.model.split()[0] if element.model.split() else ""
        if element.kind not in ("D", "Q", "J", "M", "X") or not word or not element.fitted:
            continue
        if element.designator not in known and word.lower() not in names:
            lost.setdefault(word, []).append(element)
    if not lost:
        return
    told = listed(f"{word} ({listed(e.designator for e in users)})" for word, users in lost.items())
    first = next(iter(lost.values()))[0]
    yield Finding(
        rule="netlist-model",
        family="netlist",
        severity="minor" if design.kind == "bench" else "remark",
        designators=tuple(e.designator for users in lost.values() for e in users),
        basis=("netlist",),
        message=f"The deck calls {told} and defines none of it.",
        remedy="Include the models; what hangs on them is not checked without.",
        source=SPICE_SOURCE,
        location=first.location,
    )


_TOPICS = (
    _Topic(
        "value-suffix",
        "A value whose suffix SPICE reads otherwise than meant: 1M is a thousandth, 1F is a "
        "femtofarad.",
        "SPICE takes M as milli in either case and drops what it does not know behind a number.",
        "major",
        "minor",
    ),
    _Topic(
        "value-second-number",
        "A value with a second number behind it: 10k 0603, 10u 16V, 1uF 20%.",
        "Some SPICE programs take the second number for the value or a model's name.",
        "major",
        "minor",
    ),
    _Topic(
        "sources-fight",
        "Two sources, or a source and an amplifier's output, that set one net to different levels.",
        "Ideal sources in parallel have no common answer, and real ones burn.",
        "critical",
    ),
    _Topic(
        "no-solution",
        "A circuit whose equations have no single answer.",
        "What cannot be solved cannot be judged, so its stages are listed as not checked.",
    ),
    _Topic(
        "value-missing",
        "An element without a value, or with one that cannot be worked out.",
        "What has no value cannot be solved, and what hangs on it is not checked.",
    ),
    _Topic(
        "value-form",
        "A value that is no number to SPICE: a decimal comma, 1.2.3, 0x10, 10 uF with a blank.",
        "SPICE stops reading at the first character it does not know, without a word.",
        "major",
        "minor",
    ),
    _Topic(
        "value-sign",
        "A value of zero or below where that is odd.",
        "A resistor of zero ohms divides by zero in some programs; a negative one is a source.",
        "minor",
    ),
    _Topic(
        "unreadable",
        "A file that is no readable netlist at all.",
        "Of a file that cannot be read nothing can be said.",
        "critical",
        source=NO_SOURCE,
    ),
    _Topic(
        "encoding",
        "Characters that were lost or had to be mended on reading.",
        "A look-alike letter in a net's name makes two nets of one.",
        "minor",
        source=NO_SOURCE,
    ),
    _Topic(
        "title",
        "A card on the first line, which SPICE takes for the title.",
        "The element on it is not in the circuit.",
    ),
    _Topic(
        "continuation",
        "A continuation line that continues nothing, or a comment.",
        "What stands on it is lost or belongs to another card than it seems.",
        "minor",
    ),
    _Topic(
        "end",
        "Cards behind .end, and blocks that are not closed.",
        "SPICE does not read behind .end.",
    ),
    _Topic(
        "card",
        "A card that could not be read.",
        "An element that cannot be read is not in the circuit that was judged.",
    ),
    _Topic(
        "node-count",
        "A card with too few or too many nodes for its letter or subcircuit.",
        "Nodes shift into each other's places, and the circuit is another one.",
    ),
    _Topic(
        "duplicate",
        "A designator, model, subcircuit or port that stands twice.",
        "Programs keep the first, the last, or stop; the two cards cannot both be meant.",
    ),
    _Topic(
        "model",
        "A model or subcircuit that is called and defined nowhere.",
        "A simulator stops there; a review has to do without what the model would say.",
        "major",
        "minor",
        silent="Boards, whose netlists seldom carry models; devices the catalogue knows; decks an "
        "include of which is missing.",
        beside=undefined,
    ),
    _Topic(
        "include",
        "A file to be included that is missing, goes in circles, or lies outside the folder.",
        "What it holds is not in the circuit that was judged.",
    ),
    _Topic(
        "parameter",
        "A parameter that is not defined, defined in circles, or defined twice.",
        "Values that rest on it cannot be worked out, or are not the ones meant.",
    ),
    _Topic(
        "expression",
        "An expression that cannot be worked out.",
        "The value that rests on it is missing.",
    ),
    _Topic(
        "source",
        "A source whose time function is incomplete or contradicts itself.",
        "What the source delivers is not what its author meant.",
    ),
    _Topic(
        "ground",
        "A circuit without ground, or with a second name for it.",
        "Every voltage is counted from net 0.",
    ),
    _Topic(
        "directive",
        "A comment card `* railguard: ...` that could not be obeyed.",
        "What it was meant to state is not known, and the review went on without it.",
        "minor",
        source=NO_SOURCE,
    ),
    _Topic(
        "waiver-stale",
        "A waiver that matches no finding of the whole run.",
        "A leftover waiver may one day accept a finding nobody has looked at.",
        "remark",
        source=NO_SOURCE,
    ),
    _Topic(
        "stage-unknown",
        "A stage that the user's file or a comment card speaks of and no netlist of the run has.",
        "What was meant for one stage reaches none, and the stage meant is judged without it.",
        "remark",
        source=NO_SOURCE,
    ),
    _Topic(
        "bound",
        "A netlist that passed a bound on size, depth or expansion.",
        "What lies beyond the bound was not read.",
        source=NO_SOURCE,
    ),
    _Topic(
        "other-dialect",
        "A card that other SPICE programs read otherwise or refuse.",
        "The netlist means one thing here and another elsewhere.",
        "remark",
    ),
)


def _judge(topic: _Topic) -> Callable[[Design, Limits, Design], Iterator[Outcome]]:
    """Make the judge of one topic: every problem the reader filed under its name."""
    name = f"netlist-{topic.what}"

    def judge(subject: Design, limits: Limits, design: Design) -> Iterator[Outcome]:
        for problem in subject.problems:
            if problem.rule == name:
                yield finding_of(problem, _severity(topic, problem, subject.kind), topic.source)
        if topic.beside is not None:
            yield from topic.beside(subject)

    return judge


def _severity(topic: _Topic, problem: Problem, kind: Kind) -> Severity:
    if problem.severity is not None:
        return problem.severity
    if topic.on_board is not None and kind != "bench":
        return topic.on_board
    return topic.severity


def finding_of(problem: Problem, severity: Severity, source: str = NO_SOURCE) -> Finding:
    """Make the finding of a problem the reader met; both readings of a value are shown."""
    message = problem.message
    spice, likely = problem.spice_value, problem.likely_value
    if spice is not None and likely is not None and not _both_shown(problem):
        message = (
            f"{message} SPICE reads {si(spice, problem.unit)}; {si(likely, problem.unit)} was most "
            "likely meant, and the review went on with that."
        )
    return Finding(
        rule=problem.rule,
        family="netlist",
        severity=severity,
        designators=problem.designators,
        nets=problem.nets,
        demand=likely,
        limit=spice,
        unit=problem.unit,
        basis=("netlist",),
        message=message,
        remedy=problem.remedy or _spelling(problem),
        source=source,
        location=problem.location,
    )


_SUFFIXES = (
    (12, "T"),
    (9, "G"),
    (6, "MEG"),
    (3, "k"),
    (0, ""),
    (-3, "m"),
    (-6, "u"),
    (-9, "n"),
    (-12, "p"),
    (-15, "f"),
)
"""SPICE scale factors by power of ten, the largest first."""


def _spelling(problem: Problem) -> str:
    """Say how the likely value is written so that every SPICE reads it so, or ""."""
    value = problem.likely_value
    if value is None or value == 0 or not math.isfinite(value):
        return ""
    powers = [(10.0**power, suffix) for power, suffix in _SUFFIXES]
    factor, suffix = next((p for p in powers if abs(value) >= p[0] * (1 - 1e-9)), powers[-1])
    return f"Write {value / factor:.6g}{suffix}."


def _both_shown(problem: Problem) -> bool:
    shown = (si(v, problem.unit) for v in (problem.spice_value, problem.likely_value))
    return all(text in problem.message for text in shown)


RULES = tuple(
    Rule(
        name=f"netlist-{topic.what}",
        family="netlist",
        looks_at="design",
        judges=topic.judges,
        reason=topic.reason,
        source=topic.source,
        silent="Minor on a board, where the value that is bought is the one meant, major on a "
        "bench."
        if topic.on_board == "minor" and topic.beside is None
        else topic.silent,
        judge=_judge(topic),
    )
    for topic in _TOPICS
)
