"""What was measured on a macromodel, as a table of the catalogue's layout."""

from collections.abc import Iterable, Mapping

import msgspec

from railguard.engine.measure import Figures, Outcome
from railguard.engine.specimen import Specimen


def entry(made: Specimen, file: str, supply: float, outcomes: Iterable[Outcome]) -> Figures:
    """Return what was measured as a table of the catalogue's layout."""
    figures: Figures = {}
    remarks: list[str] = []
    for outcome in outcomes:
        figures.update(outcome.figures)
        remarks += outcome.remarks
    return {
        "family": made.name,
        "names": {"1": [made.name]},
        "conditions": f"±{supply / 2:g} V, 27 °C, in a macromodel",
        "sheet_supply": supply,
        "notes": " ".join(remarks),
        "source": {"title": f"measured on the macromodel {made.name} of {file} with ngspice"},
        **figures,
    }


def as_toml(table: Mapping[str, object]) -> str:
    """Write a table as `[[devices]]` of a user's file."""
    lines = ["[[devices]]"]
    lines += [f"{key} = {_toml(value)}" for key, value in table.items() if value not in ("", [])]
    return "\n".join(lines) + "\n"


def _toml(value: object) -> str:
    match value:
        case str():
            return msgspec.json.encode(value).decode()
        case dict():
            return "{ " + ", ".join(f"{key} = {_toml(item)}" for key, item in value.items()) + " }"
        case list():
            return "[" + ", ".join(_toml(item) for item in value) + "]"
        case float() | int():
            return repr(value)
        case _:
            raise TypeError(f"{value!r} has no place in a catalogue table")
