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


def one_deck(sheets: int) -> str:
    """Return one deck that calls a sheet many times, all on the same rails and signal."""
    inside = [line for line in sheet(0).splitlines()[1:] if line[:2] not in ("VI", "VP", "VN")]
    calls = [f"XS{n} in vp vn PAGE" for n in range(sheets)]
    head = ["one deck", "VIN in 0 SIN(0 0.1 1k)", "VP vp 0 15", "VN vn 0 -15"]
    return "\n".join([*head, ".subckt PAGE in vp vn", *inside, ".ends", *calls, ".end"])


def circuit(text: str, devices: catalogue.Catalogue) -> Circuit:
    """Read and flatten a deck."""
    return flatten(deck_from_text(text), keeps_closed(devices))


def took(circuits: list[Circuit], devices: catalogue.Catalogue) -> tuple[float, float]:
    """Return the seconds that pass, and those the processor works, for some circuits."""
    start, worked = time.perf_counter(), time.process_time()
    for one in circuits:
        analyse(one, Settings(), devices)
    return time.perf_counter() - start, time.process_time() - worked


def main() -> None:
    """Print seconds for 25, 50, 100 and 200 sheets, as decks of their own and as one deck."""
    devices = catalogue.load()
    sheets = [circuit(sheet(n), devices) for n in range(200)]
    analyse(sheets[0], Settings(), devices)
    for name, load in (
        ("decks of their own", lambda count: sheets[:count]),
        ("one deck", lambda count: [circuit(one_deck(count), devices)]),
    ):
        print(name)
        print(f"{'sheets':>8} {'op-amps':>8} {'seconds':>8} {'processor':>10} {'ms a sheet':>11}")
        for count in (25, 50, 100, 200):
            passed, worked = took(load(count), devices)
            each = worked / count * 1e3
            numbers = f"{count:>8} {count * AMPLIFIERS:>8}"
            print(f"{numbers} {passed:>8.2f} {worked:>10.2f} {each:>11.1f}")


if __name__ == "__main__":
    main()
