"""What the page shows, as plain values: texts are made here, the templates only place them."""

from collections.abc import Iterable, Iterator

import msgspec
from markupsafe import Markup

from railguard.analysis.rail import Rail
from railguard.analysis.stage import Stage
from railguard.report import sheet, sheet_row, words
from railguard.report.grouping import OpenGroup, blocks, open_groups, with_consequences
from railguard.report.html import bode, drawing, ruler, svg
from railguard.report.html.listing import Listing, Places, listings
from railguard.report.html.wiring import Connection, Nets, wiring
from railguard.report.scale import input_scale, output_scale
from railguard.reviewing import DesignReview, Review
from railguard.rules.finding import Finding
from railguard.rules.registry import RULES
from railguard.rules.wording import origin
from railguard.units import percent, si
from railguard.words import SEVERITIES

DETAILED_FILES = 12
"""With more files than this, drawings and netlists are shown of the worst ones only."""

MOST_DRAWN = 100
"""With more stages than this, only those with a finding are drawn and have their numbers listed."""

PLAIN = "other"
"""The topology of a stage that was not recognised: a connection list stands for its drawing."""

_REASONS = {rule.name: rule.reason for rule in RULES}
_LOOP_FAMILIES = frozenset({"stability", "dynamics"})
_LOOP_RULES = frozenset({"feedback-high"})
"""Families and rules of which the loop's stability or bandwidth is the matter: it is drawn."""


class FindingView(msgspec.Struct, frozen=True, kw_only=True):
    """One finding. `subject`, `device` and `order` are what the page filters and sorts by."""

    id: str
    severity: str
    rule: str
    family: str
    subject: str
    device: str
    line: int
    place: str
    anchor: str
    message: str
    remedy: str
    why: str
    source: str
    numbers: tuple[tuple[str, str], ...]
    consequences: tuple["FindingView", ...] = ()


class StageView(msgspec.Struct, frozen=True, kw_only=True):
    """One stage, or a rail or the netlist where `drawing`, `scales` and `rows` are empty."""

    id: str
    name: str
    heading: str
    device: str
    findings: tuple[FindingView, ...]
    drawing: Markup = Markup()
    beside: tuple[str, ...] = ()
    connections: tuple[tuple[str, str, str], ...] = ()
    scales: tuple[tuple[str, Markup], ...] = ()
    bode: Markup = Markup()
    bode_words: str = ""
    rows: tuple[tuple[str, ...], ...] = ()
    open: bool = True


class WaivedView(msgspec.Struct, frozen=True):
    """A waived finding and why it was accepted."""

    about: str
    finding: Finding
    note: str


class DesignView(msgspec.Struct, frozen=True, kw_only=True):
    """One netlist."""

    id: str
    path: str
    title: str
    verdict: str
    verdict_words: str
    counts: tuple[tuple[str, int], ...]
    judged: int
    open: int
    facts: tuple[tuple[str, str], ...]
    rails: tuple[tuple[str, ...], ...]
    subjects: tuple[StageView, ...]
    quiet: tuple[StageView, ...]
    quiet_words: str
    not_checked: tuple[OpenGroup, ...]
    waived: tuple[WaivedView, ...]
    reading: tuple[str, ...]
    listings: tuple[Listing, ...]
    in_full: bool

    @property
    def findings(self) -> tuple[FindingView, ...]:
        """All findings of the design that are not waived, in the order they are shown."""
        return tuple(finding for subject in self.subjects for finding in subject.findings)


class PageView(msgspec.Struct, frozen=True, kw_only=True):
    """The whole page. `run` are findings about the run itself."""

    designs: tuple[DesignView, ...]
    run: tuple[FindingView, ...]
    left_out: str

    @property
    def findings(self) -> tuple[FindingView, ...]:
        """Every finding of every design, and those on the run."""
        return (*(f for design in self.designs for f in design.findings), *self.run)

    def different(self, field: str) -> tuple[str, ...]:
        """Return the values that a field has among the findings, severities worst first."""
        found = {str(getattr(finding, field)) for finding in self.findings}
        if field == "severity":
            return tuple(severity for severity in SEVERITIES if severity in found)
        return tuple(sorted(found))


def page(review: Review, prefix: str = "", *, netlists: bool = True) -> PageView:
    """Return what the page shows of a review, the worst design first.

    prefix    what every id on the page begins with
    netlists  False leaves their texts out
    """
    ordered = sorted(review.designs, key=words.rank)
    left = max(len(ordered) - DETAILED_FILES, 0)
    return PageView(
        designs=tuple(
            _Design(
                design,
                f"{prefix}d{number}",
                in_full=number <= DETAILED_FILES,
                netlist=netlists and number <= DETAILED_FILES,
            ).view()
            for number, design in enumerate(ordered, 1)
        ),
        run=tuple(
            _finding(finding, f"{prefix}run-f{number}", "the run", "", Places("", {}))
            for number, finding in enumerate(review.findings, 1)
        ),
        left_out=_left_out(left),
    )


def _left_out(count: int) -> str:
    if not count:
        return ""
    return (
        f"Drawings and netlists are shown of the worst {DETAILED_FILES} netlists; "
        f"of the other {count} the findings alone."
    )


def _undrawn() -> str:
    return (
        f"This netlist has more than {MOST_DRAWN} stages: those without a finding are shown "
        "without their drawings and numbers; railguard sheet lists them."
    )


class _Design:
    """One netlist on its way to the page."""

    def __init__(self, review: DesignReview, name: str, *, in_full: bool, netlist: bool) -> None:
        self.review = review
        self.id = name
        self.in_full = in_full
        self.stages = {stage.designator: stage for stage in review.design.stages}
        self.many = len(self.stages) > MOST_DRAWN
        self.nets = Nets(review.design)
        self.numbers = _numbers(review) if in_full else {}
        shown = review.design.circuit.texts if netlist else ()
        self.places = Places(
            review.path, {file: f"{name}-l{index}" for index, file in enumerate(shown, 1)}
        )
        self.made = 0

    def view(self) -> DesignView:
        review = self.review
        subjects = tuple(self.subject(*block) for block in blocks(review))
        told = {subject for subject, _ in blocks(review)}
        quiet = [s for s in review.design.stages if s.designator not in told]
        found = words.counts(review.findings)
        return DesignView(
            id=self.id,
            path=review.path,
            title=review.design.circuit.title,
            verdict=review.verdict,
            verdict_words=words.verdict(review),
            counts=tuple((severity, found[severity]) for severity in SEVERITIES),
            judged=review.judged,
            open=review.open,
            facts=tuple(_facts(review)),
            rails=tuple(_rail(rail) for rail in review.design.rails),
            subjects=subjects,
            quiet=tuple(self.stage(s, ()) for s in quiet) if self.in_full else (),
            quiet_words=_undrawn() if quiet and self.many else "",
            not_checked=tuple(open_groups(review.not_checked, review.design.stages)),
            waived=tuple(_waived(review)),
            reading=tuple(remark.message for remark in review.design.remarks),
            listings=listings(self.review, subjects, self.places),
            in_full=self.in_full,
        )

    def subject(self, name: str, findings: list[Finding]) -> StageView:
        stage = self.stages.get(name)
        shown = words.name(stage) if stage is not None else name
        views = tuple(self.finding(finding, shown) for finding in findings)
        if stage is not None:
            return self.stage(stage, views, findings)
        self.made += 1
        return StageView(
            id=f"{self.id}-s{self.made}", name=name, heading="", device="", findings=views
        )

    def finding(self, finding: Finding, subject: str) -> FindingView:
        self.made += 1
        return _finding(
            finding, f"{self.id}-f{self.made}", subject, self.device(finding), self.places
        )

    def device(self, finding: Finding) -> str:
        """Return the device a finding is about, as the catalogue names its family."""
        packages = {
            package.designator: package.family or package.device
            for package in self.review.design.packages
        }
        for name in finding.designators:
            stage = self.stages.get(name)
            if stage is not None:
                return stage.family.family if stage.family is not None else stage.device
            if name in packages:
                return packages[name]
        return ""

    def stage(
        self, stage: Stage, views: tuple[FindingView, ...], findings: Iterable[Finding] = ()
    ) -> StageView:
        self.made += 1
        everything = list(with_consequences(findings))
        worst = bool(everything) and all(f.corner == "worst-case" for f in everything)
        name = words.name(stage)
        plain = StageView(
            id=f"{self.id}-s{self.made}",
            name=name,
            heading=words.heading(stage),
            device=stage.device,
            findings=views,
            scales=tuple(_scales(stage, worst=worst)),
            open=bool(views),
        )
        if not self.in_full or (self.many and not views):
            return plain
        wired = wiring(stage, self.nets)
        drawn = stage.topology != PLAIN
        curve = self.curve(stage, everything)
        return msgspec.structs.replace(
            plain,
            drawing=svg.markup(drawing.drawn(stage, wired)) if drawn else Markup(),
            beside=wired.beside if drawn else (),
            connections=tuple(_connection(row) for row in wired.around),
            bode=curve,
            bode_words=bode.spoken(stage.loop) if curve else "",
            rows=self.numbers.get(stage.designator, ()),
        )

    def curve(self, stage: Stage, findings: Iterable[Finding]) -> Markup:
        """Return the loop's plot where stability or bandwidth is judged bad, or stayed open."""
        rules = {finding.rule for finding in findings}
        rules |= {
            note.rule
            for note in self.review.not_checked
            if note.subject in (stage.designator, stage.schematic)
        }
        families = {rule.split("-", 1)[0] for rule in rules}
        if not (families & _LOOP_FAMILIES or rules & _LOOP_RULES):
            return Markup()
        made = bode.bode(stage.loop, f"Loop of {stage.schematic}")
        return svg.markup(made) if made is not None else Markup()


def _numbers(review: DesignReview) -> dict[str, tuple[tuple[str, ...], ...]]:
    """Return the sheet's rows of every stage: the page and the sheet say the same."""
    alone = Review(designs=(review,), settings=review.design.settings)
    found: dict[str, tuple[tuple[str, ...], ...]] = {}
    for row in sheet.rows(alone):
        found[row.designator] = (*found.get(row.designator, ()), sheet_row.cells(row))
    return found


def _scales(stage: Stage, *, worst: bool) -> Iterator[tuple[str, Markup]]:
    for name, scale in (
        ("Output", output_scale(stage, worst=worst)),
        ("Inputs", input_scale(stage, worst=worst)),
    ):
        if scale is not None and scale.asked.low is not None:
            drawn = ruler.ruler(scale, f"{name} of {stage.schematic}")
            yield name, svg.markup(drawn)


def _connection(row: Connection) -> tuple[str, str, str]:
    element = row.element
    return element.designator, drawing.value_of(element), ", ".join(row.nets)


def _finding(finding: Finding, name: str, subject: str, device: str, places: Places) -> FindingView:
    location = finding.location
    return FindingView(
        id=name,
        severity=finding.severity,
        rule=finding.rule,
        family=finding.family,
        subject=subject,
        device=device or "no device",
        line=location.line if location is not None else 0,
        place=words.place(location, places.deck).removeprefix(", "),
        anchor=places.anchor(location),
        message=finding.message,
        remedy=finding.remedy,
        why=_REASONS.get(finding.rule, ""),
        source=finding.source,
        numbers=tuple(_numbers_of(finding)),
        consequences=tuple(
            _finding(inner, f"{name}-{i}", subject, device, places)
            for i, inner in enumerate(finding.consequences, 1)
        ),
    )


def _numbers_of(finding: Finding) -> Iterator[tuple[str, str]]:
    unit = finding.unit
    for name, value in (
        ("Demand", finding.demand),
        ("Limit", finding.limit),
        ("Margin", finding.margin),
    ):
        if value is not None:
            yield name, si(value, unit)
    if finding.margin_share is not None:
        yield "Of the span", percent(finding.margin_share)
    if finding.demand is not None:
        yield "At", "the worst corner" if finding.corner == "worst-case" else "values as drawn"
    if finding.basis and (finding.demand is not None or finding.limit is not None):
        yield "Numbers from", ", ".join(origin(basis) for basis in finding.basis)


def _facts(review: DesignReview) -> Iterator[tuple[str, str]]:
    design, circuit, settings = review.design, review.design.circuit, review.design.settings
    if circuit.title:
        yield "Title", circuit.title
    yield "Read as", words.kind(review).removeprefix("taken for ")
    yield "Stages", str(len(design.stages))
    devices = dict.fromkeys(p.device for p in design.packages)
    if devices:
        yield "Op-amps", f"{words.plural(len(design.packages), 'package')}: {', '.join(devices)}"
    yield "Judged", f"{review.judged} pairs of rule and subject; {review.open} not checked"
    yield "Settings", words.near(settings.file) or "none"
    if settings.rules_off:
        yield "Rules switched off", ", ".join(settings.rules_off)
    yield "Hold level", settings.hold_at
    yield "Waivers judged on", settings.as_of.isoformat()
    if circuit.sha256:
        yield "SHA-256", circuit.sha256


def _rail(rail: Rail) -> tuple[str, ...]:
    fitted = ", ".join(f"{c.designator} {si(c.farads, 'F')}" for c in rail.decoupling)
    return (
        rail.net,
        si(rail.level, "V"),
        f"± {percent(rail.tolerance)}" if rail.level is not None else "",
        rail.origin or origin(rail.basis),
        ", ".join(rail.packages),
        fitted or "none",
    )


def _waived(review: DesignReview) -> Iterator[WaivedView]:
    for finding in review.findings:
        note = finding.waiver
        if note is None:
            continue
        about = ", ".join(finding.designators) or ", ".join(finding.nets)
        by = f", by {note.by}" if note.by else ""
        until = f", until {note.until}" if note.until else ""
        yield WaivedView(about, finding, f"{note.reason}{by}{until}")
