"""Cards of resistors, capacitors and inductors."""

import msgspec

from railguard.circuit.card import Names, flat
from railguard.circuit.model import Element
from railguard.circuit.values import WORDS, read_value
from railguard.circuit.written import text_of
from railguard.deck.cards import Assignment, Items
from railguard.deck.lines import Line
from railguard.deck.numbers import read_number
from railguard.notices import Problem


class _Value(msgspec.Struct, frozen=True):
    """What stands behind a card's nodes: SI value, left-over words, model, fitted or not."""

    value: float | None = None
    text: str = ""
    model: str = ""
    fitted: bool = True


def passive(names: Names, items: Items, line: Line, letter: str) -> list[Element]:
    """Bind R, C and L: two nodes, then a value, a model or both."""
    name = text_of(items[0])
    kind = WORDS[letter][0]
    nets, rest = names.nodes(items, 2, line, f"{kind} {name}", "a value")
    rest = _without_second_coefficient(rest)
    words = flat(rest)
    keys = {i.key: text_of(i.value) for i in rest if type(i) is Assignment}
    keyed = keys.get(letter.lower()) or keys.get("value")
    if not words and not keyed:
        if read_number(nets[1]) is not None and nets[1] != "0":
            raise names.unbound(
                items, line, "netlist-node-count",
                f"{kind} {name} has two nodes and a value; found one node and {nets[1]}",
            )  # fmt: skip
        if not keys.keys() & {"q", "flux", "l", "w"}:
            raise names.unbound(items, line, "netlist-value-missing", f"{kind} {name} has no value")
    found = _read(names, name, letter, words, keyed, line)
    multiple = keys.get("m")
    factor = (names.number(multiple) or 1.0 if multiple else 1.0) * names.environment.multiplier
    value = found.value
    if value is not None and factor != 1.0:
        value = value * factor if letter == "C" else value / factor
    if value is not None and value < 0:
        names.told(
            "netlist-value-sign",
            f"The value of {names.prefix}{name} is negative.",
            line,
            name,
            "Take the sign off if it is a slip.",
        )
    parameters = {k: v for k, t in keys.items() if (v := _share(names, k, t)) is not None}
    return [
        Element(
            kind=letter, designator=name, nets=nets, value=value, model=found.model,
            parameters=parameters, text=found.text, fitted=found.fitted, location=line.location,
        )
    ]  # fmt: skip


def _without_second_coefficient(items: Items) -> Items:
    """Take the second of `tc=1m,2u` out: it is no value, though it stands where one may."""
    if len(items) < 3:
        return items
    for at, item in enumerate(items):
        if (
            isinstance(item, Assignment)
            and item.key == "tc"
            and at + 1 < len(items)
            and isinstance(follows := items[at + 1], str)
        ):
            pair = (Assignment("tc1", item.value), Assignment("tc2", follows))
            return (*items[:at], *pair, *items[at + 2 :])
    return items


def _share(names: Names, key: str, text: str) -> float | None:
    if key == "tol":
        number = read_number(text.rstrip("%"))
        if number is None:
            return None
        return number.value / 100 if text.endswith("%") or number.value >= 1 else number.value
    return names.number(text)


def _read(
    names: Names, name: str, letter: str, words: list[str], keyed: str | None, line: Line
) -> _Value:
    if keyed is None:
        return _from_words(names, name, letter, words, line) if words else _Value(text="keyed")
    if not words:
        if read_number(keyed, letter) is None:
            return _expression(names, name, keyed, line, [])
        return _from_words(names, name, letter, [keyed], line)
    found = _from_words(names, name, letter, words, line)
    value = names.number(keyed, letter)
    if found.value is None or value is None or value == found.value:
        return found if value is None else msgspec.structs.replace(found, value=value)
    names.trap(
        name, "netlist-value-second-number", words[0],
        f"{letter}={keyed} behind the value replaces it", value, value, WORDS[letter][1], line,
    )  # fmt: skip
    return msgspec.structs.replace(found, value=value)


def _from_words(names: Names, name: str, letter: str, words: list[str], line: Line) -> _Value:
    first = words[0]
    if first[:1] in ("{", "'", '"'):
        return _expression(names, name, first, line, words[1:])
    model = names.scope.model(first.casefold())
    if model is not None and read_number(first, letter) is None:
        return _modelled(names, name, letter, words, line)
    if words[0].lower() == "poly" and len(words) > 1:
        words = words[1:]  # C n1 n2 POLY c0 c1 ...: SPICE 2's way; the first is the value
        return _Value(names.number(words[0], letter), "polynomial")
    behind = words[1].casefold() if len(words) > 1 else ""
    if behind and read_number(words[1]) is None and names.scope.model(behind) is not None:
        words, used = [first, *words[2:]], words[1]
    else:
        used = ""
    reading = read_value(words, letter, line.text)
    if not reading.fitted:
        return _Value(text=reading.text, fitted=False)
    if reading.value is None and first.isidentifier():
        value = names.parameter(first)
        if value is not None:
            return _Value(value, reading.text, used)
    if reading.rule:
        names.trap(
            name, reading.rule, reading.written or first, reading.why, reading.value,
            reading.spice, WORDS[letter][1], line,
        )  # fmt: skip
    return _Value(reading.value, reading.text, used)


def _expression(names: Names, name: str, text: str, line: Line, rest: list[str]) -> _Value:
    value, behavioural = names.evaluated(text, name, line)
    return _Value(value, " ".join([*rest, "behavioural"] if behavioural else rest))


def _modelled(names: Names, name: str, letter: str, words: list[str], line: Line) -> _Value:
    """Read a value from a model, or from the word behind it."""
    first = words[0]
    stated = _model_value(names, first, letter)
    number = names.number(words[1], letter) if len(words) > 1 else None
    if number is None:
        return _Value(stated, " ".join(words[1:]), first)
    if stated not in (None, 1.0):
        names.problems.append(
            Problem(
                rule="netlist-other-dialect",
                message=f"{names.prefix}{name} has a value and so has its model {first}: the "
                "card's own counts here, while some SPICE programs multiply the two.",
                location=line.location,
                designators=(names.prefix + name,),
            )
        )
    return _Value(number, " ".join(words[2:]), first)


def _model_value(names: Names, model: str, letter: str) -> float | None:
    found = names.scope.model(model.casefold())
    for item in found[2] if found is not None else ():
        if isinstance(item, Assignment) and item.key == letter.lower():
            return names.number(text_of(item.value))
    return None
