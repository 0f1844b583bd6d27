"""Write designs for the audit's measurements: invented boards of a river-gauge station.

Each is a chain of one to seven op-amp stages (median four) of about 80 cards; a tenth has one
fault. They call their op-amps from `opamps.lib` beside them, so that ngspice can run them too.

Run: python tests/bench/audit_designs.py FOLDER [COUNT]
"""

import math
import random
import sqlite3
import sys
from collections.abc import Callable
from pathlib import Path

FOLDER_HOLDS = 500
SOUND_SHARE = 0.9
AMPLIFIERS = (1, 2, 3, 3, 4, 4, 4, 4, 5, 5, 6, 7)
E24 = (10, 11, 12, 13, 15, 16, 18, 20, 22, 24, 27, 30, 33, 36, 39, 43, 47, 51, 56, 62, 68, 75, 82)
DUALS = ("TL072", "TL082", "OPA2134", "OPA2277", "OPA2604")
FAULTS = ("gain", "no-decoupling", "swapped-inputs", "high-rails", "no-bias")

MODEL = """* A plain linear op-amp: enough for an operating point.
.subckt {name} p n vp vn o
RIN p n 10meg
E1 a 0 p n 1e5
R1 a b 1k
C1 b 0 16u
E2 c 0 b 0 1
RO c o 50
RS vp vn 10k
.ends {name}
"""


def library() -> str:
    """Return the op-amps' models."""
    return "".join(MODEL.format(name=name) for name in DUALS)


def design(number: int) -> tuple[str, str]:
    """Return the netlist of one design, and its fault or ""."""
    made = random.Random(number)
    fault = "" if made.random() < SOUND_SHARE else made.choice(FAULTS)
    return _Board(made, fault).netlist(number), fault


def preferred(ohms: float) -> str:
    """Return the nearest value of the E24 series, as a card has it."""
    decade = 10 ** math.floor(math.log10(ohms) - 1)
    return f"{min((base * decade for base in (*E24, 91, 100)), key=lambda o: abs(o - ohms)):.0f}"


class _Board:
    def __init__(self, made: random.Random, fault: str) -> None:
        self.made = made
        self.fault = fault
        self.device = made.choice(DUALS)
        self.cards: list[str] = []
        self.count = 0

    def ohms(self, low: int = 2) -> float:
        """Return a value of the E24 series between 1 and 10 times `low` kilohm."""
        return self.made.choice(E24) / 10 * low * 1e3

    def add(self, letter: str, *words: object) -> None:
        self.count += 1
        self.cards.append(" ".join((f"{letter}{self.count}", *map(str, words))))

    def netlist(self, number: int) -> str:
        amplifiers = self.made.choice(AMPLIFIERS)
        self.supply((amplifiers + 1) // 2)
        self.add("V", "sensor", 0, "SIN(0 0.2 50)")
        net = "sensor"
        broken = self.made.randrange(amplifiers) if self.fault else -1
        for k in range(amplifiers):
            self.cards.append(f"* --- stage {k + 1}")
            fault = self.fault if k == broken else ""
            net = self.made.choice(self.stages(fault))(k, net, fault)
        self.add("R", net, "logger", 100)
        self.add("C", "logger", 0, "1n")
        self.add("R", "logger", 0, "100k")
        head = [f"Gauge board {number}: sensor to logger", '.include "opamps.lib"']
        return "\n".join([*head, *self.cards, ".op", ".end", ""])

    def stages(self, fault: str) -> tuple[Callable[[int, str, str], str], ...]:
        """Return the stages that can have a fault."""
        if fault == "no-bias":
            return (self.amplifying,)
        if fault == "gain":
            return (self.inverting, self.amplifying, self.summing)
        return (self.inverting, self.amplifying, self.summing, self.low_pass)

    def supply(self, packages: int) -> None:
        for rail, source, level in (("vpp", "cp", 12), ("vnn", "cn", -12)):
            self.add("V", source, 0, level * (2.5 if self.fault == "high-rails" else 1))
            self.add("R", source, rail, 0.22)
            self.add("C", rail, 0, "47u")
            self.add("C", rail, 0, "10u")
            for _ in range(0 if self.fault == "no-decoupling" else packages):
                self.add("C", rail, 0, "100n")

    def amplifier(self, k: int, plus: str, minus: str, fault: str) -> str:
        if fault == "swapped-inputs":
            plus, minus = minus, plus
        channel = f"U{k // 2 + 1}{'AB'[k % 2]}"
        self.cards.append(f"X{channel} {plus} {minus} vpp vnn o{k} {self.device}")
        return f"o{k}"

    def entry(self, k: int, net: str) -> str:
        """Add the filter and the protection each stage begins with."""
        self.add("R", net, f"e{k}", "1k")
        self.add("C", f"e{k}", 0, "1n")
        self.add("R", f"e{k}", 0, "1meg")
        self.add("R", f"e{k}", f"f{k}", 220)
        self.add("C", f"f{k}", 0, "220p")
        return f"f{k}"

    def exit(self, k: int) -> str:
        self.add("R", f"o{k}", f"x{k}", 47)
        self.add("C", f"x{k}", 0, "470p")
        self.add("R", f"x{k}", 0, "22k")
        self.add("R", f"x{k}", f"t{k}", "1k")
        self.add("C", f"t{k}", 0, "100p")
        return f"x{k}"

    def inverting(self, k: int, net: str, fault: str) -> str:
        at, r = self.entry(k, net), self.ohms()
        self.add("R", at, f"n{k}", preferred(r))
        self.add("R", f"n{k}", f"o{k}", preferred(r * (1000 if fault == "gain" else 1.5)))
        self.add("C", f"n{k}", f"o{k}", "47p")
        self.add("R", f"p{k}", 0, preferred(r * 0.6))
        self.amplifier(k, f"p{k}", f"n{k}", fault)
        return self.exit(k)

    def amplifying(self, k: int, net: str, fault: str) -> str:
        at, r = self.entry(k, net), self.ohms()
        if fault == "no-bias":
            self.add("C", at, f"p{k}", "1u")
        else:
            self.add("R", at, f"p{k}", "2.2k")
        self.add("R", f"n{k}", 0, preferred(r))
        self.add("R", f"n{k}", f"o{k}", preferred(r * (1000 if fault == "gain" else 0.8)))
        self.add("C", f"n{k}", f"o{k}", "33p")
        self.amplifier(k, f"p{k}", f"n{k}", fault)
        return self.exit(k)

    def low_pass(self, k: int, net: str, fault: str) -> str:
        at, r = self.entry(k, net), self.ohms()
        self.add("R", at, f"m{k}", preferred(r))
        self.add("R", f"m{k}", f"p{k}", preferred(r))
        self.add("C", f"m{k}", f"n{k}", "2.2n")
        self.add("C", f"p{k}", 0, "1n")
        self.add("R", f"n{k}", f"o{k}", 0.001)
        self.amplifier(k, f"p{k}", f"n{k}", fault)
        return self.exit(k)

    def summing(self, k: int, net: str, fault: str) -> str:
        at, r = self.entry(k, net), self.ohms()
        self.add("R", "vpp", f"b{k}", "100k")
        self.add("R", f"b{k}", 0, "1k")
        self.add("C", f"b{k}", 0, "100n")
        self.add("R", f"b{k}", f"n{k}", preferred(r))
        self.add("R", at, f"n{k}", preferred(r))
        self.add("R", f"n{k}", f"o{k}", preferred(r * (1000 if fault == "gain" else 1)))
        self.add("C", f"n{k}", f"o{k}", "22p")
        self.add("R", f"p{k}", 0, preferred(r * 0.33))
        self.amplifier(k, f"p{k}", f"n{k}", fault)
        return self.exit(k)


def write(folder: Path, count: int) -> dict[str, str]:
    """Write `count` designs below a folder, 500 to each of its folders; return faults by path."""
    faults = {}
    for number in range(count):
        place = folder / f"lot{number // FOLDER_HOLDS:03}"
        if number % FOLDER_HOLDS == 0:
            place.mkdir(parents=True, exist_ok=True)
            (place / "opamps.lib").write_text(library())
        text, fault = design(number)
        (place / f"gauge{number:06}.cir").write_text(text)
        if fault:
            faults[f"{place.name}/gauge{number:06}.cir"] = fault
    return faults


if __name__ == "__main__":
    total = int(sys.argv[2]) if len(sys.argv) > 2 else 10_000
    found = write(Path(sys.argv[1]), total)
    print(f"{total} designs, {len(found)} of them with a fault, in {sys.argv[1]}")


def counted(base: Path) -> int:
    """Return the files an audit has committed so far."""
    try:
        with sqlite3.connect(f"file:{base}?mode=ro", uri=True) as reading:
            return int(reading.execute("SELECT COUNT(*) FROM file").fetchone()[0])
    except sqlite3.Error:
        return 0
