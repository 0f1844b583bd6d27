"""Reads ngspice's binary raw file: a text header per plot, then its numbers row by row.

The file is bounded by the run's file-size limit; a header that promises more numbers than the
file holds is refused, so a half-written file never passes for a result.
"""

import re
from collections.abc import Iterator, Mapping

import msgspec
import numpy as np
from numpy.typing import NDArray

from railguard.errors import EngineError

Vector = NDArray[np.float64] | NDArray[np.complex128]

_BINARY = b"Binary:\n"
_COUNTS = re.compile(r"^No\. (Variables|Points):\s*(\d+)", re.MULTILINE)
_NAME = re.compile(r"^Plotname:(.*)$", re.MULTILINE)
_VARIABLE = re.compile(r"^\s+\d+\t(\S+)\t", re.MULTILINE)


class Plot(msgspec.Struct, frozen=True):
    """One analysis' numbers.

    name     as ngspice calls it: `Operating Point`, `Transient Analysis`, ...
    vectors  by name: `v(n1)`, `i(v1)`, `time`, `frequency`; shape (points,), volts, amperes,
             seconds, hertz; complex in a small-signal analysis
    points   length of every vector
    """

    name: str
    vectors: Mapping[str, Vector]
    points: int

    def real(self, name: str) -> NDArray[np.float64]:
        """Return a vector's real part, shape (points,)."""
        if name not in self.vectors:
            raise EngineError(f"ngspice's result holds no vector {name}.")
        return np.real(self.vectors[name]).astype(np.float64, copy=False)

    def voltage(self, node: str) -> NDArray[np.float64]:
        """Return a node's voltage to ground, shape (points,); zero for ground itself."""
        return np.zeros(self.points) if node == "0" else self.real(f"v({node})")

    def current(self, source: str) -> NDArray[np.float64]:
        """Return the current into the first node of a voltage source, shape (points,), A."""
        return self.real(f"i({source.lower()})")


def _plots(data: bytes) -> Iterator[Plot]:
    start = 0
    while (mark := data.find(_BINARY, start)) >= 0:
        header = data[start:mark].decode("latin-1")
        counts = {word: int(number) for word, number in _COUNTS.findall(header)}
        names = _VARIABLE.findall(header)
        title = _NAME.search(header)
        if title is None or counts.get("Variables") != len(names) or "Points" not in counts:
            raise EngineError("ngspice wrote a result file that cannot be read.")
        points = counts["Points"]
        # A complex number is a pair of reals.
        wide = 2 if re.search(r"^Flags:.*complex", header, re.MULTILINE) else 1
        body = mark + len(_BINARY)
        start = body + points * len(names) * wide * 8
        if start > len(data):
            raise EngineError("ngspice wrote only part of its result file.")
        reals = np.frombuffer(data[body:start], np.dtype("<f8")).astype(np.float64)
        rows: Vector = reals if wide == 1 else reals.view(np.complex128)
        table = rows.reshape(points, len(names))
        columns = {name.lower(): table[:, index] for index, name in enumerate(names)}
        yield Plot(title[1].strip(), columns, points)


def read_raw(data: bytes) -> tuple[Plot, ...]:
    """Read every plot of a raw file.

    Raises:
        EngineError: the text is no raw file, or is cut short.
    """
    return tuple(_plots(data))
