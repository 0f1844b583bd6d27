"""Sources whose relation is more than a plain factor, as values the deck writer takes.

A macromodel steers its output with expressions and polynomials. An expression is read word by word:
numbers are printed anew, voltages become pins of a subcircuit of our own, functions come from a
short list that ngspice reads as everyone else does. Anything else is refused, so that nothing of a
netlist's own text reaches the simulator.
"""

import re
from collections.abc import Iterator, Mapping

import msgspec

from railguard.circuit.expressions import probes
from railguard.circuit.model import GROUND, Control, Element
from railguard.deck.numbers import read_number
from railguard.engine.waves import number
from railguard.engine.write import Placed

FUNCTIONS = frozenset(
    {"min", "max", "abs", "sqrt", "exp", "ln", "log", "log10", "pow", "tanh", "sinh", "cosh"}
    | {"atan", "sin", "cos", "sgn", "u", "uramp", "floor", "ceil"}
)
"""What means the same in every simulator; `limit` and `table` do not."""

_WORD = re.compile(
    r"\s*+(?:(?P<volts>v\s*\(\s*[^(),\s]+\s*(?:,\s*[^(),\s]+\s*)?\))"
    r"|(?P<number>(?:\d+(?:\.\d*)?|\.\d+)(?:e[+-]?\d+)?[a-z]*)"
    r"|(?P<name>[a-z_]\w*)"
    r"|(?P<sign>\*\*|<=|>=|==|!=|[-+*/^(),<>]))",
    re.IGNORECASE,
)
_POLY = re.compile(r"poly\s*+\(?\s*+(\d+)\s*\)?", re.IGNORECASE)


class Relation(msgspec.Struct, frozen=True):
    """A source written as an instance of a subcircuit made for it."""

    placed: Placed
    body: str


def relation(element: Element, name: str) -> Relation | None:
    """Return a B, E or G element with an expression or polynomial; None: it cannot be written.

    name  of the subcircuit to make
    """
    control = element.control
    if control is None or len(element.nets) < 2:
        return None
    quantity = "i" if element.kind == "G" else "v"
    if element.kind == "B":
        quantity = element.text[:1].lower()
    if quantity not in ("v", "i"):
        return None
    text = control.text.strip()
    pins, steering = _pins(control)
    if _POLY.match(text):
        expression = _polynomial(text, control.nets, pins)
    else:
        expression = _expression(_bare(text), steering)
    if expression is None:
        return None
    nets = (*element.nets[:2], *pins)
    ports = " ".join(("p", "m", *pins.values()))
    body = f".subckt {name} {ports}\nB1 p m {quantity}={expression}\n.ends"
    return Relation(Placed(element.designator, name, nets), body)


def linear_currents(element: Element) -> tuple[Element, ...] | None:
    """Return an F or H with a linear POLY as plain ones side by side; None: it is none.

    H sources would have to stand in series, so only one term of an H is taken.
    """
    words = (
        element.control.text.replace("(", " ").replace(")", " ").split() if element.control else []
    )
    if len(words) < 2 or words[0].lower() != "poly" or not words[1].isdigit():
        return None
    count = int(words[1])
    names, factors = words[2 : 2 + count], [read_number(word) for word in words[2 + count :]]
    values = [factor.spice for factor in factors if factor is not None]
    if len(names) != count or len(values) != len(factors) or len(values) > count + 1:
        return None
    prefix = element.designator.rpartition(".")[0]
    terms = [
        (f"{prefix}.{sense}" if prefix else sense, gain)
        for sense, gain in zip(names, values[1:], strict=False)
        if gain
    ]
    if (values and values[0]) or (element.kind == "H" and len(terms) > 1):
        return None
    return tuple(
        msgspec.structs.replace(
            element, designator=f"{element.designator}_{place}", control=Control(gain, (), sense)
        )
        for place, (sense, gain) in enumerate(terms, start=1)
    )


def _pins(control: Control) -> tuple[Mapping[str, str], Mapping[str, str]]:
    """Return pin names by circuit net, and by the net's name in the text (case folded)."""
    by_net: dict[str, str] = {}
    for net in control.nets:
        if net != GROUND:
            by_net.setdefault(net, f"q{len(by_net) + 1}")
    by_text = {
        written.casefold(): GROUND if net == GROUND else by_net[net]
        for written, net in zip(probes(control.text), control.nets, strict=False)
    }
    return by_net, by_text


def _bare(text: str) -> str:
    """Take `value={...}`, braces and quotes off."""
    text = re.sub(r"^(?:value|vol|cur)\s*=?\s*", "", text, flags=re.IGNORECASE)
    return text.strip().strip("{}'\"").strip()


def _expression(text: str, steering: Mapping[str, str]) -> str | None:
    words = []
    at = 0
    while at < len(text.rstrip()):
        found = _WORD.match(text, at)
        word = _written(found, steering) if found else None
        if found is None or word is None:
            return None
        words.append(word)
        at = found.end()
    return "".join(words) or None


def _written(found: re.Match[str], steering: Mapping[str, str]) -> str | None:
    if found["volts"]:
        inside = found["volts"].partition("(")[2].rstrip(") ").split(",")
        nodes = [steering.get(node.strip().casefold(), "") for node in inside]
        return f"v({','.join(nodes)})" if all(nodes) else None
    if found["number"]:
        value = read_number(found["number"])
        return None if value is None else number(value.spice)
    if found["name"]:
        name = found["name"].lower()
        return name if name in FUNCTIONS else None
    return found["sign"]


def _polynomial(text: str, nets: tuple[str, ...], pins: Mapping[str, str]) -> str | None:
    """Write a POLY of voltages: any power of one voltage, first powers of several."""
    head = _POLY.match(text)
    words = text[head.end() if head else 0 :].replace("(", " ").replace(")", " ").split()
    count = int(head[1]) if head else 0
    factors = [read_number(word) for word in words[2 * count :]]
    if len(nets) < 2 * count or not factors or any(factor is None for factor in factors):
        return None
    values = [factor.spice for factor in factors if factor is not None]
    names = [GROUND if net == GROUND else pins[net] for net in nets]
    volts = [f"v({names[2 * i]},{names[2 * i + 1]})" for i in range(count)]
    if count == 1 and len(values) == 1:
        return f"{number(values[0])}*{volts[0]}"
    if count > 1 and len(values) > count + 1:
        return None
    return "+".join(_terms(values, volts)) or "0"


def _terms(values: list[float], volts: list[str]) -> Iterator[str]:
    yield number(values[0])
    for place, value in enumerate(values[1:]):
        if len(volts) == 1:
            yield f"({number(value)})*{'*'.join(volts * (place + 1))}"
        else:
            yield f"({number(value)})*{volts[place]}"
