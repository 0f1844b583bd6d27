"""Parameter expressions: parsed by the grammar, evaluated within bounds, never executed.

What depends on a running simulation (a voltage, a current, time) has no value here.
"""

import itertools
import math
import re
from collections.abc import Callable, Iterator, Mapping
from functools import lru_cache
from types import MappingProxyType

import msgspec

from railguard.deck.language import parser, terminals
from railguard.deck.numbers import read_number

Value = float
Lookup = Callable[[str], float]

_NAME = re.compile(r"^[A-Za-z_][A-Za-z0-9_]*$")
_RUN_TIME = frozenset({"time", "freq", "hertz", "x", "s"})
_CONSTANTS: dict[str, float] = {
    "pi": math.pi,
    "e": math.e,
    "temper": 27.0,
    "temp": 27.0,
    "vt": 0.02585,
    "boltz": 1.380649e-23,
    "echarge": 1.602176634e-19,
    "true": 1.0,
    "false": 0.0,
}
_RESERVED = _RUN_TIME | _CONSTANTS.keys()
LONGEST = 10_000
"""Characters of one expression."""
DEEPEST = 64
"""Nested parentheses and calls of one expression."""
MOST_STEPS = 50_000
"""Operations of one expression with all the functions it calls."""
MOST_STEPS_OF_A_DECK = 10_000_000
"""Operations of all expressions of a deck: some ten seconds."""
_TOO_DEEP = "the expression is longer or deeper than the bound allows"
_T = terminals("expression.lark")
_OPERAND = rf"(?:(?P<number{{0}}>{_T['NUMBER']})|(?P<name{{0}}>{_T['NAME']}))"
_SHORT = re.compile(
    rf"\s*+(?P<sign>{_T['ADD']})?\s*+{_OPERAND.format(1)}\s*+"
    rf"(?:(?P<operator>{_T['ADD']}|{_T['MULTIPLY']})\s*+{_OPERAND.format(2)}\s*+)?"
)


class ExpressionError(Exception):
    """An expression without a value; `behavioural` where only a simulation gives it one."""

    def __init__(self, reason: str, behavioural: bool = False) -> None:
        self.reason = reason
        self.behavioural = behavioural
        super().__init__(reason)


class Node(msgspec.Struct, frozen=True):
    """A node of an expression: its kind, its text, its parts."""

    kind: str
    text: str
    parts: tuple["Node", ...] = ()


class Function(msgspec.Struct, frozen=True):
    """A `.func`: argument names lower-cased, body as written."""

    arguments: tuple[str, ...]
    body: str


class Work:
    """What the expressions of one deck have cost so far."""

    steps = 0


def evaluate(
    text: str,
    lookup: Lookup,
    functions: Mapping[str, Function] = MappingProxyType({}),
    deepest: int = DEEPEST,
    work: Work | None = None,
) -> float:
    """Return an expression's value.

    lookup   gives a parameter's value by its lower-cased name, or raises ExpressionError
    deepest  how deep its parentheses may be nested
    work     of the deck it stands in, where that is counted

    Raises  ExpressionError: bad syntax, an unknown name, a division by zero, a run-time value
    """
    plain = text.strip()
    number = read_number(plain)
    if number is not None and not number.trap:
        return number.value
    try:
        if _NAME.match(plain) and plain.lower() not in _RESERVED:
            return lookup(plain.lower())
        tree = parse(plain, deepest)
        return _evaluated(_Evaluator(lookup, functions, itertools.count()), tree, work or Work())
    except RecursionError:
        raise ExpressionError("it rests on too long a chain of parameters or functions") from None


def _evaluated(evaluator: "_Evaluator", tree: Node, work: Work) -> float:
    if work.steps > MOST_STEPS_OF_A_DECK:
        raise ExpressionError(
            f"the expressions of this deck take more than {MOST_STEPS_OF_A_DECK:,} steps"
        )
    try:
        return evaluator.value(tree, 0)
    finally:
        work.steps += evaluator.steps


@lru_cache(maxsize=4096)
def parse(text: str, deepest: int = DEEPEST) -> Node:
    """Parse an expression; those of one or two operands by a path made of the same terminals.

    Raises  ExpressionError
    """
    short = _SHORT.fullmatch(text)
    return parse_whole(text, deepest) if short is None else _short(short)


def _short(found: re.Match[str]) -> Node:
    left = _operand(found["number1"], found["name1"])
    if found["sign"]:
        left = Node("sign", found["sign"], (left,))
    if not found["operator"]:
        return left
    return Node("binary", found["operator"], (left, _operand(found["number2"], found["name2"])))


def _operand(number: str | None, name: str | None) -> Node:
    return Node("number", number) if number else Node("name", name or "")


def parse_whole(text: str, deepest: int = DEEPEST) -> Node:
    """Parse an expression through the grammar, whatever it looks like.

    Raises  ExpressionError
    """
    from lark import Token, Tree, UnexpectedInput  # imported only when an expression needs it

    if not text:
        raise ExpressionError("the expression is empty")
    if len(text) > LONGEST or _depth(text) > deepest:
        raise ExpressionError(_TOO_DEEP)
    try:
        tree = parser("expression.lark").parse(text)
    except UnexpectedInput as error:
        place = error.pos_in_stream or 0
        near = text[place : place + 12] or "its end"
        raise ExpressionError(f'"{text}" is no expression (at "{near}")') from error

    def convert(node: "Tree[Token] | Token") -> Node:
        if isinstance(node, Token):
            return Node("token", str(node))
        parts = [convert(c) for c in node.children if c is not None]
        if node.data in ("number", "name", "probe"):
            return Node(str(node.data), parts[0].text)
        if node.data == "call":
            return Node("call", parts[0].text.lower(), tuple(parts[1:]))
        if node.data == "sign":
            return Node("sign", parts[0].text, (parts[1],))
        if node.data == "binary":
            return Node("binary", parts[1].text, (parts[0], parts[2]))
        return Node("choose", "", tuple(parts))

    try:
        return convert(tree)
    except RecursionError:
        raise ExpressionError(_TOO_DEEP) from None


def probes(text: str) -> tuple[str, ...]:
    """Return the nets an expression takes voltages of."""
    found: list[str] = []
    for inside in re.findall(r"(?i)\bv\w{0,2}\(([^()]*)\)", text):
        found += [net.strip() for net in inside.split(",") if net.strip()]
    return tuple(dict.fromkeys(found))


def _depth(text: str) -> int:
    deepest = depth = 0
    for character in text:
        depth += character in "({"
        depth -= character in ")}"
        deepest = max(deepest, depth)
    return deepest


def _power(a: float, b: float) -> float:
    return float(a**b if a >= 0 or b == int(b) else abs(a) ** b)


def _nominal(*values: float) -> float:
    return values[0]


def _table(x: float, *points: float) -> float:
    pairs = sorted(zip(points[::2], points[1::2], strict=False))
    if x <= pairs[0][0]:
        return pairs[0][1]
    for (x0, y0), (x1, y1) in itertools.pairwise(pairs):
        if x <= x1:
            return y0 + (y1 - y0) * (x - x0) / (x1 - x0)
    return pairs[-1][1]


def _limit(*values: float) -> float:
    # With two arguments it is a random draw round the first one: the nominal counts.
    return values[0] if len(values) < 3 else min(max(values[0], values[1]), values[2])


_FUNCTIONS: dict[str, Callable[..., float]] = {
    "abs": abs, "sqrt": math.sqrt, "exp": math.exp, "ln": math.log, "log": math.log,
    "log10": math.log10, "sin": math.sin, "cos": math.cos, "tan": math.tan, "asin": math.asin,
    "acos": math.acos, "atan": math.atan, "arctan": math.atan, "atan2": math.atan2,
    "sinh": math.sinh, "cosh": math.cosh, "tanh": math.tanh, "asinh": math.asinh,
    "acosh": math.acosh, "atanh": math.atanh, "min": min, "max": max,
    "floor": math.floor, "ceil": math.ceil, "int": math.trunc, "nint": round, "round": round,
    "sgn": lambda x: math.copysign(1.0, x) if x else 0.0, "sqr": lambda x: x * x, "pow": _power,
    "pwr": lambda a, b: abs(a) ** b, "pwrs": lambda a, b: math.copysign(abs(a) ** b, a),
    "hypot": math.hypot, "u": lambda x: float(x > 0), "stp": lambda x: float(x > 0),
    "uramp": lambda x: max(x, 0.0), "limit": _limit, "table": _table, "tbl": _table,
    "gauss": _nominal, "agauss": _nominal, "unif": _nominal, "aunif": _nominal, "mc": _nominal,
    "flat": lambda _x: 0.0, "rand": lambda _x: 0.0, "random": lambda _x: 0.0,
    "ternary_fcn": lambda c, a, b: a if c else b, "inv": lambda x: float(x <= 0.5),
    "buf": lambda x: float(x > 0.5), "mod": math.fmod, "fmod": math.fmod,
}  # fmt: skip


class _Evaluator:
    def __init__(
        self, lookup: Lookup, functions: Mapping[str, Function], steps: Iterator[int]
    ) -> None:
        self._lookup = lookup
        self._functions = functions
        self._steps = steps

    @property
    def steps(self) -> int:
        """Operations up to now."""
        return next(self._steps)

    def value(self, node: Node, depth: int) -> float:
        if next(self._steps) > MOST_STEPS:
            raise ExpressionError(f"it takes more than {MOST_STEPS:,} steps")
        if depth > 4 * DEEPEST:
            raise ExpressionError("the expression is deeper than the bound allows")
        match node.kind:
            case "number":
                number = read_number(node.text)
                if number is None or number.trap.startswith("the digits"):
                    raise ExpressionError(f'"{node.text}" is no number in an expression')
                return number.value
            case "name":
                return self._name(node.text.lower())
            case "probe":
                raise ExpressionError(f"{node.text} is known only to a simulation", True)
            case "sign":
                inner = self.value(node.parts[0], depth + 1)
                return {"+": inner, "-": -inner}.get(node.text, float(not inner))
            case "choose":
                condition, yes, no = node.parts
                return self.value(yes if self.value(condition, depth + 1) else no, depth + 1)
            case "call":
                return self._call(node, depth)
        left, right = (self.value(part, depth + 1) for part in node.parts)
        return self._checked(node.text, lambda: _OPERATORS[node.text](left, right))

    def _name(self, name: str) -> float:
        if name in _RUN_TIME:
            try:
                return self._lookup(name)
            except ExpressionError:
                raise ExpressionError(f"{name} is known only to a simulation", True) from None
        try:
            return self._lookup(name)
        except ExpressionError:
            if name in _CONSTANTS:
                return _CONSTANTS[name]
            raise

    def _call(self, node: Node, depth: int) -> float:
        own = self._functions.get(node.text)
        if node.text == "if" and len(node.parts) == 3:
            chosen = node.parts[1] if self.value(node.parts[0], depth + 1) else node.parts[2]
            return self.value(chosen, depth + 1)
        arguments = [self.value(part, depth + 1) for part in node.parts]
        if own is not None:
            bound = dict(zip(own.arguments, arguments, strict=False))

            def look(name: str) -> float:
                return bound[name] if name in bound else self._lookup(name)

            return _Evaluator(look, self._functions, self._steps).value(parse(own.body), depth + 1)
        function = _FUNCTIONS.get(node.text)
        if function is None:
            raise ExpressionError(f"{node.text}() is no known function")
        return self._checked(f"{node.text}()", lambda: float(function(*arguments)))

    @staticmethod
    def _checked(what: str, work: Callable[[], float]) -> float:
        try:
            result = work()
        except ZeroDivisionError:
            raise ExpressionError("it divides by zero") from None
        except (ValueError, OverflowError, TypeError) as error:
            raise ExpressionError(f"{what} has no value here ({error})") from None
        if isinstance(result, complex) or not math.isfinite(result):
            raise ExpressionError(f"{what} has no finite value here")
        return float(result)


_OPERATORS: dict[str, Callable[[float, float], float]] = {
    "+": lambda a, b: a + b, "-": lambda a, b: a - b, "*": lambda a, b: a * b,
    "/": lambda a, b: a / b, "%": math.fmod, "\\": lambda a, b: float(a // b),
    "^": _power, "**": _power, "==": lambda a, b: float(a == b), "=": lambda a, b: float(a == b),
    "!=": lambda a, b: float(a != b), "<>": lambda a, b: float(a != b),
    "<": lambda a, b: float(a < b), ">": lambda a, b: float(a > b),
    "<=": lambda a, b: float(a <= b), ">=": lambda a, b: float(a >= b),
    "||": lambda a, b: float(bool(a) or bool(b)), "|": lambda a, b: float(bool(a) or bool(b)),
    "&&": lambda a, b: float(bool(a) and bool(b)), "&": lambda a, b: float(bool(a) and bool(b)),
}  # fmt: skip
