"""The sections of railguard.toml, one function each, on tables that are already read."""

import math
from collections.abc import Callable, Iterator, Mapping
from contextlib import contextmanager
from typing import TypeVar, get_args

import msgspec

from railguard.errors import SettingsError
from railguard.location import Location
from railguard.settings import statements
from railguard.settings.fields import Fields, StatementError
from railguard.settings.model import Named, Settings, Tolerances, Waiver
from railguard.settings.names import advice
from railguard.settings.places import Path
from railguard.units import QuantityError, parse_quantity, split_quantity
from railguard.words import SEVERITIES, Family, Severity, Use

SECTIONS = (
    "review",
    "severity",
    "conditions",
    "nets",
    "signals",
    "loads",
    "stages",
    "tolerances",
    "limits",
    "waivers",
    "devices",
    "bounds",
)
BOUNDS = (
    "file-bytes",
    "total-bytes",
    "includes",
    "line-characters",
    "word-characters",
    "include-depth",
    "subcircuit-depth",
    "elements",
    "expression",
)
"""Bounds on reading that a file may set; `deck.bounds.Bounds` says what each is."""
FAMILIES: tuple[Family, ...] = get_args(Family)

Made = TypeVar("Made")
Build = Callable[[str, Fields, Location | None], Made]
"""build(name, fields, place): one entry of a section whose keys are names."""


def read_sections(
    tables: Mapping[str, object], where: Mapping[Path, Location], name: str
) -> Settings:
    """Turn the tables of a railguard.toml into Settings.

    where  the place of each key
    Raises SettingsError with the line at fault.
    """
    reader = _Reader(tables, where)
    with reader.faults_at(()):
        reader.fields((), "the settings file").only(*SECTIONS)
    review = _review(reader, Settings(file=name, ambient=_conditions(reader)))
    limits, off, named = _limits(reader)
    severities = _severities(reader)
    waivers = _waivers(reader)
    uses, pins, stages_at = _stages(reader)
    named += [Named(rule, location=reader.place("severity", rule)) for rule in severities]
    named += [Named(waiver.rule, location=waiver.location) for waiver in waivers]
    return msgspec.structs.replace(
        review,
        nets=_each(reader, "nets", "the net", statements.net_level),
        signals=tuple(_each(reader, "signals", "the signal", statements.signal).values()),
        loads=tuple(_each(reader, "loads", "the load on", statements.load).values()),
        uses=uses,
        pins=pins,
        stages_at=stages_at,
        tolerances=_tolerances(reader),
        limits=limits,
        severities=severities,
        rules_off=tuple(dict.fromkeys((*review.rules_off, *off))),
        waivers=waivers,
        devices=_devices(reader),
        bounds=_bounds(reader),
        named=(*review.named, *named),
    )


def _number(raw: object, unit: str | None) -> tuple[float, str]:
    """Read a number as it stands in TOML: plain SI, or a text with its unit."""
    if isinstance(raw, bool) or not isinstance(raw, int | float | str):
        raise QuantityError("it is no number.")
    if isinstance(raw, str):
        return split_quantity(raw) if unit is None else (parse_quantity(raw, unit), unit)
    try:
        value = float(raw)
    except OverflowError:
        value = math.inf
    if not math.isfinite(value):
        raise QuantityError(f'"{value}" is no number that can be used here.')
    return value, ""


class _Reader:
    """The tables of the file, and where each key of them stands."""

    def __init__(self, tables: Mapping[str, object], where: Mapping[Path, Location]) -> None:
        self.tables = tables
        self.where = where

    def place(self, *path: str | int) -> Location | None:
        """Return where a key stands, or the nearest table round it."""
        steps = (path[:length] for length in range(len(path), 0, -1))
        return next((self.where[step] for step in steps if step in self.where), None)

    @contextmanager
    def faults_at(self, path: Path) -> Iterator[None]:
        """Give a misstatement its place."""
        try:
            yield
        except StatementError as fault:
            keys = (*path, fault.key) if fault.key else path
            raise SettingsError(fault.what, self.place(*keys), fault.remedy) from fault

    def table(self, path: Path, subject: str) -> Mapping[str, object]:
        """Return a table, an empty one where it is not there."""
        found: object = self.tables
        for step in path:
            if isinstance(found, Mapping):
                found = found.get(str(step), {})
            elif isinstance(found, list) and isinstance(step, int):
                found = found[step]
        if not isinstance(found, Mapping):
            what = f"{subject[0].upper()}{subject[1:]} needs named fields."
            remedy = "Write them in braces: { name = value }."
            raise SettingsError(what, self.place(*path), remedy)
        return found

    def fields(self, path: Path, subject: str) -> Fields:
        """Return the fields of a table."""
        return Fields(subject, self.table(path, subject), _number)

    def count(self, section: str) -> int:
        """Return the number of entries of an array of tables."""
        found = self.tables.get(section, [])
        if not isinstance(found, list):
            what = f"The section {section} is a list of tables."
            raise SettingsError(what, self.place(section), f"Write [[{section}]] before each.")
        return len(found)


def _bounds(reader: _Reader) -> Mapping[str, int]:
    """Return the bounds that are set, by the names of `deck.bounds.Bounds`."""
    with reader.faults_at(("bounds",)):
        fields = reader.fields(("bounds",), "the section [bounds]")
        fields.only(*BOUNDS)
        stated = {key: fields.above_zero(key, "") for key in BOUNDS}
    return {k.replace("-", "_"): int(v) for k, v in stated.items() if v is not None}


def _each(reader: _Reader, section: str, noun: str, build: Build[Made]) -> dict[str, Made]:
    """Build every entry of a section whose keys are names."""
    made: dict[str, Made] = {}
    seen: dict[str, str] = {}
    for name in reader.table((section,), f"the section [{section}]"):
        place = reader.place(section, name)
        if name.casefold() in seen:
            what = f'"{name}" and "{seen[name.casefold()]}" are one name to SPICE, stated twice.'
            raise SettingsError(what, place, "Keep one of them.")
        seen[name.casefold()] = name
        fields = reader.fields((section, name), f'{noun} "{name}"')
        with reader.faults_at((section, name)):
            made[name] = build(name, fields, place)
    return made


def _review(reader: _Reader, settings: Settings) -> Settings:
    fields = reader.fields(("review",), "the section [review]")
    with reader.faults_at(("review",)):
        fields.only("hold-at", "kind", "off", "require")
        off = fields.words("off")
        named = tuple(
            Named(rule, location=reader.place("review", "off", i)) for i, rule in enumerate(off)
        )
        return msgspec.structs.replace(
            settings,
            hold_at=fields.word("hold-at", SEVERITIES) or settings.hold_at,
            kind=fields.word("kind", statements.KINDS) or "",
            require=_families(fields),
            rules_off=off,
            named=named,
        )


def _families(fields: Fields) -> tuple[str, ...]:
    required = fields.words("require")
    for family in required:
        if family not in FAMILIES:
            raise fields.fault(
                f'requires "{family}", which is no family of rules.',
                "require",
                advice(family, FAMILIES),
            )
    return required


def _conditions(reader: _Reader) -> tuple[float, float] | None:
    fields = reader.fields(("conditions",), "the section [conditions]")
    with reader.faults_at(("conditions",)):
        fields.only("ambient")
        return statements.ambient(fields)


def _severities(reader: _Reader) -> dict[str, Severity]:
    fields = reader.fields(("severity",), "the section [severity]")
    made: dict[str, Severity] = {}
    with reader.faults_at(("severity",)):
        for rule in fields.raw:
            if fields.raw[rule] == "off":
                raise fields.fault(
                    f"cannot switch {rule} off.", rule, f'Write off = ["{rule}"] under [review].'
                )
            severity = fields.word(rule, SEVERITIES)
            if severity is not None:
                made[rule] = severity
    return made


def _stages(
    reader: _Reader,
) -> tuple[dict[str, Use], dict[str, tuple[str, ...]], dict[str, Location]]:
    """Return uses and pins by the stage's name, and where each name stands."""

    def build(_: str, fields: Fields, __: Location | None) -> tuple[Use | None, tuple[str, ...]]:
        fields.only("use", "pins")
        made = fields.word("use", statements.USES), statements.pins(fields)
        if not any(made):
            raise fields.fault("says nothing.", remedy="State its use or its pins.")
        return made

    made = _each(reader, "stages", "the stage", build)
    uses = {name: use for name, (use, _) in made.items() if use is not None}
    places = {name: reader.place("stages", name) for name in made}
    return (
        uses,
        {name: pins for name, (_, pins) in made.items() if pins},
        {name: place for name, place in places.items() if place is not None},
    )


def _tolerances(reader: _Reader) -> Tolerances:
    fields = reader.fields(("tolerances",), "the section [tolerances]")
    with reader.faults_at(("tolerances",)):
        return statements.tolerances(fields)


def _limits(
    reader: _Reader,
) -> tuple[dict[str, dict[str, float]], tuple[str, ...], list[Named]]:
    """Return limits by rule, the rules switched off there, and every name with its place."""
    made: dict[str, dict[str, float]] = {}
    off: list[str] = []
    named: list[Named] = []
    for rule in reader.table(("limits",), "the section [limits]"):
        path = ("limits", rule)
        named.append(Named(rule, location=reader.place(*path)))
        fields = reader.fields(path, f"the section [limits.{rule}]")
        for limit, raw in fields.raw.items():
            with reader.faults_at(path):
                if limit == "off":
                    if not isinstance(raw, bool):
                        raise fields.fault("needs true or false as its off.", "off")
                    off += [rule] if raw else []
                    continue
                value, unit = fields.with_unit(limit)
            made.setdefault(rule, {})[limit] = value
            named.append(Named(rule, limit, unit, reader.place(*path, limit)))
    return made, tuple(off), named


def _waivers(reader: _Reader) -> tuple[Waiver, ...]:
    made: list[Waiver] = []
    for index in range(reader.count("waivers")):
        fields = reader.fields(("waivers", index), "the waiver")
        with reader.faults_at(("waivers", index)):
            made.append(statements.waiver(fields, reader.place("waivers", index)))
    return tuple(made)


def _devices(reader: _Reader) -> tuple[tuple[Mapping[str, object], Location], ...]:
    """Return the user's device tables as they stand; the catalogue judges what is in them."""
    made: list[tuple[Mapping[str, object], Location]] = []
    for index in range(reader.count("devices")):
        path = ("devices", index)
        made.append((reader.table(path, "the device"), reader.where[path]))
    return tuple(made)
