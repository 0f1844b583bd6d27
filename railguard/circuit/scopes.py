"""Definitions: which subcircuits, models, parameters and functions a deck holds, and where.

One pass over the logical lines sorts them into scopes; nothing is expanded yet.
"""

from functools import cached_property

import msgspec

from railguard.circuit.expressions import ExpressionError, Function, evaluate
from railguard.circuit.model import Analysis, Element, Instance
from railguard.deck.cards import Assignment, Call, CardError, Group, Items, items_of
from railguard.deck.files import Deck
from railguard.deck.lines import Line
from railguard.notices import Problem

_ANALYSES = frozenset(
    {"tran", "ac", "dc", "op", "tf", "noise", "disto", "pz", "sens", "four", "fourier", "fft", "hb",
     "sp", "lin", "net", "step", "meas", "measure", "temp"}
)  # fmt: skip
_KNOWN = frozenset(
    {"options", "option", "opt", "save", "probe", "print", "plot", "width", "ic", "nodeset", "end",
     "title", "backanno", "csparam", "endl", "lib", "include", "inc", "incl", "endc", "prot",
     "unprot", "protect", "unprotect", "connect", "alias", "wave", "text", "load", "savebias",
     "loadbias", "preprocess", "global_param", "machine", "endmachine", "watch", "list", "view"}
)  # fmt: skip
_PARAMETERS = frozenset({"param", "params", "parameter", "parameters", "global_param"})


class Scope:
    """What one subcircuit (or the top level) defines.

    cards  its element cards; `bound` by number, what those are that every instance reads alike
    first  by case-folded designator, the first card of that name
    told   numbers of cards whose problems have been told
    key    a number no other scope has
    """

    def __init__(self, name: str, header: Line | None, parent: "Scope | None") -> None:
        self.name = name
        self.header = header
        self.parent = parent
        self.ports: tuple[str, ...] = ()
        self.optional: dict[str, str] = {}
        self.defaults: dict[str, str] = {}
        self.cards: list[Line] = []
        self.parameters: dict[str, tuple[str, Line]] = {}
        self.functions: dict[str, Function] = {}
        self.models: dict[str, tuple[str, str, Items, Line]] = {}
        self.subcircuits: dict[str, Scope] = {}
        self.notes: tuple[str, ...] = ()
        self.bound: dict[int, tuple[Element, ...] | Instance] = {}
        self.first: dict[str, Line] = {}
        self.told: set[int] = set()
        self.key = id(self)
        self._items: dict[int, Items] = {}

    def items(self, number: int, line: Line) -> Items:
        """Return the items of card `number`, split once however often the scope is expanded.

        Raises  CardError
        """
        found = self._items.get(number)
        if found is None:
            found = self._items[number] = items_of(line.text)
        return found

    @cached_property
    def keys(self) -> tuple[str, ...]:
        """The ports as nets are compared."""
        return tuple(port.casefold() for port in self.ports)

    @cached_property
    def calls(self) -> bool:
        """Tell whether a card of this scope calls a subcircuit."""
        return any(line.text[0] in "xX" for line in self.cards)

    def subcircuit(self, name: str) -> "Scope | None":
        """Find a definition from here outwards."""
        scope: Scope | None = self
        while scope is not None:
            if name in scope.subcircuits:
                return scope.subcircuits[name]
            scope = scope.parent
        return None

    def model(self, name: str) -> tuple[str, str, Items, Line] | None:
        """Find a model card from here outwards: name, type word, parameters, card."""
        scope: Scope | None = self
        while scope is not None:
            if name in scope.models:
                return scope.models[name]
            scope = scope.parent
        return None


class Sorted(msgspec.Struct, frozen=True):
    """A deck's definitions and what could not be taken."""

    top: Scope
    globals: tuple[str, ...]
    analyses: tuple[Analysis, ...]
    problems: tuple[Problem, ...]


class _Sorter:
    def __init__(self) -> None:
        self.top = Scope("", None, None)
        self.stack = [self.top]
        self.globals: list[str] = []
        self.analyses: list[Analysis] = []
        self.problems: list[Problem] = []
        self.taken: list[bool] = []
        self.live: list[bool] = []

    def problem(self, rule: str, message: str, line: Line, remedy: str = "") -> None:
        self.problems.append(
            Problem(rule=rule, message=message, remedy=remedy, location=line.location)
        )

    def take(self, line: Line) -> None:
        text = line.text
        if text[0] != ".":
            if not self.live or all(self.live):
                self.stack[-1].cards.append(line)
            return
        word = text[1:].split(None, 1)[0].split("(")[0].lower() if len(text) > 1 else ""
        if word in ("if", "elseif", "elif", "else", "endif"):
            self.condition(word, line)
            return
        if not all(self.live):
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
                self.stack.pop()
            else:
                self.problem("netlist-end", ".ends closes no subcircuit.", line)
        elif word == "model":
            self.model(line)
        elif word in _PARAMETERS:
            for name, value in split_parameters(line.text.split(None, 1)[1:]):
                self.parameter(scope, name, value, line)
        elif word == "func":
            self.function(scope, line)
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

    def model(self, line: Line) -> None:
        items = items_of(line.text)[1:]
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

    def condition(self, word: str, line: Line) -> None:
        if word == "endif":
            if self.live:
                self.live.pop()
                self.taken.pop()
            return
        if word == "if":
            self.live.append(False)
            self.taken.append(False)
        if not self.live:
            self.problem("netlist-card", f".{word} without .if.", line)
            return
        outer = all(self.live[:-1])
        true = outer and not self.taken[-1] and (word == "else" or self.true(line))
        self.live[-1] = true
        self.taken[-1] = self.taken[-1] or true

    def true(self, line: Line) -> bool:
        text = line.text.split("(", 1)[1].rsplit(")", 1)[0] if "(" in line.text else ""
        scope = self.top

        def look(name: str) -> float:
            if name not in scope.parameters:
                raise ExpressionError(f"{name} is not defined")
            return evaluate(unquoted(scope.parameters[name][0]), look, scope.functions)

        try:
            return bool(evaluate(text, look, scope.functions))
        except (ExpressionError, RecursionError) as error:
            self.problem(
                "netlist-expression",
                f"The condition ({text}) cannot be worked out: {error}; its cards are left out.",
                line,
            )
            return False


def sort_deck(deck: Deck) -> Sorted:
    """Sort a deck's lines into scopes."""
    sorter = _Sorter()
    longest = deck.bounds.line_characters
    for line in deck.lines:
        if len(line.text) > longest:
            sorter.problem(
                "netlist-bound",
                f"A card is longer than {deck.bounds.line_characters:,} characters.",
                line,
            )
            continue
        sorter.take(line)
    for scope in sorter.stack[1:]:
        if scope.header is not None:
            sorter.problem(
                "netlist-end",
                f"The subcircuit {scope.name} is not closed by .ends.",
                scope.header,
                "Put .ends behind its last card (.end ends the whole netlist).",
            )
    return Sorted(sorter.top, tuple(sorter.globals), tuple(sorter.analyses), tuple(sorter.problems))


def unquoted(text: str) -> str:
    """Take the braces or quotes off an expression."""
    text = text.strip()
    if len(text) >= 2 and text[0] + text[-1] in ("{}", "''", '""'):
        return text[1:-1].strip()
    return text


def text_of(item: "str | Assignment | Call | Group") -> str:
    """Write an item out again."""
    match item:
        case str():
            return item
        case Assignment():
            return f"{item.key}={text_of(item.value)}"
        case Call():
            return f"{item.name}({' '.join(text_of(i) for i in item.items)})"
        case Group():
            return f"({' '.join(text_of(i) for i in item.items)})"


def split_parameters(rest: list[str]) -> list[tuple[str, str]]:
    """Cut `a=1 b = {a*2}, c=3` into names and values; a value runs to the next `name =`."""
    text = rest[0] if rest else ""
    found: list[tuple[str, str]] = []
    starts = []
    depth, quote = 0, ""
    for index, character in enumerate(text):
        if quote:
            quote = "" if character == quote else quote
        elif character in "'\"":
            quote = character
        elif character in "({":
            depth += 1
        elif character in ")}":
            depth -= 1
        elif character == "=" and depth == 0 and _assigns(text, index):
            starts.append(index)
    for number, at in enumerate(starts):
        name_at = _name_start(text, at)
        end = _name_start(text, starts[number + 1]) if number + 1 < len(starts) else len(text)
        value = text[at + 1 : end].strip().rstrip(",").strip()
        found.append((text[name_at:at].strip().lstrip(",").strip(), value))
    return found


def _assigns(text: str, at: int) -> bool:
    before, after = text[at - 1 : at], text[at + 1 : at + 2]
    return before not in ("=", "<", ">", "!") and after != "="


def _name_start(text: str, at: int) -> int:
    index = at
    while index and text[index - 1].isspace():
        index -= 1
    if index and text[index - 1] == ")":
        index = text.rfind("(", 0, index)
    while index and (text[index - 1].isalnum() or text[index - 1] in "_.$"):
        index -= 1
    return index
