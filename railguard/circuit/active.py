"""Cards of sources, controlled sources, semiconductors and the letters nobody works out."""

from railguard.circuit.card import Names, flat
from railguard.circuit.expressions import probes
from railguard.circuit.model import Control, Element
from railguard.circuit.scopes import text_of
from railguard.circuit.sources import Source
from railguard.circuit.values import not_fitted
from railguard.circuit.waveforms import SourceError, read_source
from railguard.deck.cards import Assignment, Items
from railguard.deck.lines import Line
from railguard.deck.numbers import read_number
from railguard.notices import Problem


def independent(names: Names, items: Items, line: Line, letter: str) -> list[Element]:
    """Bind V and I: two nodes, then DC, AC and a time function."""
    name = text_of(items[0])
    kind = "voltage source" if letter == "V" else "current source"
    nets, rest = names.nodes(items, 2, line, f"{kind} {name}")
    try:
        source, remark = read_source(rest, lambda word: names.number(word, letter))
    except SourceError as error:
        names.problems.append(
            Problem(
                rule="netlist-source",
                message=f"The {kind} {names.prefix}{name}: {error}.",
                location=line.location,
                designators=(names.prefix + name,),
            )
        )
        source, remark = Source(stated=False), ""
    return [
        Element(
            kind=letter, designator=name, nets=nets, source=source, text=remark,
            location=line.location,
        )
    ]  # fmt: skip


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
    elif len(words) >= 3 and not keys.keys() & {"value", "vol", "cur", "table"}:
        gain = names.number(words[2])
        if gain is not None and words[0].lower() not in ("value", "table", "laplace", "freq"):
            control = Control(gain, (words[0], words[1]))
    return [
        Element(kind=letter, designator=name, nets=nets, control=control, location=line.location)
    ]


def _polynomial(names: Names, words: list[str], text: str) -> Control:
    count = names.number(words[1]) if len(words) > 1 else None
    if count is None:
        digits = "".join(c for c in words[0] if c.isdigit())
        count, start = float(digits or 1), 1
    else:
        start = 2
    pairs = words[start : start + 2 * int(count)]
    coefficients = [names.number(w) for w in words[start + 2 * int(count) :]]
    plain = [c for c in coefficients if c is not None]
    linear = int(count) == 1 and len(plain) >= 1 and all(c == 0 for c in plain[2:])
    if linear and (len(plain) == 1 or plain[0] == 0):
        return Control(plain[0] if len(plain) == 1 else plain[1], tuple(pairs))
    return Control(None, tuple(pairs), "", text)


def current_controlled(names: Names, items: Items, line: Line, letter: str) -> list[Element]:
    """Bind F and H."""
    name = text_of(items[0])
    nets, rest = names.nodes(items, 2, line, f"controlled source {name}")
    words = flat(rest)
    text = " ".join(text_of(i) for i in rest)
    if words and words[0].lower().startswith("poly"):
        control = Control(None, (), "", text)
    else:
        gain = names.number(words[1]) if len(words) > 1 else None
        control = Control(gain, (), words[0] if words else "", text if gain is None else "")
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
            f"{kind} {name} has {least} nodes and a model; found {max(at, 0)} nodes",
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
            text=" ".join(words[at + 1 :]), fitted=not not_fitted(words[at]),
            location=line.location,
        )
    ]  # fmt: skip


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
    """Bind B: a source that follows an expression."""
    del letter
    name = text_of(items[0])
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
    words = flat(items[1:])
    count = {"S": 4, "W": 2, "T": 4, "O": 4, "Y": 4}.get(letter, max(len(words) - 1, 0))
    if len(words) < count or not words:
        raise names.unbound(items, line, "netlist-node-count", f"{name} has {count} nodes")
    return [
        Element(
            kind=letter if letter in "SWT" else "opaque", designator=name,
            nets=tuple(words[:count]), model=words[count] if len(words) > count else "",
            text=" ".join(words[count + 1 :]), location=line.location,
        )
    ]  # fmt: skip
