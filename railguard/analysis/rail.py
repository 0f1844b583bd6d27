"""What feeds the stages: rails with their capacitors, packages, and the supply at one stage's pins.

Plain frozen values; nothing here computes. Volts are relative to ground; None: not worked out.
"""

from typing import Literal

import msgspec

from railguard.analysis.bound import Range
from railguard.location import Location
from railguard.words import Basis


class Capacitor(msgspec.Struct, frozen=True):
    """A capacitor between a rail and another net.

    farads   None where its value is unknown
    to       the net of its other end
    behind   designator of a series element between it and the supply pins, or ""
    rating   V, where the card states one
    reversed  True where the card states a polarity and the level is the other way round
    """

    designator: str
    farads: float | None
    to: str
    behind: str = ""
    rating: float | None = None
    reversed: bool = False
    location: Location | None = None


class Rail(msgspec.Struct, frozen=True, kw_only=True):
    """A net that feeds supply pins.

    sign        "positive" or "negative": the pins it feeds
    level       volts; None: nothing states it
    worst       with the rail's tolerance
    basis       where the level came from
    origin      in words: `VP`, `the net's name`, `railguard.toml`
    tolerance   share, and whether the user stated it
    named       the level its name says, where it says one
    returns     nets that count as its return: ground, or the opposite rail where no ground is used
    decoupling  capacitors from the rail to a return
    across      capacitors from the rail to another rail
    packages    designators of packages fed
    ideal       True where an ideal source holds it directly
    series      designators between its source and its pins
    feed        "stated": a level is known; "outside": the net leaves what can be seen; "nothing":
                nothing on it could give it a level
    drop        V lost in `series` at the current its pins draw
    """

    net: str
    sign: Literal["positive", "negative"]
    level: float | None = None
    worst: Range = Range()
    basis: Basis = "netlist"
    origin: str = ""
    tolerance: float = 0.0
    tolerance_stated: bool = False
    named: float | None = None
    returns: tuple[str, ...] = ("0",)
    decoupling: tuple[Capacitor, ...] = ()
    across: tuple[Capacitor, ...] = ()
    upstream: tuple[Capacitor, ...] = ()
    packages: tuple[str, ...] = ()
    ideal: bool = False
    series: tuple[str, ...] = ()
    feed: Literal["stated", "outside", "nothing"] = "outside"
    drop: float | None = None
    location: Location | None = None


class Package(msgspec.Struct, frozen=True, kw_only=True):
    """What is soldered: its channels and the nets of its supply pins."""

    designator: str
    device: str
    family: str
    channels: tuple[str, ...]
    positive: tuple[str, ...]
    negative: tuple[str, ...]
    size: int | None = None
    location: Location | None = None


class Supply(msgspec.Struct, frozen=True, kw_only=True):
    """The rails of one stage, at its pins.

    total_low, total_high  total supply with the rails' tolerances
    """

    positive: float | None = None
    negative: float | None = None
    positive_net: str = ""
    negative_net: str = ""
    basis: Basis = "netlist"
    positive_worst: Range = Range()
    negative_worst: Range = Range()
    tolerance_stated: bool = False
    pins: bool = True

    @property
    def total(self) -> float | None:
        """V+ minus V-."""
        if self.positive is None or self.negative is None:
            return None
        return self.positive - self.negative
