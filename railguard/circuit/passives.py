"""Cards of resistors, capacitors and inductors."""

from railguard.circuit.card import Names, flat
from railguard.circuit.model import Element
from railguard.circuit.scopes import text_of
from railguard.circuit.values import WORDS, read_value
from railguard.deck.cards import Assignment, Items
from railguard.deck.lines import Line
from railguard.deck.numbers import read_number


def passive(names: Names, items: Items, line: Line, letter: str) -> list[Element]:
    """Bind R, C and L: two nodes, then a value, a model or both."""
    name = text_of(items[0])
    kind, unit = WORDS[letter]
    nets, rest = names.nodes(items, 2, line, f"{kind} {name}")
    words = flat(rest)
    keys = {i.key: text_of(i.value) for i in rest if type(i) is Assignment}
    if not words and letter.lower() not in keys and not keys.get("value"):
        if read_number(nets[1]) is not None and nets[1] != "0":
            raise names.unbound(
                items, line, "netlist-node-count",
                f"{kind} {name} has two nodes and a value; found one node and {nets[1]}",
            )  # fmt: skip
        raise names.unbound(items, line, "netlist-value-missing", f"{kind} {name} has no value")
    value, text, model, fitted = _passive_value(names, name, letter, words, keys, line, unit)
    multiple = keys.get("m")
    factor = (names.number(multiple) or 1.0 if multiple else 1.0) * names.environment.multiplier
    if value is not None and factor != 1.0:
        value = value * factor if letter == "C" else value / factor
    parameters = {k: v for k, t in keys.items() if (v := _share(names, k, t)) is not None}
    return [
        Element(
            kind=letter, designator=name, nets=nets, value=value, model=model,
            parameters=parameters, text=text, fitted=fitted, location=line.location,
        )
    ]  # fmt: skip


def _share(names: Names, key: str, text: str) -> float | None:
    if key == "tol":
        number = read_number(text.rstrip("%"))
        if number is None:
            return None
        return number.value / 100 if text.endswith("%") or number.value >= 1 else number.value
    return names.number(text)


def _passive_value(
    names: Names,
    name: str,
    letter: str,
    words: list[str],
    keys: dict[str, str],
    line: Line,
    unit: str,
) -> tuple[float | None, str, str, bool]:
    """Return value, left-over text, model name and whether the component is fitted."""
    keyed = keys.get(letter.lower()) or keys.get("value")
    if not words and keyed:
        if read_number(keyed, letter) is None:
            return names.evaluated(keyed, name, line)[0], "", "", True
        words = [keyed]
    first = words[0]
    if first[:1] in "{'\"":
        value, behavioural = names.evaluated(first, name, line)
        return value, " ".join(words[1:]) + (" behavioural" if behavioural else ""), "", True
    model = names.scope.model(first.casefold())
    if model is not None and read_number(first, letter) is None:
        if len(words) > 1 and (number := names.number(words[1], letter)) is not None:
            return number, " ".join(words[2:]), first, True
        return _model_value(names, model[2], letter), " ".join(words[1:]), first, True
    reading = read_value(words, letter, line.text)
    if not reading.fitted:
        return None, reading.text, "", False
    if reading.value is None and first.isidentifier():
        value = names.parameter(first)
        if value is not None:
            return value, reading.text, "", True
    if reading.rule:
        names.trap(name, reading.rule, first, reading.why, reading.value, reading.spice, unit, line)
    return reading.value, reading.text, "", True


def _model_value(names: Names, items: Items, letter: str) -> float | None:
    for item in items:
        if isinstance(item, Assignment) and item.key == letter.lower():
            return names.number(text_of(item.value))
    return None
