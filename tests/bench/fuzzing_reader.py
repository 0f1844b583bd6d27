"""Coverage-guided fuzzing of the reader: bytes to a flat circuit.

    pip install atheris
    python -m tests.bench.fuzzing_reader CORPUS_FOLDER -max_total_time=600

The folder gathers inputs that reached something new; it may begin as a copy of fixtures/. Anything
but a railguard error is a crash, and the input is left in the working folder.
"""

import sys
from pathlib import Path

import atheris

with atheris.instrument_imports(include=["railguard"]):
    from railguard.analysis.recognise import keeps_closed
    from railguard.circuit.flatten import flatten
    from railguard.deck.bounds import Bounds
    from railguard.deck.files import read_deck
    from railguard.devices import catalogue
    from railguard.errors import RailguardError

BOUNDS = Bounds(elements=2000)
CLOSED = keeps_closed(catalogue.load(()))


class Lone:
    """A tree of one file, which includes itself at most."""

    def __init__(self, data: bytes) -> None:
        self.data = data

    def read(self, path: Path, most: int) -> bytes:
        """Return the one file's bytes."""
        return self.data[: most + 1]

    def is_file(self, path: Path) -> bool:
        """Only the deck is one."""
        return path.name == "gauge.cir"

    def is_dir(self, path: Path) -> bool:
        """There are no folders."""
        return False

    def names(self, folder: Path) -> tuple[str, ...]:
        """Name the one file."""
        return ("gauge.cir",)

    def real(self, path: Path) -> Path:
        """There are no links."""
        return path


def one(data: bytes) -> None:
    """Read and flatten one deck."""
    try:
        flatten(read_deck(Path("/gauge/gauge.cir"), BOUNDS, files=Lone(data)), CLOSED)
    except RailguardError:
        return


def main() -> None:
    """Run until told to stop."""
    atheris.Setup(sys.argv, one)
    atheris.Fuzz()


if __name__ == "__main__":
    main()
