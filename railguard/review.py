"""Path, text or circuit to Review: the library's entry."""

import datetime as dt
from pathlib import Path

import msgspec

from railguard.analysis.design import analyse
from railguard.analysis.recognise import keeps_closed
from railguard.analysis.stage import Design
from railguard.circuit.flatten import flatten
from railguard.circuit.model import Circuit
from railguard.deck.files import Bounds, Deck, deck_from_text, read_deck
from railguard.devices import catalogue
from railguard.notices import NotChecked
from railguard.rules import waivers
from railguard.rules.finding import Finding
from railguard.rules.registry import RULES, judge
from railguard.settings import directives
from railguard.settings import file as settings_file
from railguard.settings.model import Settings
from railguard.settings.names import check_names
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

    @property
    def held(self) -> bool:
        """Tell whether any design of the run is on hold."""
        return any(design.verdict == "hold" for design in self.designs)


def review(
    source: object,
    settings: Settings | Path | str | None = None,
    *,
    as_of: dt.date | None = None,
    root: Path | None = None,
    bounds: Bounds | None = None,
) -> Review:
    """Review one or several netlists.

    source    a path; several paths; the text of a netlist (a string with more than one line); or
              a circuit object whose `str()` is its netlist, such as PySpice's Circuit
    settings  a Settings value, or the path of a railguard.toml; None: the nearest railguard.toml
              beside each netlist and upwards to its repository, or none for a text
    as_of     the day waivers are judged on; None: the settings' own, or today
    root      the folder includes must stay in; None: each deck's own folder

    Raises:
        SettingsError: the settings file cannot be obeyed.
        CatalogueError: a device table of the user's cannot be.
    """
    sources: list[object] = list(source) if isinstance(source, list | tuple) else [source]
    day = as_of or dt.date.today()
    stated = _load(settings)
    designs: list[DesignReview] = []
    matched: set[int] = set()
    used = stated
    for one in sources:
        own = stated if stated is not None else _found_beside(one)
        own = own if own.as_of > dt.date(1970, 1, 1) and as_of is None else _on(own, day)
        used = used if used is not None else own
        deck = _deck(one, root, bounds or Bounds())
        found, hits = review_deck(deck, own)
        designs.append(found)
        matched |= hits
    used = used if used is not None else _on(Settings(), day)
    return Review(
        designs=tuple(designs), settings=used, findings=waivers.stale(used, frozenset(matched))
    )


def _on(settings: Settings, day: dt.date) -> Settings:
    return msgspec.structs.replace(settings, as_of=day)


def _load(settings: Settings | Path | str | None) -> Settings | None:
    if isinstance(settings, str | Path):
        return settings_file.load(Path(settings))
    return settings


def _found_beside(source: object) -> Settings:
    if not isinstance(source, Path) and not (isinstance(source, str) and "\n" not in source):
        return Settings()
    place = settings_file.find(Path(source))
    return settings_file.load(place) if place is not None else Settings()


def _deck(source: object, root: Path | None, bounds: Bounds) -> Deck:
    if isinstance(source, Path) or (isinstance(source, str) and "\n" not in source):
        return read_deck(Path(source), bounds, root)
    return deck_from_text(str(source), bounds=bounds)


def review_deck(deck: Deck, settings: Settings) -> tuple[DesignReview, set[int]]:
    """Review one deck that has been read; also return the indexes of waivers that matched."""
    check_names(settings, {rule.name: {limit.name for limit in rule.limits} for rule in RULES})
    devices = catalogue.load(settings.devices)
    circuit = flatten(deck, keeps_closed(devices))
    settings, complaints = directives.apply(settings, circuit.directives)
    circuit = msgspec.structs.replace(circuit, problems=(*circuit.problems, *complaints))
    design = analyse(circuit, settings, devices)
    judged = judge(design)
    findings, matched = waivers.apply(judged.findings, settings, circuit.path, settings.as_of)
    not_checked = (*judged.not_checked, *_nothing_found(circuit, design))
    result = DesignReview(
        path=circuit.path,
        design=design,
        verdict="pass",
        findings=tuple(findings),
        not_checked=not_checked,
        judged=judged.judged,
        open=judged.open,
        rules=judged.rules,
    )
    return msgspec.structs.replace(result, verdict=_verdict(result, settings)), set(matched)


def _nothing_found(circuit: Circuit, design: Design) -> tuple[NotChecked, ...]:
    """A deck without a recognised op-amp is never passed in silence."""
    if design.stages or not circuit.readable:
        return ()
    return (
        NotChecked(
            subject=circuit.path,
            rule="all rules of stages",
            why="no op-amp was recognised in this deck",
            add="a device name the catalogue knows (railguard devices), or [[devices]]",
        ),
    )


def _verdict(result: DesignReview, settings: Settings) -> Verdict:
    if result.holds(settings.hold_at):
        return "hold"
    families = {note.rule.split("-", 1)[0] for note in result.not_checked}
    if families.intersection(settings.require):
        return "hold"
    return "incomplete" if result.not_checked or not result.judged else "pass"
