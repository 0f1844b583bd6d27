"""Values that say what reading found, and what could not be judged."""

import msgspec

from railguard.location import Location
from railguard.words import Severity


class Problem(msgspec.Struct, frozen=True):
    """Something the reader met; the netlist rules turn it into a finding.

    rule          name of the netlist rule it belongs to: `netlist-card`, ...
    message       what was found and what was expected, in the words of the trade
    remedy        what to write instead, or ""
    designators   elements concerned, as written
    nets          nets concerned, as written
    spice_value   the value as SPICE takes it (SI), where the problem is a value
    likely_value  the value its author most likely meant (SI); the analysis goes on with this one
    unit          unit of both
    severity      where the reader knows better than the rule's own severity
    """

    rule: str
    message: str
    remedy: str = ""
    location: Location | None = None
    designators: tuple[str, ...] = ()
    nets: tuple[str, ...] = ()
    spice_value: float | None = None
    likely_value: float | None = None
    unit: str = ""
    severity: Severity | None = None


class Remark(msgspec.Struct, frozen=True):
    """How something was read, said once in the report: an encoding, an assumed pin order."""

    message: str
    location: Location | None = None


class NotChecked(msgspec.Struct, frozen=True, order=True):
    """A judgement that could not be made.

    subject  designator, rail net or file it is about
    rule     the rule that stayed open
    why      what is missing
    add      what the user can state to get it checked
    """

    subject: str
    rule: str
    why: str
    add: str
