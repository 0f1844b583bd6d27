"""Names of stages for people. Rules rest on the algebra, never on these."""

from railguard.analysis.loop import Loop
from railguard.analysis.recognise import Amplifier
from railguard.analysis.surroundings import Ways
from railguard.circuit.model import GROUND, Element

_PASSIVE = ("R", "C", "L", "link")


class Around:
    """What a search from one input pin meets, without crossing held nets or outputs."""

    def __init__(self, start: str, amplifier: Amplifier, ways: Ways, skip: str) -> None:
        self.driven: list[str] = []
        self.currents: list[str] = []
        self.own_output: list[Element] = []
        self.first: list[Element] = []
        self.driven_by: set[str] = set()
        stiff = start in ways.held or (start in ways.outputs and start != amplifier.output)
        seen = {start}
        queue = [] if stiff else [start]
        while queue:
            at = queue.pop()
            for element in ways.around.get(at, ()):
                if element.kind in ("I", "D") and at == start:
                    self.currents.append(element.designator)
                if element.kind not in _PASSIVE or len(element.nets) < 2:
                    if element.kind in ("open", "ic", "opaque", "X") and at != start:
                        self.driven.append(at)
                    continue
                other = element.nets[1] if element.nets[0] == at else element.nets[0]
                if other == amplifier.output:
                    self.own_output.append(element)
                    continue
                if other == skip:
                    continue
                if at == start:
                    self.first.append(element)
                if other in ways.held or other in ways.outputs:
                    if other != GROUND and not _is_level(other, ways):
                        self.driven.append(other)
                        self.driven_by.add(element.kind)
                    continue
                if other not in seen:
                    seen.add(other)
                    queue.append(other)
        direct = start in ways.outputs or (start in ways.held and start != GROUND)
        if direct and not _is_level(start, ways):
            self.driven.append(start)
        for element in () if stiff else ways.around.get(start, ()):
            if element.kind in ("open", "ic", "opaque"):
                self.driven.append(start)


def _is_level(net: str, ways: Ways) -> bool:
    """Tell whether a net is held at a standing level: a rail or a reference, no signal."""
    for element in ways.around.get(net, ()):
        if element.kind in ("V", "battery") and element.nets[0] == net and element.source:
            source = element.source
            return source.wave is None and source.ac is None and bool(source.dc)
    return False


def topology_of(
    amplifier: Amplifier,
    ways: Ways,
    loop: Loop,
    rails: frozenset[str],
    outer: frozenset[str] = frozenset(),
) -> str:
    """Return the stage's name: follower, inverting, non-inverting, difference, ...

    outer  outputs that close this stage's loop in place of its own: feedback, no signal
    """
    if loop.dc == "positive":
        return "comparator with hysteresis"
    plus = Around(amplifier.plus, amplifier, ways, skip=amplifier.minus)
    minus = Around(amplifier.minus, amplifier, ways, skip=amplifier.plus)
    plus_driven = [n for n in plus.driven if n not in rails]
    minus_driven = [n for n in minus.driven if n not in rails and n not in outer]
    wired = amplifier.output == amplifier.minus
    if loop.dc == "open" and not wired and not minus.own_output:
        return "comparator"
    if wired:
        return _sallen_key(plus) or "follower"
    if plus_driven and minus_driven:
        return "difference"
    if plus_driven:
        adds = len(set(plus_driven)) > 1 and all(e.kind == "R" for e in plus.first)
        return _sallen_key(plus) or ("summing" if adds else "non-inverting")
    kinds = {e.kind for e in minus.own_output}
    if minus.currents and not minus_driven:
        return "transimpedance"
    resistors = [e for e in minus.first if e.kind in ("R", "link")]
    feedback = _direct(amplifier, ways)
    if feedback == {"C"}:
        low_pass = minus_driven and _capacitor_within(minus.own_output, amplifier, ways)
        return "multiple-feedback filter" if low_pass else "integrator"
    if minus_driven and len(minus.own_output) > 1 and feedback != {"R", "C"} and len(kinds) > 1:
        return "multiple-feedback filter"
    if len(set(minus_driven)) > 1 and len(resistors) > 1:
        return "summing"
    if minus_driven:
        if feedback == {"R", "C"}:
            return "inverting low-pass"
        return "inverting"
    return "non-inverting" if amplifier.plus != GROUND else "other"


def _capacitor_within(own_output: list[Element], amplifier: Amplifier, ways: Ways) -> bool:
    """Tell whether a resistor leads the output back to a net that a capacitor hangs on.

    With a capacitor straight across the stage that makes a multiple-feedback low-pass of what would
    be an integrator held by a T of resistors.
    """
    ends = {amplifier.output, amplifier.minus}
    inner = {n for e in own_output if e.kind == "R" for n in e.nets[:2]} - ends
    return any(e.kind == "C" for net in inner for e in ways.around.get(net, ()))


def instrumentation(names: dict[str, str], after: dict[str, tuple[str, ...]]) -> dict[str, str]:
    """Rename the three amplifiers of an instrumentation amplifier.

    names  topology by designator; two stages that reach each other's inputs and a difference
           stage behind both are one instrumentation amplifier
    """
    renamed = {}
    for name, before in after.items():
        pairs = [
            p for p in before if any(p in after[q] and q in after[p] for q in before if q != p)
        ]
        if names[name] == "difference" and len(pairs) == 2 and name not in after[pairs[0]]:
            renamed[name] = "instrumentation amplifier, output"
            renamed.update(dict.fromkeys(pairs, "instrumentation amplifier, input"))
    return {**names, **renamed}


def _direct(amplifier: Amplifier, ways: Ways) -> set[str]:
    between = {amplifier.output, amplifier.minus}
    return {
        e.kind
        for e in ways.around.get(amplifier.minus, ())
        if e.kind in _PASSIVE and set(e.nets[:2]) == between
    }


def _sallen_key(plus: Around) -> str:
    """A positive path from the output to a node before the input makes a Sallen-Key filter."""
    kinds = {e.kind for e in plus.own_output}
    if kinds == {"C"}:
        return "Sallen-Key low-pass"
    if kinds != {"R"} or not any(e.kind == "C" for e in plus.first):
        return ""
    return "Sallen-Key high-pass" if plus.driven_by == {"C"} else "Sallen-Key band-pass"
