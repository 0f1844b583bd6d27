"""The SARIF report (OASIS SARIF 2.1.0): findings for code review hosts and editors.

One result a finding; what follows from it hangs on it as related places. What could not be read
or judged is a notification of the run, so that a host shows it apart from the findings. Paths are
relative to the run's root, and nothing of the machine or the hour is written: the same netlists
give the same bytes everywhere.
"""

from collections import Counter
from collections.abc import Iterable
from pathlib import Path

from railguard import __version__
from railguard.circuit.model import Circuit
from railguard.location import Location
from railguard.notices import Problem
from railguard.report import sarif_types as wire
from railguard.report import words
from railguard.report.escaping import sarif
from railguard.report.grouping import open_groups, with_consequences
from railguard.report.json_text import encoded
from railguard.report.places import address, from_root
from railguard.report.sarif_fixes import MOST_NETLISTS, Fixes
from railguard.report.sarif_rules import NOTICES, descriptors
from railguard.reviewing import DesignReview, Review
from railguard.rules.finding import Finding
from railguard.words import Severity

LEVELS: dict[Severity, wire.Level] = {
    "critical": "error",
    "major": "error",
    "minor": "warning",
    "remark": "note",
}
"""The standard has three levels for our four severities; each result's properties hold both."""

ROOT = "SRCROOT"
FINGERPRINT = "railguard/v1"

_NOT_READ = ("netlist-unreadable", "netlist-include", "netlist-card", "netlist-bound")
"""Rules of the reading whose problems mean that something was left out of the circuit."""


def document(review: Review, root: Path | None = None) -> bytes:
    """Return the SARIF report, indented, ending in a newline.

    root  the run's root, to which paths are relative; None: the current folder
    """
    log = wire.Log(
        version=wire.VERSION, schema=wire.SCHEMA, runs=(_Run(review, root or Path.cwd()).run(),)
    )
    return encoded(log)


def _message(text: str) -> wire.Message:
    return wire.Message(text=sarif(text))


class _Run:
    """What results share: the rules' and the files' places in their lists."""

    def __init__(self, review: Review, root: Path) -> None:
        self.review = review
        self.root = root
        self.rules = descriptors(review)
        self.rule_index = {rule.id: index for index, rule in enumerate(self.rules)}
        self.notices = tuple(NOTICES)
        self.file_index: dict[str, int] = {}
        self.artifacts: list[wire.Artifact] = []

    def run(self) -> wire.Run:
        for design in self.review.designs:
            for file in design.design.circuit.files:
                self.artifact(file, "analysisTarget" if file == design.path else "")
        results = [result for design in self.review.designs for result in self.results(design)]
        if self.review.designs:
            first = self.review.designs[0]
            results += [self.result(f, first, Counter(), ()) for f in self.review.findings]
        notices = dict.fromkeys(n for d in self.review.designs for n in self.notifications(d))
        driver = wire.Component(
            name="railguard",
            semantic_version=__version__,
            short_description=wire.Message(
                text="Design-rule checker for op-amp stages in SPICE netlists."
            ),
            rules=self.rules,
            notifications=tuple(NOTICES.values()),
        )
        return wire.Run(
            tool=wire.Tool(driver=driver),
            invocations=(
                wire.Invocation(
                    execution_successful=True, tool_execution_notifications=tuple(notices)
                ),
            ),
            original_uri_base_ids={
                ROOT: wire.ArtifactLocation(
                    description=wire.Message(
                        text="The folder the review ran in, or the one stated as its root."
                    )
                )
            },
            artifacts=tuple(self.artifacts),
            column_kind="unicodeCodePoints",
            newline_sequences=("\r\n", "\n", "\r"),
            results=tuple(results),
            properties=self.summary(),
        )

    def summary(self) -> dict[str, object]:
        """Return what the run came to, netlist by netlist."""
        return {
            "holdAt": self.review.settings.hold_at,
            "fixes": "worked out"
            if len(self.review.designs) <= MOST_NETLISTS
            else f"left out: more than {MOST_NETLISTS} netlists",
            "designs": [
                {
                    "path": from_root(design.path, self.root),
                    "verdict": design.verdict,
                    "judged": design.judged,
                    "open": design.open,
                    "sha256": design.design.circuit.sha256,
                }
                for design in self.review.designs
            ],
        }

    # ------------------------------------------------------------------ places

    def artifact(self, file: str, role: str = "") -> wire.ArtifactLocation | None:
        """Return a file's address, with its place in the list of files; note it there first."""
        found = address(file, self.root)
        if found is None:
            return None
        uri, relative = found
        plain = wire.ArtifactLocation(uri=uri, uri_base_id=ROOT if relative else None)
        index = self.file_index.setdefault(uri, len(self.artifacts))
        if index == len(self.artifacts):
            roles = (role,) if role else ()
            self.artifacts.append(wire.Artifact(location=plain, roles=roles))
        return wire.ArtifactLocation(uri=uri, uri_base_id=plain.uri_base_id, index=index)

    def physical(self, place: Location | None) -> wire.PhysicalLocation | None:
        """Return a place in a file; None where there is none, or no file."""
        file = self.artifact(place.file) if place is not None else None
        if place is None or file is None:
            return None
        return wire.PhysicalLocation(artifact_location=file, region=region(place))

    def place(self, finding: Finding, design: DesignReview, **more: object) -> wire.Place:
        """Return where a finding stands: the file's line, the elements and the nets."""
        physical = self.physical(finding.location)
        if physical is None and (file := self.artifact(design.path)) is not None:
            physical = wire.PhysicalLocation(artifact_location=file)
        names = [(name, "element") for name in finding.designators]
        names += [(name, "net") for name in finding.nets]
        return wire.Place(
            physical_location=physical,
            logical_locations=tuple(
                wire.LogicalLocation(name=name.split(".")[-1], fully_qualified_name=name, kind=kind)
                for name, kind in names
                if name
            ),
            **more,  # type: ignore[arg-type]  # msgspec checks the names when the place is made
        )

    # ----------------------------------------------------------------- results

    def results(self, design: DesignReview) -> Iterable[wire.Result]:
        seen: Counter[str] = Counter()
        fixes = Fixes(design, self.review, self.artifact)
        for finding in design.findings:
            yield self.result(finding, design, seen, fixes.of(finding))

    def result(
        self,
        finding: Finding,
        design: DesignReview,
        seen: Counter[str],
        fixes: tuple[wire.Fix, ...],
    ) -> wire.Result:
        deck = from_root(design.path, self.root).encode("utf-8", "replace").decode("utf-8")
        mark = finding.fingerprint(deck)
        seen[mark] += 1
        again = f":{seen[mark]}" if seen[mark] > 1 else ""
        remedy = f" {words.FIT}: {finding.remedy}" if finding.remedy else ""
        return wire.Result(
            rule_id=finding.rule,
            rule_index=self.rule_index[finding.rule],
            level=LEVELS[finding.severity],
            message=_message(f"{finding.message}{remedy}"),
            locations=(self.place(finding, design),),
            related_locations=tuple(
                self.place(
                    inner,
                    design,
                    id=index,
                    message=_message(f"{words.FOLLOWS} {inner.message} ({inner.rule})"),
                )
                for index, inner in enumerate(with_consequences(finding.consequences))
            ),
            partial_fingerprints={FINGERPRINT: f"{mark}{again}"},
            suppressions=self.suppressions(finding, design.design.circuit),
            fixes=fixes,
            properties=_numbers(finding),
        )

    def suppressions(self, finding: Finding, circuit: Circuit) -> tuple[wire.Suppression, ...]:
        note = finding.waiver
        if note is None:
            return ()
        inside = note.location is not None and note.location.file in circuit.files
        physical = self.physical(note.location)
        told = {"by": note.by, "until": note.until}
        return (
            wire.Suppression(
                kind="inSource" if inside else "external",
                status="accepted",
                justification=sarif(note.reason),
                location=wire.Place(physical_location=physical) if physical else None,
                properties={name: text for name, text in told.items() if text},
            ),
        )

    # ----------------------------------------------------------- notifications

    def notifications(self, design: DesignReview) -> Iterable[wire.Notification]:
        """Yield what was not read, what was not judged, and how the rest was read."""
        for problem in design.design.problems:
            if problem.rule in _NOT_READ:
                yield self.not_read(problem, design)
        for group in open_groups(design.not_checked, design.design.stages):
            rules = {rule for _, names in group.about for rule in names}
            alone = rules.pop() if len(rules) == 1 else ""
            yield self.notice(
                "not-checked",
                "warning",
                f"{words.NOT_CHECKED}: {words.open_point(group)} {words.ADD}: {group.add}",
                Location(design.path, 0),
                alone,
            )
        for remark in design.design.remarks:
            place = remark.location or Location(design.path, 0)
            yield self.notice("read-as", "note", remark.message, place)

    def not_read(self, problem: Problem, design: DesignReview) -> wire.Notification:
        level: wire.Level = "warning" if design.design.circuit.readable else "error"
        place = problem.location or Location(design.path, 0)
        return self.notice("not-read", level, problem.message, place, problem.rule)

    def notice(
        self, kind: str, level: wire.Level, text: str, at: Location, rule: str = ""
    ) -> wire.Notification:
        physical = self.physical(at)
        known = rule in self.rule_index
        return wire.Notification(
            descriptor=wire.DescriptorReference(id=kind, index=self.notices.index(kind)),
            level=level,
            message=_message(text),
            locations=(wire.Place(physical_location=physical),) if physical else (),
            associated_rule=wire.DescriptorReference(id=rule, index=self.rule_index[rule])
            if known
            else None,
        )


def region(place: Location) -> wire.Region | None:
    """Return a place's line and columns, in characters; None for a file as a whole (line 0).

    A place of no length on its line's first column stands for the line.
    """
    if place.line < 1:
        return None
    if place.length <= 0 and place.column <= 1:
        return wire.Region(start_line=place.line)
    return wire.Region(
        start_line=place.line,
        start_column=place.column,
        end_column=place.column + max(place.length, 1),
    )


def _numbers(finding: Finding) -> dict[str, object]:
    """Return a finding's numbers as properties; what was not worked out is left out."""
    values: dict[str, object] = {
        "family": finding.family,
        "severity": finding.severity,
        "demand": finding.demand,
        "limit": finding.limit,
        "margin": finding.margin,
        "marginShare": finding.margin_share,
        "unit": finding.unit,
        "basis": list(finding.basis),
        "corner": finding.corner,
        "source": finding.source,
        "follows": [inner.rule for inner in with_consequences(finding.consequences)],
    }
    return {name: value for name, value in values.items() if value not in (None, "", [])}
