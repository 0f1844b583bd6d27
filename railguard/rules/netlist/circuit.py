"""What is odd about the circuit that was read: loose nets, shorted elements, odd values."""

from collections import Counter
from collections.abc import Iterator

from railguard.analysis.stage import Design
from railguard.circuit.model import GROUND, Element
from railguard.notices import NotChecked
from railguard.rules.compose import OWN_TABLE, finding
from railguard.rules.protocol import Limit, Limits, Outcome, Rule
from railguard.rules.remedies import fit
from railguard.rules.wording import NO_SOURCE, listed
from railguard.units import series_of, si
from railguard.words import Severity

TWO_ENDED = frozenset({"R", "C", "L", "D", "V", "I"})
E24 = frozenset(
    (10, 11, 12, 13, 15, 16, 18, 20, 22, 24, 27, 30, 33, 36, 39, 43, 47, 51, 56, 62, 68, 75, 82, 91)
)
E96 = frozenset(round(100 * 10 ** (i / 96)) for i in range(96))
OP_AMP_PINS = (5, 8, 14)
"""Nets of a card that may be a single, a dual or a quad op-amp with its supply pins."""
UNITS = {"R": "Ω", "C": "F", "L": "H"}

# --- netlist-dangling


def judge_dangling(subject: Design, limits: Limits, design: Design) -> Iterator[Outcome]:
    """Judge whether a net has but one connection."""
    pins = Counter(net for e in subject.circuit.elements for net in e.nets)
    leave = {GROUND, *_pin_nets(subject)}
    stated = {*subject.settings.nets, *(load.net for load in subject.settings.loads)}
    for signal in subject.settings.signals:
        stated.update(signal.between or (signal.name,))
    loose: dict[str, Element] = {}
    for element in subject.circuit.elements:
        if element.kind not in TWO_ENDED or not element.fitted:
            continue
        for net in element.nets:
            if pins[net] == 1 and net not in leave and net not in stated:
                loose[net] = element
    for net, element in loose.items():
        yield finding(
            "netlist-dangling",
            "remark",
            f"Net {net} has one connection only: {element.designator}.",
            designators=(element.designator,),
            nets=(net,),
            demand=1.0,
            limit=2.0,
            margin=-1.0,
            remedy=f"Correct the net's name, or state what comes or hangs there: [signals] or "
            f'[loads] "{net}".',
            source=NO_SOURCE,
            location=element.location,
        )


def _pin_nets(design: Design) -> Iterator[str]:
    """Yield the nets at op-amp pins, which other rules speak of."""
    for stage in design.stages:
        yield from (stage.output.net, stage.inputs.plus.net, stage.inputs.minus.net)
        yield from (stage.supply.positive_net, stage.supply.negative_net)


DANGLING = Rule(
    name="netlist-dangling",
    family="netlist",
    looks_at="design",
    judges="Whether a net at a two-ended element has no other connection.",
    reason="A net that leads nowhere is often a misspelt name: two nets where one was meant.",
    source=NO_SOURCE,
    silent="Nets of op-amp pins, which have rules of their own; nets the user "
    "states a signal, load or level for.",
    judge=judge_dangling,
)


# --- netlist-shorted


def judge_shorted(subject: Design, limits: Limits, design: Design) -> Iterator[Outcome]:
    """Judge whether an element has both ends on one net."""
    for element in subject.circuit.elements:
        ends = element.nets[:2]
        if element.kind not in TWO_ENDED or not element.fitted or len(ends) < 2:
            continue
        if ends[0] != ends[1]:
            continue
        level = element.source.level if element.source is not None else 0.0
        source = element.kind == "V" and level != 0
        severity: Severity = "major" if source else "minor"
        what = (
            f"shorted: its {si(level, 'V')} stand against nothing" if source else "without effect"
        )
        yield finding(
            "netlist-shorted",
            severity,
            f"Both ends of {element.designator} are on net {ends[0]}, so it is {what}.",
            designators=(element.designator,),
            nets=(ends[0],),
            remedy=f"Correct one of the nets of {element.designator}, or take it out.",
            source=NO_SOURCE,
            location=element.location,
        )


SHORTED = Rule(
    name="netlist-shorted",
    family="netlist",
    looks_at="design",
    judges="Whether a two-ended element has both ends on one net.",
    reason="An element across nothing does nothing, and was meant for somewhere else.",
    source=NO_SOURCE,
    silent="Elements that are not fitted.",
    judge=judge_shorted,
)


# --- netlist-device-unknown


def judge_device(subject: Design, limits: Limits, design: Design) -> Iterator[Outcome]:
    """Judge whether the catalogue knows every op-amp."""
    names = dict.fromkeys(
        s.device for s in subject.stages if s.family is None and not s.generic and s.device
    )
    for name in names:
        stages = [s for s in subject.stages if s.device == name]
        yield finding(
            "netlist-device-unknown",
            "remark",
            f"The device catalogue does not know {name} ({listed(s.schematic for s in stages)}): "
            "it is judged by common practice only, rails one to two volts beyond the signal and a "
            "few milliamperes.",
            designators=tuple(s.designator for s in stages),
            basis=("netlist", "practice"),
            remedy=f"{OWN_TABLE[:1].upper()}{OWN_TABLE[1:]}.",
            source=NO_SOURCE,
            location=stages[0].location,
        )
    for device in subject.unrecognised:
        if device.sort != "unknown" or device.pins not in OP_AMP_PINS or not device.name:
            continue
        near = f"; the nearest name is {device.nearest}" if device.nearest else ""
        yield NotChecked(
            subject=device.designator,
            rule="netlist-device-unknown",
            why=f"nobody knows {device.name}, so it was not taken for an op-amp{near}",
            add=f'if it is one: [[devices]] with names = {{ 1 = ["{device.name}"] }}',
        )


DEVICE_UNKNOWN = Rule(
    name="netlist-device-unknown",
    family="netlist",
    looks_at="design",
    judges="Whether the catalogue knows every op-amp of the netlist.",
    reason="Without a data sheet nothing is known of swing, current or speed.",
    source=NO_SOURCE,
    silent="Amplifiers without a type, such as OPAMP.",
    judge=judge_device,
)


# --- netlist-value-series


def judge_series(subject: Design, limits: Limits, design: Design) -> Iterator[Outcome]:
    """Judge whether a board's values are of a preferred series."""
    if subject.kind != "board":
        return
    odd = [
        e for e in subject.circuit.elements if e.designator not in subject.bridges and _is_odd(e)
    ]
    if not odd:
        return
    named = odd[: int(limits["named"])]
    texts = [_with_neighbour(e) for e in named]
    more = f" and {len(odd) - len(named)} more" if len(odd) > len(named) else ""
    yield finding(
        "netlist-value-series",
        "remark",
        f"Values of no IEC 60063 series: {', '.join(texts)}{more}.",
        designators=tuple(e.designator for e in odd),
        demand=float(len(odd)),
        limit=0.0,
        margin=-float(len(odd)),
        remedy="Fit the nearest preferred value, or two elements that make it up.",
        source="IEC 60063",
        location=odd[0].location,
    )


def _with_neighbour(element: Element) -> str:
    unit, value = UNITS[element.kind], element.value or 1.0
    return f"{element.designator} {si(value, unit, 4)} (near {si(fit(value), unit)})"


def _is_odd(element: Element) -> bool:
    if element.kind not in UNITS or not element.fitted or not element.value:
        return False
    return element.value > 0 and not _common(element.value) and series_of(element.value) is None


def _common(value: float) -> bool:
    """Tell at once whether a value is of E24 or E96, which spares loading the other series."""
    digits = round(float(f"{value:.5e}".split("e")[0]) * 100, 3)
    return digits in E96 or digits / 10 in E24


VALUE_SERIES = Rule(
    name="netlist-value-series",
    family="netlist",
    looks_at="design",
    judges="Whether the values of a board are of a preferred series, E3 to E192.",
    reason="What is not in a series is not in stock.",
    source="IEC 60063",
    silent="Benches, whose values are often worked out; the arms of a sensor bridge.",
    limits=(
        Limit(
            name="named",
            default=5.0,
            unit="",
            meaning="elements named in the sentence",
            source=NO_SOURCE,
        ),
    ),
    judge=judge_series,
)

RULES = (DANGLING, SHORTED, DEVICE_UNKNOWN, VALUE_SERIES)
