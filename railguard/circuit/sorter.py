"""A deck's logical lines, sorted into scopes: what is defined where; nothing is expanded yet."""

import re
from collections import Counter

import msgspec

from railguard.circuit.expressions import DEEPEST, ExpressionError, Function, Work, evaluate
from railguard.circuit.model import Analysis
from railguard.circuit.scopes import Scope
from railguard.circuit.written import split_parameters, text_of, unquoted
from railguard.deck.bounds import Bounds
from railguard.deck.cards import Assignment, Call, CardError, Group, Items, items_of
from railguard.deck.files import Deck
from railguard.deck.lines import Line
from railguard.notices import Problem
from railguard.words import Severity

_ANALYSES = frozenset(
    {"tran", "ac", "dc", "op", "tf", "noise", "disto", "pz", "sens", "four", "fourier", "fft", "hb",
     "sp", "lin", "net", "step", "meas", "measure", "temp"}
)  # fmt: skip
_KNOWN = frozenset(
    {"options", "option", "opt", "save", "probe", "print", "plot", "width", "ic", "nodeset", "end",
     "title", "backanno", "csparam", "endl", "lib", "include", "inc", "incl", "endc", "prot",
     "unprot", "protect", "unprotect", "alias", "wave", "text", "load", "savebias",
     "loadbias", "preprocess", "global_param", "machine", "endmachine", "watch", "list", "view"}
)  # fmt: skip
_GLUED_COMMA = re.compile(r"[^\s,],\s*[A-Za-z_]\w*\s*=(?!=)")
_CONDITION_WORD = re.compile(r"^\.[^\s(]*\s*")
_PARAMETERS = frozenset({"param", "params", "parameter", "parameters", "global_param"})


class Sorted(msgspec.Struct, frozen=True):
    """A deck's definitions and what could not be taken."""

    top: Scope
    globals: tuple[str, ...]
    analyses: tuple[Analysis, ...]
    problems: tuple[Problem, ...]
    connected: tuple[tuple[str, str], ...] = ()


class _Sorter:
    def __init__(self) -> None:
        self.top = Scope("", None, None)
        self.stack = [self.top]
        self.globals: list[str] = []
        self.analyses: list[Analysis] = []
        self.problems: list[Problem] = []
        self.connected: list[tuple[str, str]] = []
        self.commas = False
        self.work = Work()
        self.gnd_ports: list[tuple[str, Line]] = []
        self.conditions: list[Line] = []
        self.taken: list[bool] = []
        self.live: list[bool] = []  # of each open .if: are its cards taken, and those outside

    def problem(
        self,
        rule: str,
        message: str,
        line: Line,
        remedy: str = "",
        severity: Severity | None = None,
    ) -> None:
        self.problems.append(
            Problem(
                rule=rule, message=message, remedy=remedy, location=line.location,
                severity=severity,
            )
        )  # fmt: skip

    def card(self, line: Line) -> None:
        """Take a dot card."""
        text = line.text
        word = text[1:].split(None, 1)[0].split("(")[0].lower() if len(text) > 1 else ""
        if word in ("if", "elseif", "elif", "else", "endif"):
            self.condition(word, line)
            return
        if self.live and not self.live[-1]:
            return
        try:
            self.dot(word, line)
        except CardError as error:
            self.problem("netlist-card", f"The .{word} card cannot be read: {error.reason}.", line)

    def dot(self, word: str, line: Line) -> None:
        scope = self.stack[-1]
        if word in ("subckt", "macro"):
            self.open(line)
        elif word in ("ends", "eom"):
            if len(self.stack) > 1:
                self.closed(self.stack.pop(), line)
            else:
                self.problem("netlist-end", ".ends closes no subcircuit.", line)
        elif word == "model":
            self.model(line)
        elif word in _PARAMETERS:
            for name, value in split_parameters(line.text.split(None, 1)[1:]):
                self.parameter(scope, name, value, line)
            if not self.commas and _GLUED_COMMA.search(line.text):
                self.commas = True
                self.problem(
                    "netlist-other-dialect",
                    "A comma glued to a parameter's value separates it from the next here; "
                    "ngspice 39 never comes back from such a card.",
                    line,
                    "Write a blank instead.",
                )
        elif word == "func":
            self.function(scope, line)
        elif word == "connect":
            first, *others = [i for i in items_of(line.text)[1:] if isinstance(i, str)] or [""]
            self.connected += [(other, first) for other in others]
        elif word == "global":
            self.globals += [i for i in items_of(line.text)[1:] if isinstance(i, str)]
        elif word in _ANALYSES:
            fields = tuple(line.text.split()[1:])
            self.analyses.append(Analysis(word, fields, line.location))
        elif word not in _KNOWN:
            self.problem(
                "netlist-other-dialect",
                f".{word} is not known here and is passed over.",
                line,
            )

    def parameter(self, scope: Scope, name: str, value: str, line: Line) -> None:
        if "(" in name and name.endswith(")"):
            head, _, rest = name.partition("(")
            arguments = tuple(a.strip().lower() for a in rest[:-1].split(",") if a.strip())
            scope.functions[head.strip().lower()] = Function(arguments, unquoted(value))
            return
        before = scope.parameters.get(name.lower())
        if before is not None and before[0] != value:
            self.problems.append(
                Problem(
                    rule="netlist-parameter",
                    message=f"The parameter {name} is defined twice, as {before[0]} on line "
                    f"{before[1].number} and as {value}: the last one counts.",
                    remedy="Leave one of them out.",
                    location=line.location,
                    severity="minor",
                )
            )
        scope.parameters[name.lower()] = (value, line)

    def function(self, scope: Scope, line: Line) -> None:
        body = line.text.split(None, 1)[1] if len(line.text.split(None, 1)) > 1 else ""
        head, _, rest = body.partition(")")
        name, _, arguments = head.partition("(")
        words = tuple(a.strip().lower() for a in arguments.split(",") if a.strip())
        text = rest.strip().lstrip("=").strip()
        scope.functions[name.strip().lower()] = Function(words, unquoted(text))

    def open(self, line: Line) -> None:
        items = items_of(line.text)[1:]
        words: list[str] = []
        defaults: dict[str, str] = {}
        optional: dict[str, str] = {}
        marker = ""
        for item in items:
            if isinstance(item, str):
                if item.lower().rstrip(":") in ("params", "optional", "text") and ":" in item:
                    marker = item.lower().rstrip(":")
                elif item != ":" and not marker:
                    words.append(item)
            elif isinstance(item, Group):
                words += [i for i in item.items if isinstance(i, str)]
            elif isinstance(item, Assignment):
                target = optional if marker == "optional" else defaults
                target[item.key] = text_of(item.value)
        name = words[0] if words else ""
        scope = Scope(name, line, self.stack[-1])
        scope.ports = (*words[1:], *optional)
        scope.optional = optional
        scope.defaults = defaults
        scope.notes = line.comments
        self.ports(scope, line)
        if not name:
            self.problem("netlist-card", "A .subckt card has no name.", line)
        elif name.lower() in self.stack[-1].subcircuits:
            self.problem(
                "netlist-duplicate",
                f"The subcircuit {name} is defined twice; the first one counts.",
                line,
            )
        else:
            self.stack[-1].subcircuits[name.lower()] = scope
        self.stack.append(scope)

    def ports(self, scope: Scope, line: Line) -> None:
        """Say what is odd about a header's ports."""
        times = Counter(scope.keys)
        for port, key in dict(zip(scope.ports, scope.keys, strict=True)).items():
            if times[key] > 1:
                times[key] = 0
                self.problem(
                    "netlist-duplicate",
                    f"The subcircuit {scope.name} has two ports of the name {port}.",
                    line,
                    "Give each port a name of its own.",
                )
            elif key == "0":
                self.problem(
                    "netlist-node-count",
                    f"The subcircuit {scope.name} has a port 0, which is ground everywhere.",
                    line,
                    "Give the port a name.",
                )
            elif key == "gnd":
                self.gnd_ports.append((scope.name, line))

    def tell_gnd_ports(self) -> None:
        """Say once what ngspice makes of ports with the name of ground."""
        if not self.gnd_ports:
            return
        names = [name for name, _ in self.gnd_ports]
        more = f" and {len(names) - 3} more" if len(names) > 3 else ""
        self.problem(
            "netlist-other-dialect",
            f"The port gnd of {', '.join(names[:3])}{more} is the net the call gives it; to "
            "ngspice it is ground, whatever the call says.",
            self.gnd_ports[0][1],
            "Give the port another name.",
        )

    def closed(self, scope: Scope, line: Line) -> None:
        """Compare the name behind .ends with the subcircuit's."""
        words = line.text.split()
        if len(words) > 1 and words[1].casefold() != scope.name.casefold():
            self.problems.append(
                Problem(
                    rule="netlist-end",
                    message=f".ends {words[1]} closes the subcircuit {scope.name}.",
                    remedy=f"Write .ends {scope.name}, or see which .ends is missing.",
                    location=line.location,
                    severity="minor",
                )
            )

    def model(self, line: Line) -> None:
        items = self.balanced(line)[1:]
        if len(items) < 2 or not isinstance(items[0], str):
            self.problem("netlist-model", "A .model card needs a name and a type.", line)
            return
        name, kind, rest = items[0], items[1], items[2:]
        if isinstance(kind, Call):
            word, rest = kind.name, (*kind.items, *rest)
        else:
            word = text_of(kind)
        models = self.stack[-1].models
        if name.lower() in models:
            self.problem(
                "netlist-duplicate",
                f"The model {name} is defined twice; the first one counts.",
                line,
            )
            return
        models[name.lower()] = (name, word, rest, line)

    def balanced(self, line: Line) -> Items:
        """Split a .model card; a parenthesis too few or too many at its end is mended.

        Raises  CardError
        """
        text = line.text
        missing = text.count("(") - text.count(")")
        if missing == 0:
            return items_of(text)
        if missing > 0:
            items = items_of(text + ")" * missing)
            what, remedy = "is not closed by )", "Put ) behind its last parameter."
        else:
            items = items_of(text.removesuffix(")" * -missing))
            what, remedy = "has a ) too many", "Take the last ) off."
        name = text_of(items[1]) if len(items) > 1 else "no name"
        told = f"The .model card of {name} {what}; it was read to its end."
        self.problem("netlist-card", told, line, remedy, "minor")
        return items

    def condition(self, word: str, line: Line) -> None:
        if word == "endif":
            if self.live:
                self.live.pop()
                self.taken.pop()
                self.conditions.pop()
            else:
                self.problem("netlist-card", ".endif without .if.", line)
            return
        if word == "if":
            self.live.append(False)
            self.taken.append(False)
            self.conditions.append(line)
        if not self.live:
            self.problem("netlist-card", f".{word} without .if.", line)
            return
        outer = len(self.live) < 2 or self.live[-2]
        true = outer and not self.taken[-1] and (word == "else" or self.true(line))
        self.live[-1] = true
        self.taken[-1] = self.taken[-1] or true

    def true(self, line: Line) -> bool:
        """Work a condition out from the parameters met so far, of this scope and those outside."""
        text = _CONDITION_WORD.sub("", line.text)
        if not text:
            self.problem(
                "netlist-expression", "The condition is empty; its cards are left out.", line
            )
            return False
        stack = list(reversed(self.stack))
        known: dict[str, float] = {}

        def look(name: str) -> float:
            if name in known:
                return known[name]
            for scope in stack:
                found = scope.parameters.get(name)
                written = found[0] if found is not None else scope.defaults.get(name)
                if written is not None:
                    value = known[name] = evaluate(
                        unquoted(written), look, scope.functions, DEEPEST, self.work
                    )
                    return value
            raise ExpressionError(f"{name} is not defined")

        try:
            return bool(evaluate(text, look, self.top.functions, DEEPEST, self.work))
        except (ExpressionError, RecursionError) as error:
            why = error if isinstance(error, ExpressionError) else "it rests on itself"
            self.problem(
                "netlist-expression",
                f"The condition {text} cannot be worked out: {why}; its cards are left out.",
                line,
            )
            return False


def _too_long(text: str, bounds: Bounds) -> str:
    """Say what of a card is longer than its bound, or ""."""
    if len(text) > bounds.line_characters:
        return f"A card is longer than {bounds.line_characters:,} characters"
    if max(map(len, text.split())) > bounds.word_characters:
        return f"A name or value is longer than {bounds.word_characters:,} characters"
    return ""


def sort_deck(deck: Deck) -> Sorted:
    """Sort a deck's lines into scopes."""
    sorter = _Sorter()
    word = deck.bounds.word_characters
    live, stack = sorter.live, sorter.stack
    for line in deck.lines:
        if len(line.text) > word and (what := _too_long(line.text, deck.bounds)):
            sorter.problem(
                "netlist-bound",
                f"{what}; it is left out.",
                line,
                "Raise line-characters or word-characters in [bounds] if this is meant.",
            )
        elif line.text[0] == ".":
            sorter.card(line)
        elif not live or live[-1]:
            stack[-1].cards.append(line)
    for scope in sorter.stack[1:]:
        if scope.header is not None:
            sorter.problem(
                "netlist-end",
                f"The subcircuit {scope.name} is not closed by .ends.",
                scope.header,
                "Put .ends behind its last card (.end ends the whole netlist).",
            )
    sorter.tell_gnd_ports()
    for line in sorter.conditions:
        sorter.problem(
            "netlist-end",
            f"The {line.text.split()[0]} on line {line.number} is not closed by .endif; what its "
            "condition leaves out is left out to the end.",
            line,
            "Put .endif behind its last card.",
        )
    return Sorted(
        sorter.top,
        tuple(sorter.globals),
        tuple(sorter.analyses),
        tuple(sorter.problems),
        tuple(sorter.connected),
    )
