"""What a redline is made of: edits of a deck's text, proposals, and devices to fit instead.

Plain frozen values. An edit speaks of the file as it was read: lines and columns count characters
from 1, as `Location` does.
"""

import msgspec

from railguard.location import Location
from railguard.rules.finding import Finding
from railguard.words import Verdict


class Edit(msgspec.Struct, frozen=True, order=True):
    """One stretch of a file replaced: `length` characters from `column` on by `text`.

    length  0: nothing is taken away. An added card stands behind the end of the line before it, so
            that its text begins with a line feed, whatever the file's own line end is
    text    what stands there afterwards
    """

    file: str
    line: int
    column: int
    length: int
    text: str

    @property
    def location(self) -> Location:
        """The stretch that is replaced."""
        return Location(self.file, self.line, self.column, self.length)


class Figure(msgspec.Struct, frozen=True):
    """One figure that decides between devices: what is asked for and what a device gives."""

    words: str
    needed: str
    given: str


class Substitute(msgspec.Struct, frozen=True, kw_only=True):
    """A device that passes every limit the fitted one fails, in the same place.

    code     an order code of the family with as many channels as the package has
    remains  findings of the stage that stay, as sentences
    """

    family: str
    code: str
    description: str
    figures: tuple[Figure, ...]
    remains: tuple[str, ...] = ()


class Proposal(msgspec.Struct, frozen=True, kw_only=True):
    """Changed and added cards that cure or ease one finding, proved by a review of the new deck.

    finding    what is cured
    what       the change in one sentence: `C46 of 100 nF from vpp to 0.`
    reason     one line for the hunk: the rule, and why this value
    choice     where several values would do: what speaks for this one, else ""
    edits      in the order of the file, none overlapping another
    cures      every finding that is gone with it, the one above among them unless it is eased
    left       what is left of the one above, milder, where no card cures it whole
    uncovered  findings that were there and could not be seen: of a stage that did not work, of a
               deck that was not known for a board. They are milder than the one above
    instead    devices that would do without the change, where it costs gain; best fit first
    """

    finding: Finding
    what: str
    reason: str
    choice: str = ""
    edits: tuple[Edit, ...]
    cures: tuple[Finding, ...]
    left: tuple[Finding, ...] = ()
    uncovered: tuple[Finding, ...] = ()
    instead: tuple[Substitute, ...] = ()


class Advice(msgspec.Struct, frozen=True, kw_only=True):
    """What to do about a finding that no card cures.

    why      what stands against a cure by cards
    devices  best fit first; only devices a review with them in place has passed
    tried    how many devices of the catalogue were reviewed in place
    looked   True where the catalogue was looked through
    """

    finding: Finding
    why: str
    devices: tuple[Substitute, ...] = ()
    tried: int = 0
    looked: bool = False


class Changed(msgspec.Struct, frozen=True):
    """A file before and after, with the reason of every line that is new or changed.

    reasons  (line number afterwards, reason), in order
    """

    file: str
    before: str
    after: str
    reasons: tuple[tuple[int, str], ...]


class Redline(msgspec.Struct, frozen=True, kw_only=True):
    """The whole answer for one deck.

    proposals  in the order they were laid over each other
    gone       findings that are in no review of the changed deck
    remaining  those that are still there
    uncovered  those of them that could not be seen before
    held       True where one of those stands at the hold level or above
    verdict    of the changed deck
    files      the changed files
    data       every file of the deck as bytes after the changes, the main deck first
    why        why nothing could be proposed at all, or ""
    """

    path: str
    verdict: Verdict
    held: bool
    proposals: tuple[Proposal, ...] = ()
    advice: tuple[Advice, ...] = ()
    gone: tuple[Finding, ...] = ()
    remaining: tuple[Finding, ...] = ()
    uncovered: tuple[Finding, ...] = ()
    files: tuple[Changed, ...] = ()
    data: tuple[tuple[str, bytes], ...] = ()
    why: str = ""
