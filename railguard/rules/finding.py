"""A finding: one fault of a design, with its numbers."""

import hashlib
from typing import Literal

import msgspec

from railguard.location import Location
from railguard.words import Basis, Family, Severity


class WaiverNote(msgspec.Struct, frozen=True):
    """The waiver a finding was accepted under."""

    reason: str
    by: str = ""
    until: str = ""
    location: Location | None = None


class Finding(msgspec.Struct, frozen=True, kw_only=True):
    """One fault.

    demand, limit, margin  in `unit`; margin is signed, positive is room left
    margin_share           of the demanded span
    basis                  where demand and limit came from, without repeats
    corner                 "nominal" or "worst-case"
    message                a sentence with its numbers
    remedy                 what to change, with a value that can be bought
    source                 the published reason, or "common practice, no source"
    cause                  designator or net this follows from; "" : itself a cause
    consequences           findings that follow from this one
    """

    rule: str
    family: Family
    severity: Severity
    designators: tuple[str, ...] = ()
    nets: tuple[str, ...] = ()
    demand: float | None = None
    limit: float | None = None
    margin: float | None = None
    margin_share: float | None = None
    unit: str = ""
    basis: tuple[Basis, ...] = ()
    corner: Literal["nominal", "worst-case"] = "nominal"
    message: str
    remedy: str = ""
    source: str = ""
    location: Location | None = None
    waiver: WaiverNote | None = None
    cause: str = ""
    consequences: tuple["Finding", ...] = ()

    def fingerprint(self, deck: str) -> str:
        """Name this finding so that it is found again: no line numbers, no values.

        deck  the deck's path relative to the run's root, with forward slashes
        """
        text = "\x1f".join((self.rule, deck, *self.designators, "\x1e", *self.nets))
        return hashlib.sha256(text.encode()).hexdigest()[:24]
