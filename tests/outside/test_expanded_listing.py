"""Flattened decks hold what ngspice's own expanded listing holds: element by element, net by net.

Source: `listing expand` of ngspice 39, run on decks of our own. Amplifiers without a model get one,
the same for both sides, so that there is something to expand.
"""

import re
import shutil
import subprocess
from pathlib import Path

import pytest

from railguard.circuit.flatten import flatten
from railguard.deck.files import deck_from_text
from railguard.deck.numbers import read_number

FIXTURES = Path(__file__).resolve().parents[2] / "fixtures"
DECKS = [
    path
    for folder in ("sound", "station")
    for path in sorted((FIXTURES / folder).glob("*.cir"))
    if "\nJ1 " not in path.read_text("utf-8")  # a connector is no card of ngspice's
]
NEEDS_NGSPICE = pytest.mark.skipif(shutil.which("ngspice") is None, reason="ngspice is not here")

HIERARCHY = """hierarchy, parameters, conditions, multipliers
.param k=2
.global sense
V1 a 0 5
V2 sense 0 1
X1 a b s r=1k
X2 b gnd s
.subckt s p q r={k*1k}
R1 p m {r}
.if (k==2)
C1 m q 1n
.else
L1 m q 1n
.endif
X3 m q t
.ends
.subckt t a b
R1 a b 1k m=2
R4 sense b 2k
D1 a b dm
Q1 a b 0 qm
E1 c 0 a b 10
R2 c 0 1k
B1 d 0 V=V(c)*2
R3 d
+ 0 ; continued
* across a comment
+ 1k
.ends
.model dm d
.model qm npn
E2 z 0 poly(2) a 0 b 0 0 1 1
R9 z 0 1k
E3 y 0 value={V(a)*2}
R8 y 0 1k
F1 y 0 V1 2
G1 y 0 a b 1m
I1 0 y 1m
.end
"""


def modelled(text):
    """Return a deck's text with a model for every call that has none."""
    calls = {(e.model, len(e.nets)) for e in flat(text).elements if e.kind == "X"}
    made = []
    for name, count in sorted(calls):
        ports = [f"p{k}" for k in range(count)]
        made += [
            f".subckt {name} {' '.join(ports)}",
            f"Rin {ports[0]} {ports[1]} 1meg",
            f"Egain inner 0 {ports[0]} {ports[1]} 100k",
            f"Rout inner {ports[-1]} 50",
            ".ends",
        ]
    return re.sub(r"(?im)^\.end\s*$", "\n".join([*made, ".end"]), text)


def flat(text):
    """Flatten a text, every subcircuit expanded."""
    return flatten(deck_from_text(text))


def listing(text, folder):
    """Return (designator, nets, value's text) of every element of ngspice's expanded listing."""
    control = ".control\nlisting expand\nquit\n.endc\n.end"
    (folder / "deck.cir").write_text(re.sub(r"(?im)^\.end\s*$", control, text))
    done = subprocess.run(
        ["ngspice", "-n", "-b", "deck.cir"], cwd=folder, capture_output=True, text=True, timeout=60
    )
    found = []
    for line in done.stdout.splitlines():
        card = re.match(r"^ +(?!1 :)\d+ : ([a-z]\S*) (.*)$", line)
        if card is None:
            continue
        name, words = card[1], card[2].split()
        if any(word.endswith("_int1") and f"b{word[:-5]}" == name for word in words):
            continue  # the helper of a VALUE source
        if name.startswith("a$poly$"):
            name = name.removeprefix("a$poly$")
            words = card[2].partition("%vd (")[2].split() or card[2].partition("%v [")[2].split()
        name = name.partition(".")[2] if re.match(r"^[a-z]\.", name) else name
        nets = 3 if name.rpartition(".")[2].startswith("q") else 2
        found.append((name, tuple(words[:nets]), words[2] if len(words) > 2 else ""))
    return found


def compared(text, folder):
    """Hold one deck to its listing; return how many elements were compared."""
    ours = flat(text).elements
    theirs = listing(text, folder)
    nets = {e.designator.lower(): tuple(n.lower() for n in e.nets) for e in ours if e.kind != "K"}
    count = {name: len(words) for name, words, _ in theirs}
    assert {n: w[: count.get(n)] for n, w in nets.items()} == {n: w for n, w, _ in theirs}
    values = {e.designator.lower(): e for e in ours if e.kind in "RCL"}
    for name, _, text_of_value in theirs:
        number = read_number(text_of_value)
        if name in values and number is not None and "m" not in values[name].parameters:
            assert values[name].value == pytest.approx(number.value, rel=1e-9)
    return len(theirs)


@NEEDS_NGSPICE
@pytest.mark.parametrize("path", DECKS, ids=lambda p: f"{p.parent.name}-{p.stem}")
def test_deck_of_ours(path, tmp_path):
    """Every sound and every station deck, its amplifiers expanded."""
    assert compared(modelled(path.read_text("utf-8")), tmp_path) > 5


@NEEDS_NGSPICE
def test_hierarchy(tmp_path):
    """Nested calls, parameters, conditions, globals, polynomials, continuations."""
    assert compared(HIERARCHY, tmp_path) == 29


def test_there_are_thirty_decks():
    """What the tests above are worth."""
    assert len(DECKS) >= 30
