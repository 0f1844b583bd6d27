"""The fault suite: every class of faults in every circuit on every amplifier, in several spellings.

    for case in cases():
        case.name, case.sound, case.faulty      # texts of two netlists
        case.rules, case.who                    # any of these rules must name any of these

`cases(every=20)` yields every twentieth, spread over circuits, amplifiers, classes and spellings.
"""

from collections.abc import Iterable, Iterator
from typing import NamedTuple

from tests.faults import classes
from tests.faults.amplifiers import Amplifier
from tests.faults.cards import SPELLINGS, Spelling
from tests.faults.circuits import bases


class Case(NamedTuple):
    """One fault in one circuit.

    name    `circuit, device, class, spelling`
    sound   text of the netlist without the fault; `faulty` with it
    rules   names of rules any of which tells the fault, the best first
    who     designators or nets as the faulty text spells them, any of which must be named
    holds   True where it must be major at least
    """

    name: str
    circuit: str
    device: str
    fault: str
    spelling: str
    sound: str
    faulty: str
    rules: tuple[str, ...]
    who: tuple[str, ...]
    holds: bool

    @property
    def family(self) -> str:
        """The family of the best rule."""
        return self.rules[0].split("-", 1)[0]


BLIND = {
    "capitals": ("netlist-value-suffix",),
    "parametrised": ("netlist-value-missing",),
    "blocked": ("netlist-duplicate", "supply-package-split", "headroom-load"),
}
"""What a spelling hides: 1M is no trap where every letter is a capital, and the like."""


def spellings(a: Amplifier, rules: Iterable[str]) -> tuple[Spelling, ...]:
    """Return the ways in which a fault on a device can be written down."""
    return tuple(
        s
        for s in SPELLINGS
        if not (s.name == "exported" and a.channels == 1)
        and not set(rules) & set(BLIND.get(s.name, ()))
    )


def cases(every: int = 1, start: int = 0) -> Iterator[Case]:
    """Yield the cases of the suite, each in one spelling in turn.

    every  yield only each n-th, beginning with number `start`
    """
    count = 0
    for base in bases():
        for made in classes.ALL:
            fault = made(base)
            if fault is None:
                continue
            count += 1
            if (count - 1 - start) % every:
                continue
            usable = spellings(base.amplifier, fault.rules)
            spelling = usable[count % len(usable)]
            yield Case(
                name=f"{base.name}, {base.amplifier.name}, {made.__name__}, {spelling.name}",
                circuit=base.name,
                device=base.amplifier.name,
                fault=made.__name__,
                spelling=spelling.name,
                sound=spelling.text(base.cards),
                faulty=spelling.text(fault.cards),
                rules=fault.rules,
                who=tuple(spelling.called(w, fault.cards) for w in fault.who),
                holds=fault.holds,
            )
