"""Stages, rails and designs made by hand, for the tests of rules.

The usual stage is U1: a dual JFET op-amp on ±12 V, non-inverting with a gain of 11, asked for
±5 V out of ±0.45 V, everything inside its limits. A test changes what it is about.
"""

from typing import Any

import msgspec

from railguard.analysis.bound import Bound, Range
from railguard.analysis.loop import Feedback, Loop
from railguard.analysis.rail import Capacitor, Package, Rail, Supply
from railguard.analysis.stage import Current, Design, Inputs, Output, Pin, Stage
from railguard.circuit.model import Circuit, Element
from railguard.circuit.sources import Source
from railguard.devices.model import Device, Figure, SheetSource
from railguard.location import Location
from railguard.notices import NotChecked, Problem
from railguard.rules.finding import Finding
from railguard.rules.protocol import Rule
from railguard.rules.registry import limits_of
from railguard.settings.model import Settings

SHEET = SheetSource(title="Dual JFET op-amp", document="XYZ1", publisher="A maker")


def figure(typical: float | None = None, guaranteed: float | None = None, **more: Any) -> Figure:
    """Make a figure that was seen in the data sheet."""
    basis = {"typical_basis": "catalogue", "guaranteed_basis": "catalogue"}
    return Figure(typical, guaranteed, **{**basis, **more})


FAMILY = Device(
    family="TL07x",
    technology="jfet",
    supply_low=7.0,
    supply_high=36.0,
    supply_absolute=42.0,
    supply_basis={"low": "catalogue", "high": "catalogue", "absolute": "catalogue"},
    gain_bandwidth=figure(3e6),
    slew_rate=figure(13e6, 8e6),
    bias_current=figure(65e-12, 200e-12),
    offset_current=figure(5e-12, 100e-12),
    offset_voltage=figure(3e-3, 6e-3),
    voltage_noise=figure(18e-9),
    input_capacitance=figure(10e-12),
    output_resistance=figure(100.0),
    load_capacitance=figure(100e-12),
    stable_gain=figure(1.0, 1.0),
    open_loop_gain=figure(2e5, 25e3),
    phase_reversal=True,
    source=SHEET,
)


def bound(upper: bool = True, **fields: Any) -> Bound:
    """Make one side of a quantity; limits come from a data sheet that was seen."""
    return Bound(upper=upper, **fields)


def high(demand: float | None = 5.0, **fields: Any) -> Bound:
    """Make the upper side of the usual output: 10.5 V typical, 9.5 V guaranteed, 12 V the rail."""
    return bound(True, **{**_side(demand, 10.5, 9.5, 12.0), **fields})


def low(demand: float | None = -5.0, **fields: Any) -> Bound:
    """Make the lower side of the usual output."""
    return bound(False, **{**_side(demand, -10.5, -9.5, -12.0), **fields})


def _side(demand: float | None, typical: float, guaranteed: float, rail: float) -> dict[str, Any]:
    return {
        "demand": demand,
        "level": None if demand is None else 0.0,
        "span": None if demand is None else 2 * abs(demand),
        "typical": typical,
        "guaranteed": guaranteed,
        "absolute": rail,
    }


def amps(demand: float | None = 1e-3, **fields: Any) -> Bound:
    """Make one side of the usual output current: 10 mA typical, 5 mA known to be given."""
    usual = {"demand": demand, "typical": 10e-3, "guaranteed": 5e-3}
    return bound(True, **{**usual, **fields})


SUPPLY = Supply(
    positive=12.0,
    negative=-12.0,
    positive_net="+12V",
    negative_net="-12V",
    positive_worst=Range(11.4, 12.6),
    negative_worst=Range(-12.6, -11.4),
)


def single(volts: float = 5.0) -> Supply:
    """Make a single supply from ground."""
    return Supply(
        positive=volts,
        negative=0.0,
        positive_net=f"+{volts:g}V",
        negative_net="0",
        positive_worst=Range(0.95 * volts, 1.05 * volts),
        negative_worst=Range(0.0, 0.0),
    )


def stage(designator: str = "XU1", **fields: Any) -> Stage:
    """Make a stage; what is not given is the usual, sound one."""
    usual: dict[str, Any] = {
        "designator": designator,
        "schematic": designator.split(".")[-1].removeprefix("X"),
        "device": "TL072",
        "family": FAMILY,
        "package": designator.split(".")[-1].removeprefix("X"),
        "topology": "non-inverting",
        "supply": SUPPLY,
        "output": Output(
            net="out", level=0.0, demand=Range(-5.0, 5.0), high=high(), low=low(), slew=1e5
        ),
        "current": Current(source=amps(), sink=amps(), load=5000.0, into="RL"),
        "inputs": inputs(),
        "loop": Loop(
            dc="negative",
            beta_dc=1 / 11,
            noise_gain=11.0,
            noise_gain_dc=11.0,
            noise_gain_crossover=11.0,
            crossover=3e6 / 11,
            phase_margin=80.0,
            band=1e3,
            loop_gain=273.0,
        ),
        "feedback": Feedback(
            elements=("R2",), resistance=10e3, seen=909.0, load=11e3, capacitance=0.0,
            current=0.45e-3,
        ),
        "gain": (("in", 11.0),),
        "location": Location("station.cir", 12),
    }  # fmt: skip
    return Stage(**{**usual, **fields})


def pin(net: str, **fields: Any) -> Pin:
    """Make an input pin that is held at 0 V."""
    return Pin(net=net, **{"level": 0.0, "resistance": 900.0, **fields})


def inputs(**fields: Any) -> Inputs:
    """Make the usual inputs: -9 V to +12 V typical, ±9 V guaranteed, at ±0.45 V."""
    usual: dict[str, Any] = {
        "plus": pin("in"),
        "minus": pin("n"),
        "demand": Range(-0.45, 0.45),
        "high": bound(
            True, demand=0.45, level=0.0, span=0.9, typical=12.0, guaranteed=9.0, absolute=12.0
        ),
        "low": bound(
            False, demand=-0.45, level=0.0, span=0.9, typical=-10.0, guaranteed=-9.0,
            absolute=-12.0,
        ),
    }  # fmt: skip
    return Inputs(**{**usual, **fields})


def unknown_device(designator: str = "XU1", **fields: Any) -> Stage:
    """Make a stage of a device nobody knows, judged by common practice."""
    basis = {"typical_basis": "practice", "guaranteed_basis": "practice"}
    usual: dict[str, Any] = {
        "device": "MYAMP",
        "family": None,
        "output": Output(
            net="out", level=0.0, demand=Range(-5.0, 5.0), high=high(**basis), low=low(**basis)
        ),
        "current": Current(source=amps(**basis), sink=amps(**basis), load=5000.0),
    }
    return stage(designator, **{**usual, **fields})


def capacitor(designator: str = "C1", farads: float | None = 100e-9, **fields: Any) -> Capacitor:
    """Make a capacitor to ground."""
    return Capacitor(designator=designator, farads=farads, **{"to": "0", **fields})


def rail(net: str = "+12V", level: float | None = 12.0, **fields: Any) -> Rail:
    """Make a rail that feeds U1 and is decoupled by C1."""
    usual: dict[str, Any] = {
        "net": net,
        "level": level,
        "sign": "negative" if (level or 0.0) < 0 else "positive",
        "feed": "stated" if level is not None else "outside",
        "origin": "VP",
        "decoupling": (capacitor(),),
        "packages": ("U1",),
        "location": Location("station.cir", 3),
    }
    return Rail(**{**usual, **fields})


def package(designator: str = "U1", **fields: Any) -> Package:
    """Make a package of one channel."""
    usual: dict[str, Any] = {
        "device": "TL072",
        "family": "TL07x",
        "channels": (f"X{designator}",),
        "positive": ("+12V",),
        "negative": ("-12V",),
        "location": Location("station.cir", 12),
    }
    return Package(designator=designator, **{**usual, **fields})


def resistor(designator: str, ohms: float, *nets: str) -> Element:
    """Make a resistor of the flat circuit."""
    return Element(kind="R", designator=designator, nets=nets, value=ohms)


def voltage_source(designator: str, volts: float, *nets: str) -> Element:
    """Make a voltage source of the flat circuit."""
    return Element(kind="V", designator=designator, nets=nets, source=Source(dc=volts))


ELEMENTS = (
    voltage_source("VP", 12.0, "+12V", "0"),
    voltage_source("VN", -12.0, "-12V", "0"),
    resistor("R1", 1e3, "n", "0"),
    resistor("R2", 10e3, "out", "n"),
)


def design(*stages: Stage, **fields: Any) -> Design:
    """Make a board design of some stages with one package each, its rails sound."""
    elements = fields.pop("elements", ELEMENTS)
    problems: tuple[Problem, ...] = fields.pop("problems", ())
    usual: dict[str, Any] = {
        "circuit": Circuit(path="station.cir", elements=elements),
        "settings": Settings(),
        "kind": "board",
        "kind_reason": "",
        "rails": (
            rail("+12V", 12.0),
            rail("-12V", -12.0, decoupling=(capacitor("C2"),), origin="VN"),
        ),
        "packages": tuple(
            package(s.package, channels=(s.designator,)) for s in stages if s.package
        ),
        "stages": stages,
        "problems": problems,
    }
    return Design(**{**usual, **fields})


def outcomes(rule: Rule, subject: Any, whole: Design | None = None, **limits: float) -> list[Any]:
    """Run one rule on one subject with its default limits, some of them changed."""
    if whole is None:
        whole = design(subject) if isinstance(subject, Stage) else design(stage())
    names = {name.replace("_", "-"): value for name, value in limits.items()}
    return list(rule.judge(subject, {**limits_of(rule, whole.settings), **names}, whole))


def findings(
    rule: Rule, subject: Any, whole: Design | None = None, **limits: float
) -> list[Finding]:
    """Return only the findings of one rule on one subject."""
    return [o for o in outcomes(rule, subject, whole, **limits) if isinstance(o, Finding)]


def open_points(rule: Rule, subject: Any, whole: Design | None = None) -> list[NotChecked]:
    """Return only what one rule could not judge."""
    return [o for o in outcomes(rule, subject, whole) if isinstance(o, NotChecked)]


def changed(what: Any, /, **fields: Any) -> Any:
    """Return a frozen value with some fields changed."""
    return msgspec.structs.replace(what, **fields)
