"""The analyses the engine may ask ngspice for, as values.

Each knows the card it is, and whether a plot that came back is its complete answer.
"""

import math

import msgspec

from railguard.engine.rawfile import Plot


class OperatingPoint(msgspec.Struct, frozen=True):
    """The DC operating point."""

    @property
    def card(self) -> str:
        """The analysis card."""
        return ".op"

    def complete(self, plot: Plot) -> bool:
        """Tell whether `plot` is this analysis, run to its end."""
        return plot.name == "Operating Point" and plot.points == 1


class Sweep(msgspec.Struct, frozen=True):
    """A DC sweep of one source (its name in the written deck), V or A."""

    source: str
    start: float
    stop: float
    step: float

    @property
    def card(self) -> str:
        """The analysis card."""
        return f".dc {self.source} {self.start:.9g} {self.stop:.9g} {self.step:.9g}"

    def complete(self, plot: Plot) -> bool:
        """Tell whether `plot` is this analysis, run to its end."""
        wanted = math.floor(abs((self.stop - self.start) / self.step) * (1 + 1e-9)) + 1
        # The last point is lost or gained where the step does not divide the span exactly.
        return plot.name.startswith("DC transfer") and abs(plot.points - wanted) <= 1


class SmallSignal(msgspec.Struct, frozen=True):
    """A small-signal frequency sweep, hertz, `per_decade` points a decade."""

    per_decade: int
    start: float
    stop: float

    @property
    def card(self) -> str:
        """The analysis card."""
        return f".ac dec {self.per_decade} {self.start:.9g} {self.stop:.9g}"

    def complete(self, plot: Plot) -> bool:
        """Tell whether `plot` is this analysis, run to its end."""
        wanted = math.floor(self.per_decade * math.log10(self.stop / self.start) * (1 + 1e-9)) + 1
        if plot.name != "AC Analysis" or abs(plot.points - wanted) > 1:
            return False
        # Several sweeps of one deck may have the same number of points.
        return math.isclose(plot.real("frequency")[0], self.start, rel_tol=1e-6)


class Transient(msgspec.Struct, frozen=True):
    """A transient run, seconds: printed step, end, start of what is kept, largest step."""

    step: float
    stop: float
    start: float = 0.0
    largest: float | None = None

    @property
    def card(self) -> str:
        """The analysis card."""
        largest = self.step if self.largest is None else self.largest
        return f".tran {self.step:.9g} {self.stop:.9g} {self.start:.9g} {largest:.9g}"

    def complete(self, plot: Plot) -> bool:
        """Tell whether `plot` is this analysis, run to its end."""
        if plot.name != "Transient Analysis" or plot.points < 2:
            return False
        return bool(plot.real("time")[-1] >= self.stop * (1 - 1e-6))


Request = OperatingPoint | Sweep | SmallSignal | Transient
