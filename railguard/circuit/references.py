"""Cards that name other cards: what steers a source, what is coupled."""

from collections.abc import Iterable

from railguard.circuit.model import Element
from railguard.notices import Problem


def unsteered(elements: Iterable[Element]) -> list[Problem]:
    """Say which cards name a source or an inductor that is not in the circuit."""
    naming = [e for e in elements if e.kind in ("F", "H", "W", "K")]
    if not naming:
        return []
    known = {(e.kind, e.designator.casefold()) for e in elements if e.kind in ("V", "L")}
    problems = []
    for element in naming:
        kind, what = ("L", "inductor") if element.kind == "K" else ("V", "voltage source")
        for name in _named(element):
            if (kind, name.casefold()) not in known:
                problems.append(
                    Problem(
                        rule="netlist-card",
                        message=f"{element.designator} names the {what} {name}, which is not in "
                        "the circuit.",
                        remedy="Correct the name.",
                        location=element.location,
                        designators=(element.designator,),
                    )
                )
    return problems


def _named(element: Element) -> tuple[str, ...]:
    if element.kind == "K":
        prefix = element.designator.rpartition(".")[0]
        inside = f"{prefix}." if prefix else ""
        return tuple(inside + w for w in element.text.split() if w[:1] in "lL")
    control = element.control
    return (control.element,) if control is not None and control.element else ()
