"""What tolerances do to every quantity: extreme values through adjoint sensitivities.

`analysis.sensitivity` gives the derivative to every element; that to a source is the adjoint's
entry in its row. The extreme value is the sum of the magnitudes times the tolerances; a margin's
extreme value uses the difference of the sensitivities of its two sides, so what moves both
together cancels.

Source  ECSS-Q-HB-30-01A, Worst case analysis (method: extreme value analysis, RSS)
"""

import fnmatch
import re
from collections.abc import Iterable, Mapping
from functools import cached_property

import msgspec
import numpy as np
import numpy.typing as npt

from railguard.analysis.equations import Real, Stamp
from railguard.analysis.network import Network
from railguard.analysis.ranges import Answers
from railguard.analysis.sensitivity import Elements
from railguard.circuit.model import Element
from railguard.devices.names import schematic_name
from railguard.settings.model import Tolerances

DEFAULT_RESISTOR = 0.01
"""Common practice, no source."""
DEFAULT_CAPACITOR = 0.10
"""Common practice, no source."""
DEFAULT_INDUCTOR = 0.20
"""Common practice, no source."""

Flags = npt.NDArray[np.bool_]


class Parameter(msgspec.Struct, frozen=True):
    """One thing that may be off.

    stamp   an element; None for an entry of b, which then stands in `row` with `value` per unit
    spread  (row, sign) entries of b where it stands in several
    """

    name: str
    stamp: Stamp | None = None
    row: int = -1
    value: float = 0.0
    spread: tuple[tuple[int, float], ...] = ()

    @property
    def entries(self) -> tuple[tuple[int, float], ...]:
        """Return where it stands in b, with its value per unit."""
        return self.spread or ((self.row, self.value),)


class Spread(msgspec.Struct, frozen=True, kw_only=True, dict=True):
    """Everything that may be off, and by how much.

    parameters  shape (parameters,)
    delta   its share (elements, rails) or its size in SI units (offset, bias)
    stated  True where the user or the card states it
    error   True for an amplifier's own offset and bias current
    high, low  derivative of each quantity's upper and lower end, shape (quantities, parameters)
    """

    parameters: tuple[Parameter, ...]
    delta: Real
    stated: Flags
    error: Flags
    high: Real
    low: Real

    @cached_property
    def elements(self) -> Elements:
        """The elements among the parameters: the first of them."""
        return Elements.of(p.stamp for p in self.parameters if p.stamp is not None)

    @property
    def tolerances(self) -> Real:
        """Return the share each element may be off, shape (elements,)."""
        return self.delta[: len(self.elements)]

    @cached_property
    def shares(self) -> dict[str, float]:
        """The share each element may be off, by designator."""
        return dict(zip(self.elements.names, self.tolerances.tolist(), strict=True))

    @cached_property
    def any_stated(self) -> bool:
        """True where the user or a card states any of them."""
        return bool(self.stated.any())

    @property
    def names(self) -> tuple[str, ...]:
        """Designators of the parameters, as a report names them."""
        return tuple(p.name for p in self.parameters)

    def reach(self, side: Real) -> Real:
        """Return the extreme-value excursion of each quantity, shape (quantities,)."""
        return np.asarray(np.abs(side) @ self.delta)

    def root_sum_square(self, side: Real) -> Real:
        """Return the excursion where all add as roots of squares, shape (quantities,)."""
        return np.asarray(np.linalg.norm(side * self.delta, axis=-1))


_TEXT_TOLERANCE = re.compile(r"(?i)(?:^|[\s,;(=]|tol(?:erance)?\s*=\s*)±?(\d+(?:\.\d+)?)\s*%")
_LARGEST_SHARE = 0.5


def tolerance_of(element: Element, stated: Tolerances) -> tuple[float, bool]:
    """Return an element's tolerance as a share, and whether somebody stated it."""
    names = (element.designator, schematic_name(element.designator))
    for pattern, share in stated.rules:
        if any(fnmatch.fnmatchcase(name.upper(), pattern.upper()) for name in names):
            return share, True
    card = element.parameters.get("tol")
    if card is not None and 0 <= card < 1:
        return card, True
    written = _TEXT_TOLERANCE.search(element.text)
    if written is not None and float(written[1]) / 100 <= _LARGEST_SHARE:
        return float(written[1]) / 100, True
    by_class: dict[str, tuple[float | None, float]] = {
        "R": (stated.resistor, DEFAULT_RESISTOR),
        "C": (stated.capacitor, DEFAULT_CAPACITOR),
        "L": (stated.inductor, DEFAULT_INDUCTOR),
    }
    told, default = by_class.get(element.kind, (None, 0.0))
    return (told, True) if told is not None else (default, False)


class Nuisance(msgspec.Struct, frozen=True):
    """Offset voltage and bias current of one amplifier, worst: V, A.

    difference  between the bias currents of its inputs, where the sheet lists it: then the two go
                together but for it, and an equal resistance at the other input takes most away;
                None: each stands for itself
    """

    offset: float
    bias: float
    difference: float | None = None


def spread(
    answers: Answers,
    elements: Iterable[Element],
    exempt: frozenset[str],
    stated: Tolerances,
    rails: Mapping[str, tuple[float, float, bool]],
    nuisances: Mapping[str, Nuisance],
) -> Spread:
    """Work out the sensitivity of every quantity to everything that may be off.

    exempt     designators without a tolerance: bridges, signals' own resistances
    rails      injection name -> (volts, share, stated) of every rail's source
    nuisances  by amplifier
    """
    network = answers.network
    by_name = {e.designator: e for e in elements}
    stamps, shares, flags = [], [], []
    for stamp in network.stamps:
        element = by_name.get(stamp.designator)
        if element is None or stamp.designator in exempt:
            continue
        share, is_stated = tolerance_of(element, stated)
        if share > 0:
            stamps.append(stamp)
            shares.append(share)
            flags.append(is_stated)
    rail_names = [n for n in rails if n in network.injections and rails[n][1] > 0]
    amplifiers = [a for a in answers.amplifiers if a.designator in nuisances]
    high, low = _elements(answers, stamps)
    extra, entries, delta, is_stated_extra = _levels(
        answers, rails, rail_names, {a.designator: nuisances[a.designator] for a in amplifiers}
    )
    return Spread(
        parameters=(*(Parameter(s.designator, s) for s in stamps), *entries),
        delta=np.array([*shares, *delta]),
        stated=np.array([*flags, *is_stated_extra], dtype=bool),
        error=np.array([False] * len(stamps) + [e.name not in rails for e in entries], dtype=bool),
        high=np.hstack([high, extra]),
        low=np.hstack([low, extra]),
    )


def _elements(answers: Answers, stamps: list[Stamp]) -> tuple[Real, Real]:
    count = len(answers.rows)
    if not stamps:
        return np.zeros((count, 0)), np.zeros((count, 0))
    elements = Elements.of(stamps)
    adjoint = answers.dc.adjoint(answers.rows.tolist())
    dc = elements.pulls(adjoint, answers.x.astype(complex), 0j).real
    peaks = np.zeros_like(dc)
    for tone in answers.tones:
        for worst in tone.worst:
            rows = answers.rows[worst.picks]
            values = np.where(rows >= 0, worst.x[rows], 0)
            alive = np.abs(values) > 0
            if not alive.any():
                continue
            picks, rows, values = worst.picks[alive], rows[alive], values[alive]
            adjoint = worst.factor.adjoint(rows.tolist())
            change = elements.pulls(adjoint, worst.x, 2j * np.pi * worst.hertz)
            direction = np.conj(values) / np.abs(values)
            peaks[picks] += (direction[:, None] * change).real
    return dc + peaks, dc - peaks


def _currents(
    rows: tuple[int, int], nuisance: Nuisance
) -> list[tuple[tuple[tuple[int, float], ...], float]]:
    """Return the currents into an amplifier's inputs as entries of b, with the size of each, A.

    rows  of both inputs; -1 for ground or a net without DC path
    """
    alone = [((row, 1.0),) for row in rows if row >= 0]
    if nuisance.difference is None or len(alone) < 2:
        spare = 0.0 if nuisance.difference is None else nuisance.difference / 2
        return [(entry, nuisance.bias + spare) for entry in alone]
    together = ((rows[0], 1.0), (rows[1], 1.0))
    apart = ((rows[0], 0.5), (rows[1], -0.5))
    return [(together, nuisance.bias), (apart, nuisance.difference)]


def _levels(
    answers: Answers,
    rails: Mapping[str, tuple[float, float, bool]],
    rail_names: list[str],
    nuisances: Mapping[str, Nuisance],
) -> tuple[Real, list[Parameter], list[float], list[bool]]:
    """Derivatives to rails, offsets and bias currents: they move the DC level only."""
    network: Network = answers.network
    adjoint = answers.dc.adjoint(answers.rows.tolist()).real
    columns: list[Real] = []
    entries: list[Parameter] = []
    delta: list[float] = []
    stated: list[bool] = []
    for name in rail_names:
        volts, share, is_stated = rails[name]
        row = network.injections[name].row
        columns.append(adjoint[:, row] * volts)
        entries.append(Parameter(name, None, row, volts))
        delta.append(share)
        stated.append(is_stated)
    for amplifier in answers.amplifiers:
        nuisance = nuisances.get(amplifier.designator)
        own = network.outputs.get(amplifier.designator)
        if nuisance is None or own is None or amplifier.designator in network.forced:
            continue
        columns.append(adjoint[:, own])
        entries.append(Parameter(f"offset of {amplifier.designator}", None, own, 1.0))
        delta.append(nuisance.offset)
        # A bias current into a net without DC path has no level: that is a finding of its own.
        at = [
            network.row(net) if net not in network.floating else -1
            for net in (amplifier.plus, amplifier.minus)
        ]
        for rows, amps in _currents((at[0], at[1]), nuisance):
            columns.append(np.sum([sign * adjoint[:, r] for r, sign in rows], axis=0))
            entries.append(Parameter(f"bias current of {amplifier.designator}", spread=rows))
            delta.append(amps)
    stated += [False] * (len(entries) - len(stated))
    stacked = np.stack(columns, axis=1) if columns else np.zeros((len(answers.rows), 0))
    return stacked, entries, delta, stated
