"""Which net is ground, and which net was meant where none is."""

import re
from collections.abc import Iterable

from railguard.circuit.model import Element
from railguard.notices import Problem

GROUNDS = frozenset({"0", "gnd"})
"""What is ground to every SPICE of today, case-folded."""

ELSEWHERE = frozenset({"gnd!", "ground", "00", "000"})
"""What is ground to some: HSPICE takes the words, SPICE 2 and HSPICE every zero."""

_MEANT = (
    re.compile(r"(?i)^/?(gnd!|ground|00+)$"),
    re.compile(r"(?i)(^|[^a-z])[a-z]?gnd"),
    re.compile(r"(?i)(^|[^0-9.])0v"),
    re.compile(r"(?i)gnd|ground|earth"),
    re.compile(r"(?i)(^|[^a-z])(vss|com(mon)?|return|rtn)([^a-z]|$)"),
)
"""Names of a return net, the plainest first; common practice, no source."""


def likely_ground(elements: Iterable[Element]) -> str:
    """Return the net that was most likely meant as ground, as written, or ""."""
    counts: dict[str, int] = {}
    for element in elements:
        for net in dict.fromkeys(element.nets):
            counts[net] = counts.get(net, 0) + 1
    for pattern in _MEANT:
        fitting = [net for net in counts if pattern.search(net)]
        if fitting:
            return max(fitting, key=lambda net: counts[net])
    return ""


def no_ground(likely: str, elements: Iterable[Element]) -> Problem:
    """Say that no card touches ground, and what was taken for it."""
    message = "No card touches ground (net 0 or GND), so no level can be told."
    remedy = "Name the return net 0."
    if likely:
        touching = sum(likely in element.nets for element in elements)
        many = f"{touching} elements touch" if touching != 1 else "one element touches"
        message = (
            f"No card touches ground (net 0 or GND). The net {likely}, which {many}, was most "
            "likely meant, and the review went on with that."
        )
        remedy = f"Name {likely} 0 or GND."
    return Problem(
        rule="netlist-ground",
        message=message,
        remedy=remedy,
        nets=(likely,) if likely else (),
        severity="minor" if likely else None,
    )


def other_grounds(nets: Iterable[str], elements: Iterable[Element]) -> list[Problem]:
    """Say which nets beside ground are ground to other programs, and are nets of their own here."""
    found = {net: next((e for e in elements if net in e.nets), None) for net in nets}
    return [
        Problem(
            rule="netlist-ground",
            message=f"The net {net} is a net of its own beside ground; some SPICE programs take it "
            "for ground.",
            remedy=f"Name it 0 if it is ground, or otherwise than {net}.",
            location=element.location if element is not None else None,
            nets=(net,),
            severity="minor",
        )
        for net, element in found.items()
    ]
