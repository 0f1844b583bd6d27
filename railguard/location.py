"""Where a text came from: carried from the first character read to the last line printed."""

import msgspec


class Location(msgspec.Struct, frozen=True, gc=False, order=True):
    """A place in a netlist or settings file.

    file    path as the user wrote it, or relative to the deck that included it
    line    1-based physical line
    column  1-based character on that line
    length  characters covered; 0 where only a point is known

    A place that is not known is `None`, never a made-up line.
    """

    file: str
    line: int
    column: int = 1
    length: int = 0

    def __str__(self) -> str:
        """Return the place as a reviewer reads it: `station.cir, line 12`."""
        return f"{self.file}, line {self.line}"
