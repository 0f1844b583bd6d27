"""One amplifier's numbers in the solved circuit, and why some of them are not known."""

import numpy as np

from railguard.analysis.ranges import Answers
from railguard.analysis.recognise import Amplifier
from railguard.analysis.solution import Solution
from railguard.analysis.stage import Range, Unknown
from railguard.analysis.unseen import Spoiled
from railguard.words import Basis


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

    def level(self, quantity: str) -> float:
        """Return its DC level."""
        return float(self.answers.level[self.at(quantity)])

    def range(self, quantity: str) -> tuple[float, float]:
        """Return its lowest and highest value, nominal."""
        q = self.at(quantity)
        return float(self.answers.low[q]), float(self.answers.high[q])

    def spoil(self, quantity: str) -> Spoiled:
        """Return what the netlist does not tell that moves it."""
        return self.spoiled[self.at(quantity)]

    def known(self, quantity: str) -> bool:
        """A quantity that something unseen moves at DC has no number.

        A small-signal probe leaves the deck's own DC level, which is stated.
        """
        return all(thing.sort == "signal" for thing in self.spoil(quantity).dc)

    def basis(self, quantity: str) -> Basis:
        """Return where its range comes from: the user's signals or the deck."""
        q = self.at(quantity)
        moved = any(t.tone.basis == "user" and t.peaks[q] > 0 for t in self.answers.tones)
        return "user" if moved else "netlist"

    def worst(self, quantity: str) -> Range:
        """Return its range with all tolerances, offset and bias at their extremes."""
        q, spread = self.at(quantity), self.solution.spread
        low, high = self.range(quantity)
        up = float(np.abs(spread.high[q]) @ spread.delta)
        down = float(np.abs(spread.low[q]) @ spread.delta)
        return Range(low - down, high + up)

    def rss(self, quantity: str) -> Range:
        """Return its range with all of them adding as roots of squares."""
        q, spread = self.at(quantity), self.solution.spread
        low, high = self.range(quantity)
        up = float(np.linalg.norm(spread.high[q] * spread.delta))
        down = float(np.linalg.norm(spread.low[q] * spread.delta))
        return Range(low - down, high + up)

    def why(self, quantity: str) -> Unknown | None:
        """Return why it is not fully known, or None."""
        things = [*self.spoil(quantity).dc, *self.spoil(quantity).ac]
        if not things:
            return None
        more = f" (and {len(things) - 1} more)" if len(things) > 1 else ""
        return Unknown(things[0].why + more, things[0].add)
