"""Every regular expression of the package, how it is used, and the texts that are worst for it.

Run in a process of its own with bounds on its processor time: `python -m tests.hostile.patterns`.
"""

import ast
import gc
import importlib
import pkgutil
import re
import sys
import time
from pathlib import Path
from re import _constants as codes
from re import _parser as parser

import railguard

ROOT = Path(railguard.__file__).parent
LONG = 20_000
"""Characters of a bad text. A scan takes a millisecond; one that starts anew at each, a second."""

SECONDS = 0.15
"""Of processor time, for one text."""

LINES = ("railguard.deck.cards._TOKEN", "railguard.deck.lines._PIN_NAMES")
"""Given one line only, without blanks at its ends."""

METHODS = ("match", "fullmatch", "search", "sub", "findall", "finditer", "split")
INLINE = tuple(f"re.{method}" for method in METHODS)
ENDS = ("", "\x01", "\n!", " !")
SAMPLES = {
    codes.CATEGORY_DIGIT: "7",
    codes.CATEGORY_SPACE: " ",
    codes.CATEGORY_WORD: "a",
    codes.CATEGORY_NOT_DIGIT: "x",
    codes.CATEGORY_NOT_SPACE: "x",
    codes.CATEGORY_NOT_WORD: "-",
}
HOSTS = ("railguard.plugins", "railguard.engine.shared_worker", "railguard.__main__")
"""Not imported here: what belongs to another program."""


def modules():
    """Yield every module of the package."""
    for found in pkgutil.walk_packages([str(ROOT)], "railguard."):
        if not found.name.startswith(HOSTS):
            yield importlib.import_module(found.name)


def patterns():
    """Yield (where, pattern, methods it is used by)."""
    for module in modules():
        tree = ast.parse(Path(module.__file__).read_text(encoding="utf-8"))
        used = {}
        for node in ast.walk(tree):
            if not isinstance(node, ast.Attribute) or node.attr not in METHODS:
                continue
            used.setdefault(getattr(node.value, "id", ""), set()).add(node.attr)
        for node in ast.walk(tree):
            if isinstance(node, ast.Call) and ast.unparse(node.func) in INLINE:
                text = node.args[0]
                if isinstance(text, ast.Constant):
                    where = f"{module.__name__}, line {node.lineno}"
                    yield where, re.compile(text.value), {node.func.attr}
        for name, value in sorted(vars(module).items()):
            for one in held(value):
                yield f"{module.__name__}.{name}", one, used.get(name, set(METHODS))


def held(value, depth=0):
    """Yield the patterns in a value, and in what it holds."""
    if isinstance(value, re.Pattern):
        yield value
    elif isinstance(value, list | tuple | dict) and depth < 3:
        for one in value.values() if isinstance(value, dict) else value:
            yield from held(one, depth + 1)


def sample(node):
    """Return a short text that a part of a parsed pattern matches, or nearly."""
    return "".join(next(iter(characters(op, given)), "") for op, given in node)


def characters(op, given):
    """Yield texts that one part matches: every character a set names, every branch's sample."""
    if op is codes.LITERAL:
        yield chr(given)
    elif op is codes.NOT_LITERAL:
        yield "x" if given != ord("x") else "y"
    elif op is codes.ANY:
        yield "x"
    elif op is codes.IN:
        yield from members(given)
    elif op is codes.BRANCH:
        for branch in given[1]:
            yield sample(branch)
    elif op is codes.SUBPATTERN:
        yield sample(given[3])
    elif op in (codes.MAX_REPEAT, codes.MIN_REPEAT, codes.POSSESSIVE_REPEAT):
        yield sample(given[2]) * max(given[0], 1)
    elif op is codes.ATOMIC_GROUP:
        yield sample(given)


def members(given):
    """Yield characters of a set."""
    if given[0][0] is codes.NEGATE:
        yield from ("x", "-", " ")
        return
    for op, value in given:
        if op is codes.LITERAL:
            yield chr(value)
        elif op is codes.RANGE:
            yield chr(value[0])
        elif op is codes.CATEGORY:
            yield SAMPLES[value]


def repeats(node, before=""):
    """Yield (text before, texts to repeat) of every part that may stand many times."""
    for op, given in node:
        if op in (codes.MAX_REPEAT, codes.MIN_REPEAT, codes.POSSESSIVE_REPEAT):
            if given[1] > 8:
                inner = [text for part in given[2] for text in characters(*part)]
                yield before, [sample(given[2]), *inner]
            yield from repeats(given[2], before)
        elif op is codes.SUBPATTERN:
            yield from repeats(given[3], before)
        elif op is codes.BRANCH:
            for branch in given[1]:
                yield from repeats(branch, before)
        elif op is codes.ATOMIC_GROUP:
            yield from repeats(given, before)
        elif op in (codes.ASSERT, codes.ASSERT_NOT):
            yield from repeats(given[1], before)
        before += next(iter(characters(op, given)), "")


def bad(pattern):
    """Return the texts that are worst for a pattern."""
    runs = dict.fromkeys(
        (before, text)
        for before, texts in repeats(parser.parse(pattern.pattern, pattern.flags))
        for text in texts
        if text
    )
    whole = sample(parser.parse(pattern.pattern, pattern.flags))
    runs |= dict.fromkeys(("", text) for text in (whole, whole[:1], whole[:-1], " ", "a") if text)
    pieces = [text for _, text in runs]
    runs |= dict.fromkeys(("", a + b) for a in pieces[:8] for b in pieces[:8])
    return [before + text * (LONG // len(text)) + end for before, text in runs for end in ENDS]


def slow(given):
    """Yield (where, pattern, method, text's beginning, seconds) of whatever is not a plain scan."""
    calls = {"sub": lambda p, t: p.sub("", t), "finditer": lambda p, t: list(p.finditer(t))}
    for where, pattern, methods in given:
        for method in sorted(methods):
            call = calls.get(method) or (lambda p, t, m=method: getattr(p, m)(t))
            for text in bad(pattern):
                text = text.strip().replace("\n", " ") if where in LINES else text
                begun = time.process_time()
                call(pattern, text)
                spent = time.process_time() - begun
                if spent > SECONDS:
                    yield where, pattern.pattern, method, text[:20], round(spent, 2)
                    break


def main():
    """Print how many patterns there are, and those that are slow; status 1 where there are any."""
    gc.disable()
    whole = list(patterns())
    found = list(slow(whole))
    sys.stdout.write(f"{len(whole)} patterns, {len(found)} slow\n")
    sys.stdout.writelines(f"{row}\n" for row in found)
    sys.exit(bool(found))


if __name__ == "__main__":
    main()
