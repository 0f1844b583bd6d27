"""Changes proposed by the redline, as SARIF fixes: what to replace in which file.

Each was proved by a review of the changed netlist, which costs some reviews; a run over many
netlists goes without.
"""

from collections.abc import Callable

from railguard.redline.model import Edit, Proposal
from railguard.report import sarif_types as wire
from railguard.report.escaping import sarif
from railguard.reviewing import DesignReview, Review
from railguard.rules.finding import Finding

MOST_NETLISTS = 12
"""Netlists of one run up to which changes are worked out, as many as a report shows in full."""

Address = Callable[[str], wire.ArtifactLocation | None]


class Fixes:
    """The proposals for one netlist, by finding."""

    def __init__(self, design: DesignReview, review: Review, address: Address) -> None:
        self._address = address
        self._texts = design.design.circuit.texts
        self._proposals: tuple[Proposal, ...] = ()
        if len(review.designs) <= MOST_NETLISTS and any(f.waiver is None for f in design.findings):
            # Its cures and their proofs are of use to no other report.
            from railguard.redline.propose import proposals

            self._proposals = proposals(design)

    def of(self, finding: Finding) -> tuple[wire.Fix, ...]:
        """Return the change that cures a finding, if there is one."""
        return tuple(
            made
            for proposal in self._proposals
            if proposal.finding == finding and (made := self._fix(proposal)) is not None
        )

    def _fix(self, proposal: Proposal) -> wire.Fix | None:
        edits: dict[str, list[Edit]] = {}
        for edit in proposal.edits:
            edits.setdefault(edit.file, []).append(edit)
        changes = []
        for file, own in edits.items():
            place = self._address(file)
            if place is None:
                return None
            replaced = tuple(self._replacement(edit) for edit in own)
            changes.append(wire.ArtifactChange(artifact_location=place, replacements=replaced))
        words = f"{proposal.what} {proposal.choice}".strip()
        return wire.Fix(
            description=wire.Message(text=sarif(words)), artifact_changes=tuple(changes)
        )

    def _replacement(self, edit: Edit) -> wire.Replacement:
        """Return an edit; the lines it adds end as those of its file do."""
        ends = "\r\n" if "\r\n" in self._texts.get(edit.file, "") else "\n"
        return wire.Replacement(
            deleted_region=wire.Region(
                start_line=edit.line,
                start_column=edit.column,
                end_column=edit.column + edit.length,
            ),
            inserted_content=wire.Content(text=edit.text.replace("\n", ends)),
        )
