"""Cards of sources, controlled sources, semiconductors and the letters nobody works out."""

from railguard.circuit.card import COUNTS, Names, flat
from railguard.circuit.expressions import probes
from railguard.circuit.model import Control, Element
from railguard.circuit.sources import multiplied
from railguard.circuit.values import not_fitted
from railguard.circuit.waveforms import Found, SourceError, read_source
from railguard.circuit.written import text_of
from railguard.deck.cards import Assignment, Items
from railguard.deck.lines import Line
from railguard.deck.numbers import read_number


def independent(names: Names, items: Items, line: Line, letter: str) -> list[Element]:
    """Bind V and I: two nodes, then DC, AC and a time function."""
    name = text_of(items[0])
    kind = "voltage source" if letter == "V" else "current source"
    nets, rest = names.nodes(items, 2, line, f"{kind} {name}")
    try:
        found = read_source(rest, lambda word: names.number(word, letter))
    except SourceError as error:
        names.told("netlist-source", f"The {kind} {names.prefix}{name}: {error}.", line, name)
        found = Found(stated=False)
    if found.doubled:
        names.told(
            "netlist-source",
            f"The {kind} {names.prefix}{name} states two values, {found.doubled}: the first "
            "counts.",
            line,
            name,
            "Leave one of them out.",
        )
    source = found.source()
    if letter == "I" and (many := _times(names, rest)) != 1.0:
        source = multiplied(source, many)
    return [
        Element(
            kind=letter, designator=name, nets=nets, source=source, text=found.passed_over,
            location=line.location,
        )
    ]  # fmt: skip


def _times(names: Names, items: Items) -> float:
    """Return how many of a card stand in parallel: its own m= times its instance's."""
    own = next((text_of(i.value) for i in items if isinstance(i, Assignment) and i.key == "m"), "")
    return (names.number(own) or 1.0 if own else 1.0) * names.environment.multiplier


def voltage_controlled(names: Names, items: Items, line: Line, letter: str) -> list[Element]:
    """Bind E and G; only a plain factor becomes a gain."""
    name = text_of(items[0])
    nets, rest = names.nodes(items, 2, line, f"controlled source {name}")
    keys = {i.key: i for i in rest if isinstance(i, Assignment)}
    text = " ".join(text_of(i) for i in rest)
    words = flat(rest)
    control = Control(None, probes(text), "", text)
    if words and words[0].lower().startswith("poly"):
        control = _polynomial(names, words, text)
    elif words and words[0][:1] in "{'":
        control = Control(None, probes(text), "", text)
    elif len(words) >= 2 and keys.keys() & {"table", "laplace", "freq"} and not probes(text):
        control = Control(None, (words[0], words[1]), "", text)
    elif len(words) >= 3 and not keys.keys() & {"value", "vol", "cur", "table"}:
        gain = names.number(words[2])
        if gain is not None and words[0].lower() not in ("value", "table", "laplace", "freq"):
            control = Control(gain, (words[0], words[1]))
    if letter == "G" and control.gain is not None:
        control = Control(control.gain * _times(names, rest), control.nets)
    return [
        Element(kind=letter, designator=name, nets=nets, control=control, location=line.location)
    ]


def _polynomial(names: Names, words: list[str], text: str) -> Control:
    count, start = _dimensions(names, words)
    pairs = words[start : start + 2 * count]
    gain = _linear(names, words[start + 2 * count :]) if count == 1 else None
    return Control(gain, tuple(pairs), "", "" if gain is not None else text)


def _dimensions(names: Names, words: list[str]) -> tuple[int, int]:
    """Return how many controls a POLY has, and where their words begin."""
    count = names.number(words[1]) if words[0].lower() == "poly" and len(words) > 1 else None
    if count is not None:
        return int(count), 2
    return int("".join(c for c in words[0] if c.isdigit()) or 1), 1


def _linear(names: Names, coefficients: list[str]) -> float | None:
    """Return the factor of POLY(1) coefficients that are one: SPICE 2 takes a lone one for it."""
    found = [c for c in map(names.number, coefficients) if c is not None]
    if not found or any(found[2:]):
        return None
    if len(found) == 1:
        return found[0]
    return found[1] if found[0] == 0 else None


def current_controlled(names: Names, items: Items, line: Line, letter: str) -> list[Element]:
    """Bind F and H."""
    name = text_of(items[0])
    nets, rest = names.nodes(items, 2, line, f"controlled source {name}")
    words = flat(rest)
    text = " ".join(text_of(i) for i in rest)
    if words and words[0].lower().startswith("poly"):
        count, start = _dimensions(names, words)
        gain = _linear(names, words[start + count :]) if count == 1 else None
        steered = words[start] if len(words) > start else ""
        control = Control(gain, (), steered, "" if gain is not None else text)
    else:
        gain = names.number(words[1]) if len(words) > 1 else None
        control = Control(gain, (), words[0] if words else "", text if gain is None else "")
    if letter == "F" and control.gain is not None:
        control = Control(control.gain * _times(names, rest), (), control.element)
    return [
        Element(kind=letter, designator=name, nets=nets, control=control, location=line.location)
    ]


def semiconductor(names: Names, items: Items, line: Line, letter: str) -> list[Element]:
    """Bind D, Q, J, M and Z: how many nodes they have the model's name tells."""
    name = text_of(items[0])
    words = flat(items[1:])
    least, most = {"D": (2, 3), "Q": (3, 5), "J": (3, 3), "M": (3, 7), "Z": (3, 3)}[letter]
    kind = {"D": "diode", "Q": "transistor", "J": "JFET", "M": "MOSFET", "Z": "MESFET"}[letter]
    at = next(
        (
            i
            for i in range(least, min(most + 1, len(words)))
            if names.scope.model(words[i].casefold()) is not None
        ),
        None,
    )
    if at is None:
        # No visible model: the last word is its name, a number behind it an area.
        at = len(words) - 1
        if len(words) > least + 1 and read_number(words[-1]) is not None:
            at -= 1
    if at < least:
        raise names.unbound(
            items, line, "netlist-node-count",
            f"{kind} {name} has {COUNTS[least]} nodes and a model; found "
            f"{COUNTS[max(at, 0)]} node{'s' if at != 1 else ''}",
        )  # fmt: skip
    known = names.scope.model(words[at].casefold())
    if letter == "M" and at == 3 and known is not None and known[1].lower() != "vdmos":
        raise names.unbound(
            items, line, "netlist-node-count",
            f"MOSFET {name} has a bulk node; only a VDMOS model takes three",
        )  # fmt: skip
    nets = tuple(w.strip("[]") for w in words[:at])
    return [
        Element(
            kind=letter, designator=name, nets=nets, model=words[at],
            parameters=_parameters(names, items), text=" ".join(words[at + 1 :]),
            fitted=not not_fitted(words[at]), location=line.location,
        )
    ]  # fmt: skip


def _parameters(names: Names, items: Items) -> dict[str, float]:
    found = {}
    for item in items:
        if isinstance(item, Assignment):
            value = names.number(text_of(item.value))
            if value is not None:
                found[item.key] = value
    return found


def coupling(names: Names, items: Items, line: Line, letter: str) -> list[Element]:
    """Bind K."""
    del names, letter
    return [
        Element(
            kind="K", designator=text_of(items[0]), nets=(), text=" ".join(flat(items[1:])),
            location=line.location,
        )
    ]  # fmt: skip


def behavioural(names: Names, items: Items, line: Line, letter: str) -> list[Element]:
    """Bind B: a source that follows an expression, or PSpice's MESFET."""
    name = text_of(items[0])
    if not any(isinstance(item, Assignment) for item in items):
        return other(names, items, line, letter)
    nets, _ = names.nodes(items, 2, line, f"behavioural source {name}")
    text = line.text.split("=", 1)
    which = text[0].rstrip()[-1:].lower()
    body = text[1].strip() if len(text) > 1 else ""
    return [
        Element(
            kind="B", designator=name, nets=nets, control=Control(None, probes(body), "", body),
            text=f"{which}={body}", location=line.location,
        )
    ]  # fmt: skip


def other(names: Names, items: Items, line: Line, letter: str) -> list[Element]:
    """Bind what the analysis does not work out, so that its nets count as seen by something."""
    name = text_of(items[0])
    words = _ports(flat(items[1:])) if letter == "A" else flat(items[1:])
    count = {"S": 4, "W": 2, "T": 4, "O": 4, "Y": 4}.get(letter, max(len(words) - 1, 0))
    if len(words) < count or not words:
        raise names.unbound(
            items,
            line,
            "netlist-node-count",
            f"{name} has {COUNTS[count]} nodes; found {COUNTS[len(words)]}",
        )
    rest = words[count:]
    steered = Control(None, (), rest.pop(0)) if letter == "W" and rest else None
    return [
        Element(
            kind=letter if letter in "SWT" else "opaque", designator=name,
            nets=tuple(words[:count]), model=rest[0] if rest else "", control=steered,
            text=" ".join(rest[1:]), location=line.location,
        )
    ]  # fmt: skip


def _ports(words: list[str]) -> list[str]:
    """Return the nets of a code model's card: vectors opened, types and inversions left out."""
    found: list[str] = []
    for word in words:
        found += word.strip("[]").split()
    return [w.lstrip("~") for w in found if w[0] != "%" and w.lower() != "null"]
