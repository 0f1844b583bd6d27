"""Subcircuit calls: nodes, a name, parameters; and the pin names that stand in comments."""

from railguard.circuit.card import COUNTS, Names
from railguard.circuit.model import Element, Instance
from railguard.circuit.written import text_of
from railguard.deck.cards import Assignment, Group, Items
from railguard.deck.lines import Line
from railguard.deck.numbers import read_number

_MARKERS = frozenset({"params:", "text:", "params"})
"""Words that end a call's nodes and name."""


def instance(names: Names, name: str, rest: Items, line: Line) -> Instance:
    """Bind X: nodes, then a name, then parameters."""
    words: list[str] = []
    keys: dict[str, str] = {}
    done = False
    for item in rest:
        if isinstance(item, str):
            if item[-1] == ":" or item.lower() == "params":
                done = done or item.lower() in _MARKERS
            elif not done and item != "/":
                words.append(item)
        elif isinstance(item, Assignment):
            keys[item.key] = text_of(item.value)
            done = True
        elif isinstance(item, Group):
            words += [i for i in item.items if isinstance(i, str)]
    if len(words) < 2:
        raise names.unbound(
            (name, *rest), line, "netlist-node-count",
            f"a subcircuit call has nodes and a name; found {COUNTS[len(words)]} of them",
        )  # fmt: skip
    at = len(words) - 1
    if read_number(words[at]) is not None and names.scope.subcircuit(words[at].casefold()) is None:
        at = next((i for i in range(at, 0, -1) if names.scope.subcircuit(words[i].casefold())), at)
    parameters: dict[str, float] = {}
    for key, text in keys.items():
        value = names.number(text)
        if value is None and text[:1] in "{'":
            value, _ = names.evaluated(text, name, line)
        if value is not None:
            parameters[key] = value
    return Instance(
        designator=name,
        nets=tuple(words[:at]),
        model=words[at],
        parameters=parameters,
        multiplier=parameters.get("m", 1.0),
        notes=_card_pins(line.note),
        location=line.location,
    )


def pin_names(comments: tuple[str, ...], count: int) -> tuple[str, ...]:
    """Read the pin names of a connection ladder above a subcircuit.

    The usual form has one name a line, each line one `|` longer than the next:
    `connections: non-inverting input`, `| inverting input`, `| | positive supply`, ...
    """
    found: list[str] = []
    started = False
    for comment in comments:
        low = comment.lower()
        if not started and "connection" in low and ":" in comment:
            started = True
            found.append(comment.split(":", 1)[1].strip())
        elif started and comment.lstrip().startswith("|"):
            name = comment.replace("|", " ").strip()
            if name:
                found.append(name)
    return tuple(found) if len(found) == count else ()


def closed(call: Instance, ports: tuple[str, ...], notes: tuple[str, ...]) -> Element:
    """Return a call as one element.

    ports  of the definition's header, where the deck has one
    notes  comment lines beside that header
    """
    return Element(
        kind="X",
        designator=call.designator,
        nets=call.nets,
        model=call.model,
        parameters=call.parameters,
        ports=ports,
        pin_notes=call.notes or pin_names(notes, len(call.nets)),
        location=call.location,
    )


def _card_pins(note: str) -> tuple[str, ...]:
    return tuple(part.strip() for part in note.split(")") if part.strip()) if note else ()
