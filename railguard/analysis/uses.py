"""What a stage is meant to be, where nobody states it.

Only what the netlist shows without doubt: a channel that goes nowhere is unused; a stage that only
switches something is a comparator; positive feedback round a capacitor that its own output charges
is a relaxation oscillator. Everything else is taken as a linear stage.
"""

from railguard.analysis.loop import Loop
from railguard.analysis.recognise import Amplifier
from railguard.analysis.surroundings import Ways
from railguard.analysis.topology import Around
from railguard.circuit.model import GROUND
from railguard.words import Use

_SWITCHES = frozenset({"D", "Q", "M", "J", "S"})
_SHUTS = frozenset({"S", "W"})
_OPAQUE = frozenset({"ic", "opaque", "X"})
_LEAVES = frozenset({"open", "ic", "opaque", "X", "B", "E", "G"})


def worked_out_use(
    amplifier: Amplifier, ways: Ways, loop: Loop, inputs: frozenset[str], rails: frozenset[str]
) -> Use:
    """Return the use of a stage.

    inputs  input nets of all other amplifiers
    rails   nets that feed supply pins
    """
    if _goes_nowhere(amplifier, ways, inputs) and not _is_driven(amplifier, ways, rails):
        return "unused"
    if loop.dc in ("positive", "negative") and charges_itself(amplifier, ways):
        return "oscillator"
    if loop.dc == "negative":
        return "linear"
    if loop.bridges:
        return "linear"
    return "comparator" if _only_switches(amplifier, ways, inputs) else "linear"


def _goes_nowhere(amplifier: Amplifier, ways: Ways, inputs: frozenset[str]) -> bool:
    """Tell whether an output reaches nothing but the amplifier's own inverting input."""
    if amplifier.output in inputs:
        return False
    own = {amplifier.output, amplifier.minus}
    for element in ways.around.get(amplifier.output, ()):
        if len(element.nets) < 2 or not set(element.nets[:2]) <= own:
            return False
    return True


def _is_driven(amplifier: Amplifier, ways: Ways, rails: frozenset[str]) -> bool:
    """Tell whether anything but ground and a rail sets one input against the other."""
    if amplifier.plus == amplifier.minus:
        return False
    for net, other in ((amplifier.plus, amplifier.minus), (amplifier.minus, amplifier.plus)):
        around = Around(net, amplifier, ways, skip=other)
        if around.currents or any(n not in rails | {amplifier.output} for n in around.driven):
            return True
        if net == GROUND or net in rails:
            continue  # whatever stands on a rail stands on its net
        if any(e.kind == "V" and e.source is not None for e in ways.around.get(net, ())):
            return True
    return False


def charges_itself(amplifier: Amplifier, ways: Ways) -> bool:
    """Tell whether an output charges a capacitor at the inverting input and sets the other one."""
    if amplifier.minus in ways.held or amplifier.plus in ways.held:
        return False  # whatever is grounded somewhere stands on a grounded input's net
    on_minus = ways.around.get(amplifier.minus, ())
    if not any(e.kind == "C" and GROUND in e.nets for e in on_minus):
        return False
    # A net may hold hundreds of elements: each is looked through only where the last one says so.
    return all(
        any(e.kind == "R" and amplifier.output in e.nets for e in ways.around.get(pin, ()))
        for pin in (amplifier.minus, amplifier.plus)
    )


def bridges(amplifier: Amplifier, ways: Ways) -> tuple[str, ...]:
    """Return what may lead an output back to the inverting input, though not for all to see.

    A switch that resets an integrator, an analogue switch or a digital potentiometer: an element
    on the inverting input's own net whose other pins reach the output through resistors.
    """
    if amplifier.minus in ways.held:
        return ()
    found = []
    for element in ways.around.get(amplifier.minus, ()):
        if element.kind not in _SHUTS | _OPAQUE:
            continue
        pins = element.nets[:2] if element.kind in _SHUTS else element.nets
        if any(
            pin != amplifier.minus
            and pin not in ways.held
            and ways.shortest(amplifier.output, pin, "RL") is not None
            for pin in pins
        ):
            found.append(element.designator)
    return tuple(found)


def _only_switches(amplifier: Amplifier, ways: Ways, inputs: frozenset[str]) -> bool:
    """Tell whether an output reaches a diode, gate, base or switch, and nothing linear."""
    own = {amplifier.plus, amplifier.minus}
    switches = False
    seen = {amplifier.output}
    queue = [amplifier.output]
    while queue:
        at = queue.pop()
        if at in inputs and at not in own:
            return False
        for element in ways.around.get(at, ()):
            if element.kind in _SWITCHES:
                switches = True
            elif element.kind in _LEAVES:
                return False
            elif element.kind in ("R", "link") and len(element.nets) >= 2:
                for other in element.nets[:2]:
                    if other not in seen and other not in ways.held and other not in own:
                        seen.add(other)
                        queue.append(other)
    return switches
