"""One amplifier's numbers in the solved circuit, and why some of them are not known."""

from functools import cached_property

from railguard.analysis.bound import Range
from railguard.analysis.bounds import Exact
from railguard.analysis.equations import Real
from railguard.analysis.ranges import Answers, ToneAnswer
from railguard.analysis.recognise import Amplifier
from railguard.analysis.sampling import evaluate, exact_corners
from railguard.analysis.solution import Solution
from railguard.analysis.stage import Unknown
from railguard.analysis.unseen import Spoiled
from railguard.units import si
from railguard.words import Basis

DUST_SHARE = 1e-9
"""Share of a swing below which one of its ends is zero, but for what arithmetic leaves."""
DUST_VOLTS = 1e-12
"""The same for a voltage, whatever it swings by."""


DRIFT_SHARE = 0.02
"""Share of the supply that the lower rail may move by with the signal and still stand."""


def _settled(value: float, quantity: str, span: float = 0.0) -> float:
    """Return a value; zero where it is that but for arithmetic."""
    dust = DUST_SHARE * span
    if quantity != "current":
        dust = max(dust, DUST_VOLTS)
    return 0.0 if abs(value) <= dust else value


class View:
    """One amplifier's numbers in the solved circuit."""

    def __init__(self, solution: Solution, k: int, spoiled: list[Spoiled]) -> None:
        """Take amplifier number `k` of a solution."""
        self.solution = solution
        self.answers: Answers = solution.answers
        self.amplifier: Amplifier = solution.amplifiers[k]
        self.k = k
        self.spoiled = spoiled

    def at(self, quantity: str) -> int:
        """Return the index of a quantity."""
        return self.answers.at(self.k, quantity)

    @property
    def tones(self) -> tuple[ToneAnswer, ...]:
        """Return what the signals do; what a pair of followers adds to them is no signal."""
        pairs = self.solution.boost.pairs
        return tuple(t for t in self.answers.tones if t.tone.name not in pairs)

    def level(self, quantity: str) -> float:
        """Return its DC level."""
        return _settled(float(self.answers.level[self.at(quantity)]), quantity)

    def range(self, quantity: str) -> tuple[float, float]:
        """Return its lowest and highest value, nominal."""
        q = self.at(quantity)
        low, high = float(self.answers.low[q]), float(self.answers.high[q])
        span = high - low
        if span <= DUST_SHARE * max(abs(low), abs(high)):
            low = high = self.level(quantity)  # it stands still
        return _settled(low, quantity, span), _settled(high, quantity, span)

    def spoil(self, quantity: str) -> Spoiled:
        """Return what the netlist does not tell that moves it."""
        return self.spoiled[self.at(quantity)]

    def known(self, quantity: str) -> bool:
        """A quantity that something unseen moves at DC has no number.

        A small-signal probe leaves the deck's own DC level, which is stated. Where the signal moves
        the rails, no voltage has a number that could be held against them.
        """
        if quantity != "current" and self.drift:
            return False
        return all(thing.sort == "signal" for thing in self.spoil(quantity).dc)

    @cached_property
    def drift(self) -> float:
        """Return how far the signal moves the negative rail, V; 0: as good as not.

        A positive rail that moves alone is a supply that comes and goes, as a battery's.
        """
        if not self.amplifier.has_supply:
            return 0.0
        low, high = self.range("negative")
        total = self.level("positive") - self.level("negative")
        return high - low if high - low > DRIFT_SHARE * abs(total) else 0.0

    def basis(self, quantity: str) -> Basis:
        """Return where its range comes from: the user's signals, the deck or an assumed gain."""
        q = self.at(quantity)
        if q in self.solution.boost.assumed:
            return "assumed"
        moved = any(t.tone.basis == "user" and t.peaks[q] > 0 for t in self.answers.tones)
        return "user" if moved else "netlist"

    def unsure(self, quantity: str) -> float:
        """Return how far it may be off by what is assumed of transistors, in its unit."""
        moved = self.solution.boost.unsure
        return moved[self.at(quantity)] if moved else 0.0

    def exact(self, quantity: str, upper: bool, pin: str = "", sign: float = 1.0) -> Exact | None:
        """Return what solves a corner of a quantity anew, where the run asks for it.

        pin   quantity its limit follows, or ""
        sign  -1 for a demand that counts the quantity the other way round
        """
        solution = self.solution
        if not solution.exact:
            return None
        q, rail = self.at(quantity), self.at(pin) if pin else -1

        def solved(shares: Real) -> tuple[float, float]:
            at = evaluate(self.answers, solution.spread, shares[None, :])
            value = float((at.high if upper else at.low)[0, q])
            moved = float(at.high[0, rail] - self.answers.high[rail]) if pin else 0.0
            return sign * value, moved

        return solved

    def sampled(self, quantity: str) -> Range:
        """Return the range all Monte Carlo samples cover; unknown where none were drawn."""
        samples = self.solution.sampled
        if samples is None:
            return Range()
        q = self.at(quantity)
        return Range(float(samples.low[:, q].min()), float(samples.high[:, q].max()))

    def worst(self, quantity: str) -> Range:
        """Return its range with all tolerances, offset and bias at their extremes."""
        if self.solution.exact:
            at = exact_corners(self.answers, self.solution.spread, [self.at(quantity)])
            return Range(float(at.low[0, 0]), float(at.high[0, 0]))
        q, spread = self.at(quantity), self.solution.spread
        low, high = self.range(quantity)
        up = float(spread.reach(spread.high[q]))
        down = float(spread.reach(spread.low[q]))
        return Range(low - down, high + up)

    def rss(self, quantity: str) -> Range:
        """Return its range with all of them adding as roots of squares."""
        q, spread = self.at(quantity), self.solution.spread
        low, high = self.range(quantity)
        up = float(spread.root_sum_square(spread.high[q]))
        down = float(spread.root_sum_square(spread.low[q]))
        return Range(low - down, high + up)

    def why(self, quantity: str) -> Unknown | None:
        """Return why it is not fully known, or None."""
        if quantity != "current" and self.drift:
            return Unknown(
                f"the signal moves its negative rail by {si(self.drift, 'V')}, and only one that "
                "stands still is followed",
                "the same circuit with that rail as ground, node 0",
            )
        things = [*self.spoil(quantity).dc, *self.spoil(quantity).ac]
        if not things:
            return None
        more = f" (and {len(things) - 1} more)" if len(things) > 1 else ""
        return Unknown(things[0].why + more, things[0].add)
