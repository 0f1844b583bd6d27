"""Path, text or circuit to Review: the library's entry."""

import datetime as dt
import importlib
from collections.abc import Callable, Mapping
from pathlib import Path
from types import MappingProxyType
from typing import Protocol

import msgspec

from railguard.analysis.design import analyse
from railguard.analysis.recognise import keeps_closed
from railguard.analysis.solution import Options
from railguard.analysis.stage import Design
from railguard.circuit.flatten import flatten
from railguard.circuit.model import Circuit
from railguard.deck.bounds import Bounds
from railguard.deck.files import Deck, deck_from_text, read_deck
from railguard.devices import catalogue
from railguard.devices.names import schematic_name
from railguard.notices import NotChecked, Problem
from railguard.rules import strays, third_party, waivers
from railguard.rules.finding import Finding
from railguard.rules.protocol import Rule
from railguard.rules.registry import judge, known_limits
from railguard.settings import directives, spelling
from railguard.settings import file as settings_file
from railguard.settings.model import Settings
from railguard.settings.names import check_names
from railguard.words import SEVERITIES, Severity, Verdict, at_or_above


class Simulator(Protocol):
    """What a review asks of a simulator; `railguard.simulated.Ngspiced` is the one there is."""

    def filled(self, design: Design, devices: catalogue.Catalogue) -> Design:
        """Give stages the numbers that the built-in solver could not work out."""
        ...

    def confirmed(self, findings: tuple[Finding, ...], design: Design) -> tuple[Finding, ...]:
        """Say of each finding on range and current what the simulation says."""
        ...


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

    def holding(self) -> tuple[Finding, ...]:
        """Return the findings, not waived, that stand at its own hold level or above."""
        level = self.design.settings.hold_at
        return tuple(
            f for f in self.findings if f.waiver is None and at_or_above(f.severity, level)
        )

    def open_though_required(self) -> tuple[NotChecked, ...]:
        """Return what stayed open of the families that its settings require."""
        required = self.design.settings.require
        return tuple(n for n in self.not_checked if n.rule.split("-", 1)[0] in required)


class Review(msgspec.Struct, frozen=True, kw_only=True):
    """What was found in all decks of one run.

    findings     those about the run itself
    extra_rules  rules of other packages that ran beside the house's own
    """

    designs: tuple[DesignReview, ...]
    settings: Settings
    findings: tuple[Finding, ...] = ()
    extra_rules: tuple[Rule, ...] = ()

    @property
    def held(self) -> bool:
        """Tell whether any design of the run is on hold."""
        return any(design.verdict == "hold" for design in self.designs)

    def _repr_mimebundle_(self, include: object = None, exclude: object = None) -> dict[str, str]:
        """Show the review in a notebook, which calls this name."""
        del include, exclude
        # What shows a review stands right of it, so it is looked up when a notebook asks.
        shown: dict[str, str] = importlib.import_module("railguard.report.notebook").bundle(self)
        return shown


def review(
    source: object,
    settings: Settings | Path | str | None = None,
    *,
    as_of: dt.date | None = None,
    root: Path | None = None,
    bounds: Bounds | None = None,
    plugins: bool = True,
    options: Options | None = None,
    engine: Simulator | None = None,
    changes: Mapping[str, object] = MappingProxyType({}),
    step: Callable[[], None] | None = None,
) -> Review:
    """Review one or several netlists.

    source    a path; several paths (list or tuple); the text of a netlist (a string with more
              than one line); or a circuit object whose `str()` is its netlist, such as PySpice's
    settings  a Settings value, or the path of a railguard.toml; None: the nearest railguard.toml
              beside each netlist and upwards to its repository, or none for a text
    as_of     the day waivers are judged on; None: today
    root      the folder includes must stay in; None: each deck's own folder
    plugins   False leaves out the rules that other packages bring
    options   how the corners of tolerance are worked out; None: by sensitivities
    engine    runs ngspice beside the built-in solver; None: never
    changes   fields of Settings that stand over any file found: `hold_at`, `kind`, `require`
    step      called after each netlist, for a progress bar

    Raises:
        SettingsError: the settings file cannot be obeyed.
        CatalogueError: a device table of the user's cannot be.
    """
    sources: list[object] = list(source) if isinstance(source, list | tuple) else [source]
    stated = settings_file.load(Path(settings)) if isinstance(settings, str | Path) else settings
    extra = third_party.installed() if plugins else third_party.Installed()
    run = _Run(as_of or dt.date.today(), extra.rules)
    designs = []
    for one in sources:
        found_settings = stated if stated is not None else _found_beside(one)
        own = run.prepared(msgspec.structs.replace(found_settings, **changes))
        deck = _deck(one, root, bounds or Bounds(**own.bounds))
        try:
            found, matched = review_deck(deck, own, extra, options, engine)
        except Exception as error:
            error.add_note(f"while reviewing {deck.path}")
            raise
        run.took(own, matched, found)
        designs.append(found)
        if step is not None:
            step()
    return Review(
        designs=tuple(designs),
        settings=run.first or Settings(),
        findings=run.leftovers(),
        extra_rules=extra.rules,
    )


class _Run:
    """What must be known over all decks of a run: which waivers and stages were met."""

    def __init__(self, day: dt.date, extra: tuple[Rule, ...]) -> None:
        self.first: Settings | None = None
        self._day = day
        self._limits = known_limits(extra)
        self._used: dict[str, tuple[Settings, set[int], list[DesignReview]]] = {}

    def prepared(self, settings: Settings) -> Settings:
        """Set the day waivers are judged on, and check the names once per settings file."""
        settings = msgspec.structs.replace(settings, as_of=self._day)
        if settings.file not in self._used:
            check_names(settings, self._limits)
            self._used[settings.file] = (settings, set(), [])
        self.first = self.first or settings
        return settings

    def took(self, settings: Settings, matched: set[int], found: DesignReview) -> None:
        """Note which waivers of a file matched in one deck."""
        _, indexes, decks = self._used[settings.file]
        indexes |= {index for index in matched if index < len(settings.waivers)}
        decks.append(found)

    def leftovers(self) -> tuple[Finding, ...]:
        """Return a remark for each waiver and stage of a file met nowhere in the whole run."""
        found: list[Finding] = []
        for settings, matched, decks in self._used.values():
            paths = [deck.path for deck in decks]
            found += waivers.stale(settings, matched, paths)
            if not strays.is_for_others(settings, paths):
                designs = [deck.design for deck in decks]
                met = {name for design in designs for name in strays.met(settings, design)}
                found += strays.left_over(settings, met, designs)
        return tuple(found)


def _is_path(source: object) -> bool:
    return isinstance(source, Path) or (isinstance(source, str) and "\n" not in source)


def _found_beside(source: object) -> Settings:
    if not _is_path(source):
        return Settings()
    place = settings_file.find(Path(str(source)))
    return settings_file.load(place) if place is not None else Settings()


def _deck(source: object, root: Path | None, bounds: Bounds) -> Deck:
    if _is_path(source):
        return read_deck(Path(str(source)), bounds, root)
    return deck_from_text(str(source), bounds=bounds)


def review_deck(
    deck: Deck,
    stated: Settings,
    extra: third_party.Installed | None = None,
    options: Options | None = None,
    engine: Simulator | None = None,
) -> tuple[DesignReview, set[int]]:
    """Review one deck that has been read; also return the indexes of waivers that matched.

    stated  what the user's file says; the deck's own comment cards are laid under it
    extra   rules of other packages
    engine  fills in what the built-in solver cannot follow, and confirms findings
    """
    extra = extra or third_party.Installed()
    devices = catalogue.load(stated.devices)
    circuit = flatten(deck, keeps_closed(devices))
    settings, circuit = _with_directives(stated, circuit, extra.rules)
    design = analyse(circuit, settings, devices, options)
    if extra.remarks:
        design = msgspec.structs.replace(design, remarks=(*design.remarks, *extra.remarks))
    if engine is not None:
        design = engine.filled(design, devices)
    judged = judge(design, extra.rules)
    found = judged.findings if engine is None else engine.confirmed(judged.findings, design)
    findings, matched = waivers.apply(found, settings, circuit.path, settings.as_of)
    # A comment card speaks of this deck alone: what it names is left over here or nowhere.
    own = waivers.stale(settings, matched | frozenset(range(len(stated.waivers))))
    told = strays.met(settings, design) | frozenset(stated.stages_at)
    own = (*own, *strays.left_over(settings, told, [design]))
    result = DesignReview(
        path=circuit.path,
        design=design,
        verdict="pass",
        findings=(*findings, *own),
        not_checked=(*judged.not_checked, *_nothing_found(circuit, design)),
        judged=judged.judged,
        open=judged.open,
        rules=judged.rules,
    )
    return msgspec.structs.replace(result, verdict=verdict(result)), set(matched)


def _with_directives(
    stated: Settings, circuit: Circuit, extra: tuple[Rule, ...]
) -> tuple[Settings, Circuit]:
    """Lay the deck's comment cards under the user's file, all in the netlist's own spelling."""
    settings, complaints = directives.apply(stated, circuit.directives, known_limits(extra))
    nets = dict.fromkeys(net for element in circuit.elements for net in element.nets)
    designators = [element.designator for element in circuit.elements]
    settings, misspelt = spelling.respelt(settings, nets, designators, schematic_name)
    problems: tuple[Problem, ...] = (*circuit.problems, *complaints, *misspelt)
    return settings, msgspec.structs.replace(circuit, problems=problems)


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


def verdict(result: DesignReview) -> Verdict:
    """Return what a design's findings and open points come to, at its own hold level."""
    if result.holding() or result.open_though_required():
        return "hold"
    return "incomplete" if result.not_checked or not result.judged else "pass"
