"""The four resistors of a difference amplifier, and the sense resistor they stand across."""

from railguard.analysis.corners import tolerance_of
from railguard.analysis.loop import Balance
from railguard.analysis.surroundings import Ways, divider_at
from railguard.analysis.view import View
from railguard.circuit.model import GROUND, Element
from railguard.settings.model import Tolerances

LIKE = 0.02
"""Share by which the two ratios may differ and still be meant to be one."""
SENSE_SHARE = 0.1
"""A resistor between the two inputs is a sense resistor below this share of those it feeds."""


def balance_of(view: View, stated: Tolerances, rails: frozenset[str]) -> Balance | None:
    """Return the balanced resistors round a stage, or None where it has no such four.

    One from the output and one from an input meet at the inverting input, two of the same ratio at
    the non-inverting one; nothing else that conducts does.
    """
    amplifier, ways = view.amplifier, view.solution.ways
    own = _resistors(amplifier.minus, ways)
    others = _resistors(amplifier.plus, ways)
    if len(own) != 2 or len(others) != 2:
        return None
    back = next((e for e in own if amplifier.output in e.nets[:2]), None)
    if back is None:
        return None
    (lead,) = (e for e in own if e is not back)
    pairs: list[Balance] = []
    for first, second in (others, others[::-1]):
        if abs(_ohms(second) / _ohms(first) * _ohms(lead) / _ohms(back) - 1.0) > LIKE:
            continue
        ends = {_far(lead, amplifier.minus), _far(first, amplifier.plus)}
        four = (lead, back, first, second)
        told = [tolerance_of(e, stated) for e in four]
        at = _far(second, amplifier.plus)
        bare = divider_at(at, ways, rails) if at not in ways.held | ways.outputs else None
        found = Balance(
            elements=tuple(e.designator for e in four),
            gain=_ohms(back) / _ohms(lead),
            tolerance=sum(share for share, _ in told),
            stated=all(is_stated for _, is_stated in told),
            reference=_level(at, view),
            sense=_sense(ends, SENSE_SHARE * min(_ohms(lead), _ohms(first)), ways),
            source=() if bare is None else bare.elements,
            source_ohms=0.0 if bare is None else bare.resistance,
            source_farads=0.0 if bare is None else bare.bypass,
            fellow=_ohms(second),
        )
        pairs.append(found)
    return next((f for f in pairs if f.sense), next(iter(pairs), None))


def _resistors(net: str, ways: Ways) -> tuple[Element, ...]:
    """Return the resistors on a net where only capacitors and the amplifier stand beside them."""
    around = ways.around.get(net, ())
    if net in ways.held or any(e.kind not in ("R", "C") for e in around):
        return ()
    return tuple(e for e in around if e.kind == "R" and e.value and e.value > 0)


def _sense(ends: set[str], most: float, ways: Ways) -> str:
    """Return what joins the two inputs: a small resistor, or the source of their difference."""
    for element in ways.around.get(min(ends), ()):
        if len(ends) != 2 or GROUND in ends or set(element.nets[:2]) != ends:
            continue  # across a resistor to ground there is no common mode
        if element.kind == "V" or (element.kind == "R" and 0 < _ohms(element) <= most):
            return element.designator
    return ""


def _level(net: str, view: View) -> float:
    row = view.answers.network.row(net)
    return float(view.answers.x[row].real) if row >= 0 else 0.0


def _ohms(element: Element) -> float:
    return element.value or 1.0


def _far(element: Element, net: str) -> str:
    return element.nets[1] if element.nets[0] == net else element.nets[0]
