"""Items of a card to an element: the roles of its words, letter by letter.

How many nodes a card has depends on names defined elsewhere, so roles are given here, with the
scope at hand, and not in the grammar. A card that fits neither its letter nor the table of board
designators becomes a problem; its net-like words stay in the circuit as an opaque element, so that
nothing on those nets is taken for unconnected.
"""

from collections.abc import Callable
from typing import TYPE_CHECKING

import msgspec

from railguard.circuit.board import kind_of
from railguard.circuit.expressions import ExpressionError, probes
from railguard.circuit.model import Control, Element
from railguard.circuit.scopes import Scope, text_of
from railguard.circuit.sources import Source
from railguard.circuit.values import WORDS, not_fitted, read_value
from railguard.circuit.waveforms import FUNCTIONS, SourceError, read_source
from railguard.deck.cards import Assignment, Call, Group, Items
from railguard.deck.lines import Line
from railguard.deck.numbers import read_number
from railguard.location import Location
from railguard.notices import Problem

if TYPE_CHECKING:
    from railguard.circuit.flatten import Environment


class UnboundError(Exception):
    """A card that could not be given its roles; `element` keeps its nets in the circuit."""

    def __init__(self, problem: Problem, element: Element | None) -> None:
        self.problem = problem
        self.element = element
        super().__init__(problem.message)


class Instance(msgspec.Struct, frozen=True, kw_only=True):
    """A subcircuit call that has not been expanded."""

    designator: str
    nets: tuple[str, ...]
    model: str
    parameters: dict[str, float]
    multiplier: float = 1.0
    notes: tuple[str, ...] = ()
    location: Location | None = None

    def element(self, ports: tuple[str, ...], notes: tuple[str, ...]) -> Element:
        """Return the call as one closed element."""
        return Element(
            kind="X",
            designator=self.designator,
            nets=self.nets,
            model=self.model,
            parameters=self.parameters,
            ports=ports,
            pin_notes=self.notes or pin_names(notes, len(self.nets)),
            location=self.location,
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


def _nothing(line: Line) -> Problem:
    return Problem(
        rule="netlist-card",
        message=f"The card {line.text[:20]} cannot be read: it holds no word.",
        location=line.location,
    )


class Binder:
    """Gives the cards of one instance of a scope their roles."""

    def __init__(
        self, scope: Scope, environment: "Environment", prefix: str, multiplier: float
    ) -> None:
        self._scope = scope
        self._environment = environment
        self._prefix = prefix
        self._multiplier = multiplier
        self._problems: list[Problem] = []
        self._letters: dict[str, Callable[[Items, Line, str], list[Element]]] = {
            **dict.fromkeys("RCL", self._passive),
            **dict.fromkeys("VI", self._source),
            **dict.fromkeys("EG", self._voltage_controlled),
            **dict.fromkeys("FH", self._current_controlled),
            **dict.fromkeys("DQJMZ", self._semiconductor),
            "K": self._coupling,
            "B": self._behavioural,
            **dict.fromkeys("SWTOUNPYA", self._other),
        }

    def taken(self) -> list[Problem]:
        """Hand over what was met since the last call."""
        problems, self._problems = self._problems, []
        return problems

    def bind(self, items: Items, line: Line) -> list[Element] | Instance:
        """Give a card its roles.

        Raises  UnboundError
        """
        if not items:
            raise UnboundError(_nothing(line), None)
        head = items[0]
        if isinstance(head, Call | Group | Assignment):
            raise self._unbound(items, line, "netlist-card", f"{text_of(head)} is no designator")
        name, letter = _designator(head)
        rest = items[1:]
        if letter == "X":
            return self._instance(name, rest, line)
        handler = self._letters.get(letter)
        board = kind_of(name)
        if board is not None and (handler is None or self._is_board(letter, rest, board)):
            return self._board(name, rest, line, board)
        if handler is None:
            raise self._unbound(
                items,
                line,
                "netlist-card",
                f"no element has a designator that begins with {letter}",
            )
        try:
            return handler((name, *rest), line, letter)
        except UnboundError:
            if board is not None and board not in ("opaque",):
                return self._board(name, rest, line, board)
            raise

    # ------------------------------------------------------------------ helpers

    def number(self, text: str, letter: str = "") -> float | None:
        """Return the value of a word: a number, an expression in braces, a parameter's name."""
        if text[:1] in "{'\"":
            try:
                return self._environment.evaluate(text)
            except ExpressionError:
                return None
        found = read_number(text, letter)
        if found is not None:
            return found.value
        if text.isidentifier():
            try:
                return self._environment.look(text.lower())
            except ExpressionError:
                return None
        return None

    def _evaluated(self, text: str, name: str, line: Line) -> tuple[float | None, bool]:
        """Return an expression's value and whether only a simulation gives it one."""
        try:
            return self._environment.evaluate(text), False
        except ExpressionError as error:
            if error.behavioural:
                return None, True
            rule = "netlist-parameter" if "not defined" in error.reason else "netlist-expression"
            self._problems.append(
                Problem(
                    rule=rule,
                    message=f"The value {text} of {self._prefix}{name} has no number: {error}.",
                    remedy="Give it a value.",
                    location=line.location,
                    designators=(self._prefix + name,),
                )
            )
            return None, False

    def _unbound(self, items: Items, line: Line, rule: str, why: str) -> UnboundError:
        name = text_of(items[0])
        words = [i for i in items[1:] if isinstance(i, str)]
        nets = tuple(w for w in words if read_number(w) is None or w == "0")
        element = (
            Element(
                kind="opaque", designator=name, nets=nets, text=" ".join(words),
                location=line.location,
            )
            if nets
            else None
        )  # fmt: skip
        return UnboundError(
            Problem(
                rule=rule,
                message=f"The card {self._prefix}{name} cannot be read: {why}.",
                remedy="Correct the card; its nets count as leaving the sheet until then.",
                location=line.location,
                designators=(self._prefix + name,),
            ),
            element,
        )

    def _is_board(self, letter: str, rest: Items, board: str) -> bool:
        """Tell whether a card whose letter SPICE knows is a board component all the same."""
        words = _flat(rest)
        if letter in "FH":
            steered = len(words) >= 4 and words[2][:1].upper() == "V"
            return not steered and not any(w.lower().startswith("poly") for w in words)
        if letter == "U":
            return board == "ic" and bool(words)
        if letter == "B":
            return not any(isinstance(i, Assignment) for i in rest)
        if letter == "J":
            return not self._names_model(words, 3)
        if letter == "T":
            return not any(isinstance(i, Assignment) for i in rest)
        if letter in "SKMPNOWA":
            return board in ("open", "link") and not any(isinstance(i, Assignment) for i in rest)
        return (
            letter == "R"
            and board == "pot"
            and len(words) >= 4
            and self.number(words[3]) is not None
        )

    def _names_model(self, words: list[str], start: int) -> bool:
        return any(self._scope.model(w.casefold()) is not None for w in words[start:])

    def _nodes(
        self, items: Items, count: int, line: Line, words: str
    ) -> tuple[tuple[str, ...], Items]:
        """Take a card's nodes off; a group in parentheses counts as its members."""
        nets: list[str] = []
        rest = list(items[1:])
        while rest and len(nets) < count:
            item = rest[0]
            if isinstance(item, Group) and all(isinstance(i, str) for i in item.items):
                rest[:1] = list(item.items)
                continue
            if not isinstance(item, str):
                break
            nets.append(item)
            rest.pop(0)
        if len(nets) < count:
            raise self._unbound(
                items, line, "netlist-node-count",
                f"{words} has {count} nodes; found {len(nets)}",
            )  # fmt: skip
        return tuple(nets), tuple(rest)

    # ------------------------------------------------------------------ letters

    def _passive(self, items: Items, line: Line, letter: str) -> list[Element]:
        name = text_of(items[0])
        kind, unit = WORDS[letter]
        nets, rest = self._nodes(items, 2, line, f"{kind} {name}")
        words = _flat(rest)
        keys = {i.key: text_of(i.value) for i in rest if isinstance(i, Assignment)}
        if not words and letter.lower() not in keys and not keys.get("value"):
            if read_number(nets[1]) is not None and nets[1] != "0":
                raise self._unbound(
                    items, line, "netlist-node-count",
                    f"{kind} {name} has two nodes and a value; found one node and {nets[1]}",
                )  # fmt: skip
            raise self._unbound(items, line, "netlist-value-missing", f"{kind} {name} has no value")
        value, text, model, fitted = self._passive_value(name, letter, words, keys, line, unit)
        multiple = keys.get("m")
        factor = (self.number(multiple) or 1.0 if multiple else 1.0) * self._multiplier
        if value is not None and factor != 1.0:
            value = value * factor if letter == "C" else value / factor
        parameters = {k: v for k, t in keys.items() if (v := self._share(k, t)) is not None}
        return [
            Element(
                kind=letter, designator=name, nets=nets, value=value, model=model,
                parameters=parameters, text=text, fitted=fitted, location=line.location,
            )
        ]  # fmt: skip

    def _share(self, key: str, text: str) -> float | None:
        if key == "tol":
            number = read_number(text.rstrip("%"))
            if number is None:
                return None
            return number.value / 100 if text.endswith("%") or number.value >= 1 else number.value
        return self.number(text)

    def _passive_value(
        self, name: str, letter: str, words: list[str], keys: dict[str, str], line: Line, unit: str
    ) -> tuple[float | None, str, str, bool]:
        """Return value, left-over text, model name and whether the component is fitted."""
        keyed = keys.get(letter.lower()) or keys.get("value")
        if not words and keyed:
            if read_number(keyed, letter) is None:
                return self._evaluated(keyed, name, line)[0], "", "", True
            words = [keyed]
        first = words[0]
        if first[:1] in "{'\"":
            value, behavioural = self._evaluated(first, name, line)
            return value, " ".join(words[1:]) + (" behavioural" if behavioural else ""), "", True
        model = self._scope.model(first.casefold())
        if model is not None and read_number(first, letter) is None:
            if len(words) > 1 and (number := self.number(words[1], letter)) is not None:
                return number, " ".join(words[2:]), first, True
            return self._model_value(model[2], letter), " ".join(words[1:]), first, True
        reading = read_value(words, letter, line.text)
        if not reading.fitted:
            return None, reading.text, "", False
        if reading.value is None and first.isidentifier():
            try:
                return self._environment.look(first.lower()), reading.text, "", True
            except ExpressionError:
                pass
        if reading.rule:
            self._trap(
                name, reading.rule, first, reading.why, reading.value, reading.spice, unit, line
            )
        return reading.value, reading.text, "", True

    def _model_value(self, items: Items, letter: str) -> float | None:
        for item in items:
            if isinstance(item, Assignment) and item.key == letter.lower():
                return self.number(text_of(item.value))
        return None

    def _trap(
        self, name: str, rule: str, text: str, why: str, likely: float | None,
        spice: float | None, unit: str, line: Line,
    ) -> None:  # fmt: skip
        at = line.text.find(text)
        self._problems.append(
            Problem(
                rule=rule,
                message=f"The value {text} of {self._prefix}{name}: {why}.",
                location=line.at(max(at, 0), len(text)),
                designators=(self._prefix + name,),
                spice_value=spice,
                likely_value=likely,
                unit=unit,
            )
        )

    def _source(self, items: Items, line: Line, letter: str) -> list[Element]:
        name = text_of(items[0])
        kind = "voltage source" if letter == "V" else "current source"
        nets, rest = self._nodes(items, 2, line, f"{kind} {name}")
        try:
            source, remark = read_source(rest, lambda word: self.number(word, letter))
        except SourceError as error:
            self._problems.append(
                Problem(
                    rule="netlist-source",
                    message=f"The {kind} {self._prefix}{name}: {error}.",
                    location=line.location,
                    designators=(self._prefix + name,),
                )
            )
            source, remark = Source(stated=False), ""
        return [
            Element(
                kind=letter, designator=name, nets=nets, source=source, text=remark,
                location=line.location,
            )
        ]  # fmt: skip

    def _voltage_controlled(self, items: Items, line: Line, letter: str) -> list[Element]:
        name = text_of(items[0])
        nets, rest = self._nodes(items, 2, line, f"controlled source {name}")
        keys = {i.key: i for i in rest if isinstance(i, Assignment)}
        text = " ".join(text_of(i) for i in rest)
        words = _flat(rest)
        control = Control(None, probes(text), "", text)
        if words and words[0].lower().startswith("poly"):
            control = self._polynomial(words, text)
        elif words and words[0][:1] in "{'":
            control = Control(None, probes(text), "", text)
        elif len(words) >= 3 and not keys.keys() & {"value", "vol", "cur", "table"}:
            gain = self.number(words[2])
            if gain is not None and words[0].lower() not in ("value", "table", "laplace", "freq"):
                control = Control(gain, (words[0], words[1]))
        return [
            Element(
                kind=letter, designator=name, nets=nets, control=control, location=line.location
            )
        ]

    def _polynomial(self, words: list[str], text: str) -> Control:
        count = self.number(words[1]) if len(words) > 1 else None
        if count is None:
            digits = "".join(c for c in words[0] if c.isdigit())
            count, start = float(digits or 1), 1
        else:
            start = 2
        pairs = words[start : start + 2 * int(count)]
        coefficients = [self.number(w) for w in words[start + 2 * int(count) :]]
        plain = [c for c in coefficients if c is not None]
        linear = int(count) == 1 and len(plain) >= 1 and all(c == 0 for c in plain[2:])
        if linear and (len(plain) == 1 or plain[0] == 0):
            return Control(plain[0] if len(plain) == 1 else plain[1], tuple(pairs))
        return Control(None, tuple(pairs), "", text)

    def _current_controlled(self, items: Items, line: Line, letter: str) -> list[Element]:
        name = text_of(items[0])
        nets, rest = self._nodes(items, 2, line, f"controlled source {name}")
        words = _flat(rest)
        text = " ".join(text_of(i) for i in rest)
        if words and words[0].lower().startswith("poly"):
            control = Control(None, (), "", text)
        else:
            gain = self.number(words[1]) if len(words) > 1 else None
            control = Control(gain, (), words[0] if words else "", text if gain is None else "")
        return [
            Element(
                kind=letter, designator=name, nets=nets, control=control, location=line.location
            )
        ]

    def _semiconductor(self, items: Items, line: Line, letter: str) -> list[Element]:
        name = text_of(items[0])
        words = _flat(items[1:])
        least, most = {"D": (2, 3), "Q": (3, 5), "J": (3, 3), "M": (3, 7), "Z": (3, 3)}[letter]
        kind = {"D": "diode", "Q": "transistor", "J": "JFET", "M": "MOSFET", "Z": "MESFET"}[letter]
        at = next(
            (
                i
                for i in range(least, min(most + 1, len(words)))
                if self._scope.model(words[i].casefold()) is not None
            ),
            None,
        )
        if at is None:
            names = words
            if len(names) > least + 1 and read_number(names[-1]) is not None:
                names = names[:-1]
            at = len(names) - 1
        if at < least:
            raise self._unbound(
                items, line, "netlist-node-count",
                f"{kind} {name} has {least} nodes and a model; found {max(at, 0)} nodes",
            )  # fmt: skip
        known = self._scope.model(words[at].casefold())
        if letter == "M" and at == 3 and known is not None and known[1].lower() != "vdmos":
            raise self._unbound(
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

    def _coupling(self, items: Items, line: Line, letter: str) -> list[Element]:
        del letter
        return [
            Element(
                kind="K", designator=text_of(items[0]), nets=(), text=" ".join(_flat(items[1:])),
                location=line.location,
            )
        ]  # fmt: skip

    def _behavioural(self, items: Items, line: Line, letter: str) -> list[Element]:
        del letter
        name = text_of(items[0])
        nets, _ = self._nodes(items, 2, line, f"behavioural source {name}")
        text = line.text.split("=", 1)
        which = text[0].rstrip()[-1:].lower()
        body = text[1].strip() if len(text) > 1 else ""
        return [
            Element(
                kind="B", designator=name, nets=nets, control=Control(None, probes(body), "", body),
                text=f"{which}={body}", location=line.location,
            )
        ]  # fmt: skip

    def _other(self, items: Items, line: Line, letter: str) -> list[Element]:
        name = text_of(items[0])
        words = _flat(items[1:])
        count = {"S": 4, "W": 2, "T": 4, "O": 4, "Y": 4}.get(letter, max(len(words) - 1, 0))
        if len(words) < count or not words:
            raise self._unbound(items, line, "netlist-node-count", f"{name} has {count} nodes")
        return [
            Element(
                kind=letter if letter in "SWT" else "opaque", designator=name,
                nets=tuple(words[:count]), model=words[count] if len(words) > count else "",
                text=" ".join(words[count + 1 :]), location=line.location,
            )
        ]  # fmt: skip

    # ------------------------------------------------------------------ calls and boards

    def _instance(self, name: str, rest: Items, line: Line) -> Instance:
        words: list[str] = []
        keys: dict[str, str] = {}
        done = False
        for item in rest:
            if isinstance(item, Assignment):
                keys[item.key] = text_of(item.value)
                done = True
            elif isinstance(item, Group):
                words += [i for i in item.items if isinstance(i, str)]
            elif isinstance(item, str):
                if item.lower() in ("params:", "text:") or (item.lower() == "params" and words):
                    done = True
                elif not done and item not in (":", "/"):
                    words.append(item)
        if len(words) < 2:
            board = kind_of(name)
            raise self._unbound(
                (name, *rest), line, "netlist-node-count",
                "a subcircuit call has nodes and a name" if board is None else "it has no nodes",
            )  # fmt: skip
        at = len(words) - 1
        if (
            read_number(words[at]) is not None
            and self._scope.subcircuit(words[at].casefold()) is None
        ):
            at = next(
                (i for i in range(at, 0, -1) if self._scope.subcircuit(words[i].casefold())), at
            )
        parameters: dict[str, float] = {}
        for key, text in keys.items():
            value = self.number(text)
            if value is None and text[:1] in "{'":
                value, _ = self._evaluated(text, name, line)
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

    def _board(self, name: str, rest: Items, line: Line, kind: str) -> list[Element]:
        words = _flat(rest)
        place = line.location
        if not words:
            raise self._unbound((name, *rest), line, "netlist-card", f"{name} has no nodes")
        value = words[-1]
        nets = tuple(words[:-1]) if len(words) > 1 else tuple(words)
        fitted = not not_fitted(value)
        if kind == "pot" and len(words) >= 4:
            ohms = self.number(words[3], "R")
            half = None if ohms is None else ohms / 2
            ends = ((words[0], words[1]), (words[1], words[2]))
            return [
                Element(
                    kind="R", designator=f"{name}.{i + 1}", nets=pair, value=half, text="trimmer",
                    fitted=fitted, location=place,
                )
                for i, pair in enumerate(ends)
            ]  # fmt: skip
        if kind == "battery":
            volts = read_number(value, "V")
            source = Source(volts.value if volts else None, stated=volts is not None)
            return [
                Element(
                    kind="battery", designator=name, nets=nets[:2], source=source, model=value,
                    fitted=fitted, location=place,
                )
            ]  # fmt: skip
        if kind == "diode":
            return [
                Element(
                    kind="D", designator=name, nets=nets[:2], model=value, fitted=fitted,
                    location=place,
                )
            ]  # fmt: skip
        ohms = None
        if kind == "link":
            number = read_number(value, "R")
            ohms = (
                number.value if number and number.value < 10 and kind_of(name) == "link" else None
            )
            ohms = ohms if name.upper().startswith(("R", "W", "JP", "NT", "SJ")) else None
        return [
            Element(
                kind="opaque" if kind == "pot" else kind, designator=name, nets=nets, value=ohms,
                model=value, fitted=fitted, location=place,
            )
        ]  # fmt: skip


def _designator(head: str) -> tuple[str, str]:
    """Return a card's designator and its letter; `X§U1` is U1 on a subcircuit call."""
    if "§" in head:
        letter, _, name = head.partition("§")
        return head, letter[:1].upper() if name else head[:1].upper()
    return head, head[:1].upper()


def _flat(items: Items) -> list[str]:
    """Return the plain words of some items, groups opened, assignments left out."""
    words: list[str] = []
    for item in items:
        if isinstance(item, str):
            words.append(item)
        elif isinstance(item, Group):
            words += _flat(item.items)
        elif isinstance(item, Call):
            words += [item.name, *_flat(item.items)] if item.name not in FUNCTIONS else []
    return words


def _card_pins(note: str) -> tuple[str, ...]:
    return tuple(part.strip() for part in note.split(")") if part.strip()) if note else ()
