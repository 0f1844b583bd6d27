"""Print which small changes of a module no test notices.

The changes are those of mutmut (`pip install mutmut`): an operator turned round, a number moved, an
argument dropped, a condition held true. They are tried in forks of one running test session, each
against the tests that reach its lines, so nothing on disk is changed and thousands take minutes.
A change of wording is left out: a text with a space in it, a message, a remedy, a source. So are
the upper and lower case of a word that stands for a state.

    python tests/bench/mutants.py rules/severity rules/bias            the modules, or whole rooms
    python tests/bench/mutants.py analysis/loops --sample 300 --tests tests/outside
    python tests/bench/mutants.py analysis/loops --again lived.txt     what an earlier run printed

Every survivor is printed as the line it stands on and the line it became.
"""

import argparse
import contextlib
import gc
import importlib
import inspect
import os
import random
import re
import signal
import sys
import textwrap
import time
from collections import Counter, defaultdict
from collections.abc import Callable, Iterator
from functools import _lru_cache_wrapper
from pathlib import Path
from types import FrameType, FunctionType
from typing import Any, NamedTuple

import libcst as cst
import pytest
from _pytest.runner import runtestprotocol
from libcst.metadata import MetadataWrapper, ParentNodeProvider, PositionProvider
from mutmut.mutation.file_mutation import MutationVisitor, deep_replace
from mutmut.mutation.mutators import mutation_operators
from mutmut.mutation.pragma_handling import IgnoredCode

ROOT = Path(__file__).parents[2]
PACKAGE = ROOT / "railguard"
USUAL = ("tests/rules", "tests/analysis")
WORDS = frozenset({"message", "remedy", "source", "reason", "words", "why", "add"})
"""Arguments that carry wording."""
UNCHANGED = frozenset({"railguard.devices", "railguard.deck", "railguard.circuit"})
"""Rooms whose caches stay filled: no change is made left of `analysis`."""
PATIENCE = 2.0
"""Seconds of processor time a test may take beyond five times what it took without a change."""


class Mutant(NamedTuple):
    """One change: where it stands, what the line becomes, and the function with it in place."""

    path: Path
    function: str
    lines: range
    before: str
    after: str
    code: str


# --- making them


def mutants_of(path: Path) -> Iterator[Mutant]:
    """Yield every change of a module's functions that is no mere wording."""
    wrapper = MetadataWrapper(cst.parse_module(path.read_text("utf-8")))
    visitor = MutationVisitor(mutation_operators, IgnoredCode(set(), set(), set()))
    wrapper.visit(visitor)
    places, parents = wrapper.resolve(PositionProvider), wrapper.resolve(ParentNodeProvider)
    for made in visitor.mutations:
        whole = made.contained_by_top_level_function
        if not isinstance(whole, cst.FunctionDef):
            continue
        if _is_wording(made.original_node, made.mutated_node, parents):
            continue
        owner = _class_of(whole, parents)
        changed = deep_replace(whole, made.original_node, made.mutated_node)
        before, after = (
            textwrap.dedent(wrapper.module.code_for_node(node)).lstrip("\n")
            for node in (whole, changed)
        )
        first = _statement(made.original_node, parents)
        last = _placed(made.original_node, places, parents)
        if first is whole:  # a default: any line of the function
            last = whole
        span = range(places[first].start.line, places[last].end.line + 1)
        yield Mutant(path, owner + whole.name.value, span, *_apart(before, after), after)


def _is_wording(node: cst.CSTNode, changed: cst.CSTNode, parents: Any) -> bool:
    if isinstance(node, cst.SimpleString):
        text, new = node.evaluated_value, changed.evaluated_value
        return " " in text or new in (text.upper(), text.lower()) or _carries_words(node, parents)
    if isinstance(node, cst.Call) and isinstance(changed, cst.Call):
        kept = [arg.value for arg in changed.args]
        return any(
            arg.keyword is not None and arg.keyword.value in WORDS
            for arg in node.args
            if arg.value not in kept
        )
    return False


def _carries_words(node: cst.CSTNode, parents: Any) -> bool:
    while not isinstance(node, cst.BaseStatement | cst.BaseSmallStatement):
        node = parents[node]
        if isinstance(node, cst.FormattedString | cst.ConcatenatedString):
            return True
        if isinstance(node, cst.Arg) and node.keyword is not None:
            return node.keyword.value in WORDS
    return False


def _class_of(function: cst.CSTNode, parents: Any) -> str:
    around = parents.get(parents[function])
    return f"{around.name.value}." if isinstance(around, cst.ClassDef) else ""


def _statement(node: cst.CSTNode, parents: Any) -> cst.CSTNode:
    while not isinstance(node, cst.SimpleStatementLine | cst.BaseCompoundStatement | cst.MatchCase):
        node = parents[node]
    return node


def _placed(node: cst.CSTNode, places: Any, parents: Any) -> cst.CSTNode:
    while node not in places:
        node = parents[node]
    return node


def _apart(before: str, after: str) -> tuple[str, str]:
    """Return the lines in which two texts differ, each run of them as one line."""
    old, new = before.splitlines(), after.splitlines()
    while old and new and old[0] == new[0]:
        del old[0], new[0]
    while old and new and old[-1] == new[-1]:
        del old[-1], new[-1]
    return tuple(" ".join(part.strip() for part in side) for side in (old, new))  # type: ignore[return-value]


# --- trying them


class Trial:
    """A plug-in of pytest that runs the tests once, and then once more for every change."""

    def __init__(self, mutants: list[Mutant], seconds: float) -> None:
        """Take the changes, and the longest the tests of one may take, s."""
        self.mutants, self.seconds = mutants, seconds
        self.files = {str(mutant.path) for mutant in mutants}
        self.reached: dict[tuple[str, int], set[int]] = defaultdict(set)
        self.took: list[float] = []
        self.files_of: list[Path] = []
        self.outcomes: list[tuple[Mutant, str]] = []

    def pytest_runtestloop(self, session: pytest.Session) -> bool:
        """Learn which test reaches which line, then try each change against its tests."""
        items = session.items
        self.files_of = [item.path for item in items]
        for number, item in enumerate(items):
            follower = items[number + 1] if number + 1 < len(items) else None
            begun = time.perf_counter()
            with self._watching(number):
                reports = runtestprotocol(item, log=False, nextitem=follower)
            self.took.append(time.perf_counter() - begun)
            if any(report.failed for report in reports):
                raise SystemExit(f"{item.nodeid} fails without any change")
        caches = list(_caches())
        gc.freeze()  # the forks then leave the pages of what is there alone
        killers: Counter[int] = Counter()
        for done, mutant in enumerate(self.mutants, 1):
            tests = self._tests(mutant, killers)
            outcome = "not reached" if not tests else self._try(mutant, items, tests, caches)
            if outcome.startswith("killed by"):
                killers[int(outcome.removeprefix("killed by "))] += 1
                outcome = "killed"
            self.outcomes.append((mutant, outcome))
            if outcome != "killed":
                print(told(mutant, outcome), flush=True)
            print(f"{done} of {len(self.mutants)}", end="\r", file=sys.stderr)
        return True

    @contextlib.contextmanager
    def _watching(self, number: int) -> Iterator[None]:
        reached, files = self.reached, self.files

        def line(frame: FrameType, event: str, _: object) -> Callable[..., Any]:
            reached[frame.f_code.co_filename, frame.f_lineno].add(number)
            return line

        def call(frame: FrameType, event: str, _: object) -> Callable[..., Any] | None:
            return line if frame.f_code.co_filename in files else None

        sys.settrace(call)
        try:
            yield
        finally:
            sys.settrace(None)

    def _tests(self, mutant: Mutant, killers: Counter[int]) -> list[int]:
        """Return the tests that reach a change, those first that told many, then the quick ones.

        The module's own tests are always among them; of the others the quick ones, while time
        lasts.
        """
        found = set().union(*(self.reached[str(mutant.path), line] for line in mutant.lines))
        chosen = [n for n in found if self.files_of[n].stem == f"test_{mutant.path.stem}"]
        left = self.seconds
        for number in sorted(found.difference(chosen), key=lambda n: self.took[n]):
            left -= self.took[number]
            if left < 0:
                break
            chosen.append(number)
        return sorted(chosen, key=lambda n: (-killers[n], self.took[n]))

    def _try(
        self, mutant: Mutant, items: list[pytest.Item], tests: list[int], caches: list[Any]
    ) -> str:
        """Run the tests on a change in a process of its own; a test that fails has told it."""
        reader, writer = os.pipe()
        child = os.fork()
        if child == 0:
            os.close(reader)
            status = b"not tried"
            try:
                signal.signal(signal.SIGPROF, signal.SIG_DFL)
                with Path(os.devnull).open("w") as nowhere:
                    os.dup2(nowhere.fileno(), 1)
                    os.dup2(nowhere.fileno(), 2)
                for cache in caches:
                    cache.cache_clear()
                if put_in_place(mutant):
                    status = b"survived"
                    for at, number in enumerate(tests):
                        signal.setitimer(signal.ITIMER_PROF, PATIENCE + 5 * self.took[number])
                        follower = items[tests[at + 1]] if at + 1 < len(tests) else None
                        reports = runtestprotocol(items[number], log=False, nextitem=follower)
                        if any(report.failed for report in reports):
                            status = b"killed by %d" % number
                            break
                os.write(writer, status)
            finally:
                os._exit(0)
        os.close(writer)
        with os.fdopen(reader, "rb") as answer:
            said = answer.read().decode()
        os.waitpid(child, 0)
        return said or "killed"  # it hung, or took the process with it


def put_in_place(mutant: Mutant) -> bool:
    """Give the function its changed code, wherever it was imported; False where it cannot be."""
    name = ".".join(mutant.path.relative_to(ROOT).with_suffix("").parts)
    module = importlib.import_module(name)
    owner, _, last = mutant.function.rpartition(".")
    held = inspect.getattr_static(getattr(module, owner) if owner else module, last)
    function = getattr(held, "__func__", held)
    made: dict[str, Any] = {}
    exec(compile(mutant.code, str(mutant.path), "exec"), vars(module), made)
    new = getattr(made[last], "__func__", made[last])
    if not isinstance(function, FunctionType) or new.__code__.co_freevars:
        return False
    function.__code__ = new.__code__
    function.__defaults__, function.__kwdefaults__ = new.__defaults__, new.__kwdefaults__
    return True


def _caches() -> Iterator[Any]:
    for held in gc.get_objects():
        if isinstance(held, _lru_cache_wrapper):
            room = ".".join((held.__module__ or "").split(".")[:2])
            if room.startswith(("tests", "railguard")) and room not in UNCHANGED:
                yield held


# --- saying it


def main() -> None:
    """Try the changes of the modules named and print what no test noticed."""
    parser = argparse.ArgumentParser(description=__doc__.split("\n\n")[0])
    parser.add_argument("modules", nargs="+", help="below railguard/: rules/severity, rules/bias")
    parser.add_argument("--tests", nargs="+", default=USUAL, help="tests to hold against them")
    parser.add_argument("--sample", type=int, help="at most so many changes of each module")
    parser.add_argument("--seed", type=int, default=12, help="of the sample")
    parser.add_argument("--seconds", type=float, default=20.0, help="of tests a change, at most")
    parser.add_argument("--again", type=Path, help="only the survivors this file was printed with")
    asked = parser.parse_args()
    chance = random.Random(asked.seed)
    again = None if asked.again is None else _survivors(asked.again.read_text("utf-8"))
    tried: list[Mutant] = []
    for name in asked.modules:
        at = PACKAGE / name
        for path in sorted(at.rglob("*.py")) if at.is_dir() else [at.with_suffix(".py")]:
            made = [m for m in mutants_of(path) if again is None or _known_by(m) in again]
            if asked.sample and len(made) > asked.sample:
                made = sorted(chance.sample(made, asked.sample), key=made.index)
            tried += made
    trial = Trial(tried, asked.seconds)
    os.chdir(ROOT)
    pytest.main(["-q", "-p", "no:cacheprovider", *asked.tests], plugins=[trial])
    print("\n" + "\n".join(figures(trial.outcomes)))


def told(mutant: Mutant, outcome: str) -> str:
    """Return a change no test noticed: where it stands, the line before and after."""
    path, function, before, after = _known_by(mutant)
    word = "" if outcome == "survived" else f" ({outcome})"
    return f"{path}, line {mutant.lines.start}, {function}{word}\n    {before}\n  > {after}"


def _known_by(mutant: Mutant) -> tuple[str, str, str, str]:
    """Return what tells a change apart when lines have moved."""
    path = mutant.path.relative_to(PACKAGE).as_posix()
    return path, mutant.function, mutant.before, mutant.after


def _survivors(printed: str) -> set[tuple[str, str, str, str]]:
    """Read back what `told` wrote."""
    found = re.findall(r"(?m)^(\S+), line \d+, (\S+).*\n    (.*)\n  > (.*)$", printed)
    return {(path, function, before, after) for path, function, before, after in found}


def figures(outcomes: list[tuple[Mutant, str]]) -> Iterator[str]:
    """Yield a line for each module: how many were tried, and what became of them."""
    modules: dict[Path, Counter[str]] = defaultdict(Counter)
    for mutant, outcome in outcomes:
        modules[mutant.path.relative_to(PACKAGE)][outcome] += 1
    for path, counts in modules.items():
        words = ", ".join(f"{number} {outcome}" for outcome, number in counts.most_common())
        yield f"{path.as_posix()}: {counts.total()} tried; {words}"


if __name__ == "__main__":
    main()
