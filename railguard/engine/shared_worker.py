"""Runs one deck in ngspice's shared library, in a process that does nothing else and then ends.

Started by `railguard.engine.shared` in an empty folder: reads `deck.cir`, writes one `N.raw` for
each plot, prints what ngspice prints. The library keeps a circuit it stumbled over for ever and
crashes in its own ways, so a process lives for one deck. PySpice's own reading of what ngspice
prints takes every note for an error; here only a line that begins with "error" is one.
"""

import logging
import sys
import warnings
from pathlib import Path
from typing import Protocol, cast


class Library(Protocol):
    """What is used of PySpice's shared engine."""

    plot_names: list[str]

    def exec_command(self, command: str) -> object:
        """Run one of ngspice's commands."""
        ...

    def load_circuit(self, circuit: str) -> None:
        """Take a deck."""
        ...

    def run(self) -> None:
        """Run the deck's analyses."""
        ...


def loaded() -> Library:
    """Return the library with a classifier of its own for what it prints."""
    logging.getLogger("PySpice").setLevel(logging.CRITICAL + 1)
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        from PySpice.Spice.NgSpice import Shared

    class Plain(Shared.NgSpiceShared):  # type: ignore[misc] # PySpice is untyped
        """PySpice's shared engine, with errors told from notes."""

        @staticmethod
        def _send_char(message: object, _number: int, handle: object) -> int:
            own = Shared.ffi.from_handle(handle)
            text = Shared.ffi.string(message).decode("utf-8", "replace")
            stream, _, content = text.partition(" ")
            sys.stdout.write(f"{content}\n")
            sys.stdout.flush()  # what was printed before a crash tells its cause
            wrong = content.lower().startswith("error")
            own._error_in_stderr = own._error_in_stderr or (wrong and stream == "stderr")
            own._error_in_stdout = own._error_in_stdout or (wrong and stream != "stderr")
            return 0

    return cast(Library, Plain.new_instance())


def main(start: str) -> None:
    """Run `deck.cir` after a start command; what fails ends the process with a trace."""
    library = loaded()
    library.exec_command(start)
    library.load_circuit(Path("deck.cir").read_text(encoding="ascii"))
    library.run()
    plots = [name for name in library.plot_names if name != "const"]
    for number, name in enumerate(reversed(plots)):
        library.exec_command(f"setplot {name}")
        library.exec_command(f"write {number}.raw")


if __name__ == "__main__":
    main(sys.argv[1])
