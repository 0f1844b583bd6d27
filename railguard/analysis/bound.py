"""A figure's range, and one side of it with everything that stands against it.

Plain frozen values; nothing here computes. SI units; None: not worked out.
"""

import msgspec

from railguard.words import Basis


class Range(msgspec.Struct, frozen=True):
    """The lowest and the highest value of a quantity."""

    low: float | None = None
    high: float | None = None

    @property
    def span(self) -> float | None:
        """Width of the range."""
        return None if self.low is None or self.high is None else self.high - self.low


class Pair(msgspec.Struct, frozen=True):
    """A demand and the limit it meets, at one corner of the tolerances."""

    demand: float
    limit: float


class Bound(msgspec.Struct, frozen=True, kw_only=True):
    """One side of one quantity, and everything that stands against it.

    upper        True: demand must stay below the limits; False: above them
    demand       nominal
    level        the DC level alone, nominal
    span         of the whole demanded range (both sides)
    typical      the typical limit
    guaranteed   what the data sheet guarantees
    absolute     the rail itself, or an absolute maximum; `absolute_basis` where it came from
    stated       demand and guaranteed limit at the worst corner of tolerances the user stated
    default      the same with default tolerances, offset and bias added
    typical_basis, guaranteed_basis   where each limit came from
    demand_basis  where the demand came from, the least trusted of its parts
    culprits     designators that move the corner most, worst first
    condition    the load, current or supply the limit was taken at, in words
    unsure       how far the demand may be off by what is assumed: less beyond a limit is no proof
    """

    upper: bool
    demand: float | None = None
    level: float | None = None
    span: float | None = None
    typical: float | None = None
    guaranteed: float | None = None
    absolute: float | None = None
    stated: Pair | None = None
    default: Pair | None = None
    typical_basis: Basis = "catalogue"
    guaranteed_basis: Basis = "catalogue"
    absolute_basis: Basis = "netlist"
    demand_basis: Basis = "netlist"
    culprits: tuple[str, ...] = ()
    condition: str = ""
    unsure: float = 0.0

    @property
    def best(self) -> float | None:
        """The guaranteed limit, or the typical one where none is guaranteed."""
        return self.guaranteed if self.guaranteed is not None else self.typical

    @property
    def best_basis(self) -> Basis:
        """Where `best` came from."""
        return self.guaranteed_basis if self.guaranteed is not None else self.typical_basis
