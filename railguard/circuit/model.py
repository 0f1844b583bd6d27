"""The flat circuit: what every later room works on.

`Circuit` is built once by `circuit.flatten` and never changed. A net is named by its spelling in
the netlist; two spellings that SPICE takes as one net are one string here, so nets compare with
`==`. Ground is always "0". Values are SI numbers; a value that could not be worked out is None.
"""

from collections.abc import Mapping

import msgspec

from railguard.circuit.sources import Source
from railguard.location import Location
from railguard.notices import Problem, Remark

GROUND = "0"


class Control(msgspec.Struct, frozen=True, gc=False):
    """What steers a controlled source.

    gain     V/V, A/V, A/A or V/A; None where the relation is not a plain factor
    nets     pairs of nets whose voltage steers it (E, G); empty for F, H
    element  designator of the source whose current steers it (F, H), or ""
    text     the relation as written, where it is not a plain factor
    """

    gain: float | None
    nets: tuple[str, ...] = ()
    element: str = ""
    text: str = ""


class Element(msgspec.Struct, frozen=True, kw_only=True, gc=False):
    """One element after flattening.

    kind         the letter that says how it behaves: R C L V I E G F H D Q J M K S W T B X,
                 or one of the words of `circuit.board`: "open", "link", "ic", "battery", "opaque"
    designator   hierarchical, as written, joined with dots: `XCH1.XU2`
    nets         in the order of the card (for X: in the order of the ports)
    value        ohm, farad, henry; DC volt or ampere is in `source`
    model        model, subcircuit or value text as written: `TL072CP`, `1N4148`
    control      for E G F H
    source       for V I
    parameters   instance parameters that are numbers, lower-cased names, SI
    text         the rest of the card as written: package codes, ratings, tolerances
    ports        for a closed X: port names of its header, where the deck has one
    pin_notes    for X: pin names written in a comment beside the header or the card
    fitted       False for DNP and the like
    """

    kind: str
    designator: str
    nets: tuple[str, ...]
    value: float | None = None
    model: str = ""
    control: Control | None = None
    source: Source | None = None
    parameters: Mapping[str, float] = {}
    text: str = ""
    ports: tuple[str, ...] = ()
    pin_notes: tuple[str, ...] = ()
    fitted: bool = True
    location: Location | None = None


class Instance(msgspec.Struct, frozen=True, kw_only=True, gc=False):
    """A subcircuit call that has not been expanded.

    multiplier  how many of it stand in parallel
    notes       pin names written behind the card
    """

    designator: str
    nets: tuple[str, ...]
    model: str
    parameters: Mapping[str, float]
    multiplier: float = 1.0
    notes: tuple[str, ...] = ()
    location: Location | None = None


class Model(msgspec.Struct, frozen=True):
    """A `.model` card: its name and type word as written, its numeric parameters lower-cased."""

    name: str
    type: str
    parameters: Mapping[str, float]
    location: Location | None = None


class Subcircuit(msgspec.Struct, frozen=True):
    """A subcircuit definition kept for measuring: its header and its body's cards as written.

    notes  comment lines that stand directly before the header or after it, without their `*`
    """

    name: str
    ports: tuple[str, ...]
    body: tuple[str, ...]
    notes: tuple[str, ...] = ()
    location: Location | None = None


class Analysis(msgspec.Struct, frozen=True):
    """An analysis card: its word (`tran`, `ac`, `dc`, `op`, ...) and its fields as written."""

    word: str
    fields: tuple[str, ...]
    location: Location | None = None


class Directive(msgspec.Struct, frozen=True):
    """A comment card `* railguard: ...`: the words after the colon."""

    text: str
    location: Location


class Circuit(msgspec.Struct, frozen=True, kw_only=True):
    """A whole flat deck.

    path         of the main deck, as the user gave it
    elements     in the order they are met when flattening
    models       by lower-cased name (hierarchical for local ones: `x1.dm`)
    subcircuits  by lower-cased name
    globals      nets declared global
    top_nets     nets of the top level that could leave the sheet (hierarchical labels, ports)
    sha256       of the main deck and everything it includes, hex
    files        every file read: the main deck first
    texts        their texts as decoded, by the same names; a report shows them
    """

    path: str
    title: str = ""
    elements: tuple[Element, ...] = ()
    models: Mapping[str, Model] = {}
    subcircuits: Mapping[str, Subcircuit] = {}
    analyses: tuple[Analysis, ...] = ()
    directives: tuple[Directive, ...] = ()
    globals: tuple[str, ...] = ()
    problems: tuple[Problem, ...] = ()
    remarks: tuple[Remark, ...] = ()
    sha256: str = ""
    files: tuple[str, ...] = ()
    texts: Mapping[str, str] = {}
    readable: bool = True
