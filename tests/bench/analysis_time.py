"""Print how long the analysis takes: sheets of ten op-amps, nominal, loops and extreme values.

Run: python tests/bench/analysis_time.py
"""

import time

from railguard.analysis.design import analyse
from railguard.analysis.recognise import keeps_closed
from railguard.circuit.flatten import flatten
from railguard.circuit.model import Circuit
from railguard.deck.files import deck_from_text
from railguard.devices import catalogue
from railguard.settings.model import Settings

AMPLIFIERS = 10


def sheet(number: int) -> str:
    """Return one sheet: a chain of ten filtered inverting stages."""
    cards = ["VIN in 0 SIN(0 0.1 1k)", "VP vp 0 15", "VN vn 0 -15", "C1 vp 0 1u", "C2 vn 0 1u"]
    before = "in"
    for k in range(AMPLIFIERS):
        cards += [
            f"RA{k} {before} n{k} {10 + number % 7}k",
            f"RB{k} n{k} o{k} 10k",
            f"RC{k} o{k} 0 10k",
            f"RD{k} o{k} f{k} 1k",
            f"CD{k} f{k} 0 1n",
            f"XU{k} 0 n{k} vp vn o{k} TL072",
        ]
        before = f"f{k}"
    return "\n".join(["sheet", *cards])


def main() -> None:
    """Print seconds for 25, 50, 100 and 200 sheets."""
    devices = catalogue.load()
    sheets: list[Circuit] = [
        flatten(deck_from_text(sheet(n)), keeps_closed(devices)) for n in range(200)
    ]
    analyse(sheets[0], Settings(), devices)
    print(f"{'sheets':>8} {'op-amps':>8} {'seconds':>8} {'ms a sheet':>11}")
    for count in (25, 50, 100, 200):
        start = time.perf_counter()
        for circuit in sheets[:count]:
            analyse(circuit, Settings(), devices)
        took = time.perf_counter() - start
        print(f"{count:>8} {count * AMPLIFIERS:>8} {took:>8.2f} {took / count * 1e3:>11.1f}")


if __name__ == "__main__":
    main()
