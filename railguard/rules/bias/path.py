"""Whether every input has a DC path."""

from collections.abc import Iterator

from railguard.analysis.stage import Design, Pin, Stage
from railguard.notices import NotChecked
from railguard.rules.compose import open_point, stage_finding
from railguard.rules.finding import Finding
from railguard.rules.protocol import Limits, Outcome, Rule
from railguard.rules.remedies import fit
from railguard.rules.wording import listed
from railguard.units import si

PATH_SOURCE = (
    "Analog Devices, C. Kitchin, Analog Dialogue 41-08; AD620 data sheet, input bias current return"
)
USUAL_RETURN = 100e3
"""Ohm; the return the AD620 data sheet draws."""


# --- bias-no-dc-path


def judge_path(stage: Stage, limits: Limits, design: Design) -> Iterator[Outcome]:
    """Judge whether both inputs reach a defined potential at DC."""
    if stage.use == "unused":
        return
    pins = (("non-inverting", stage.inputs.plus), ("inverting", stage.inputs.minus))
    open_pins = [(word, pin) for word, pin in pins if pin.state == "open"]
    if "bias" in stage.unknown:
        yield from open_point("bias-no-dc-path", stage, ("bias",))
    elif open_pins:
        word, pin = open_pins[0]
        hangs = f" ({listed(pin.path)})" if pin.path else ""
        yield NotChecked(
            stage.designator,
            "bias-no-dc-path",
            f"its {word} input (net {pin.net}) leaves what the netlist shows{hangs}",
            f'state what arrives there: [signals] "{pin.net}" = {{ low = ..., high = ... }}',
        )
    for word, pin in pins:
        if _unbiased(word, pin, stage):
            yield _no_path(word, pin, stage)


def _unbiased(word: str, pin: Pin, stage: Stage) -> bool:
    if pin.state == "floating":
        return True
    # A follower's inverting input is held by its own output, as it should be. The non-inverting
    # one is not: its level then holds itself up by its own bootstraps.
    own = pin.state == "held-by-own-output"
    return own and word == "non-inverting" and stage.use == "linear"


def _no_path(word: str, pin: Pin, stage: Stage) -> Finding:
    where = f"{stage.schematic}'s {word} input (net {pin.net})"
    if pin.state == "held-by-own-output":
        what = f"{where} has a DC path only to the stage's own output, which follows it."
    elif pin.path:
        what = f"{where} has no DC path: only {listed(pin.path)} {_stands(pin)} on it."
    else:
        what = f"{where} is connected to nothing."
    current = _bias_current(stage)
    return stage_finding(
        "bias-no-dc-path",
        stage,
        "critical",
        f"{what} Its bias current{current} charges the net until the output stands at a rail.",
        nets=(pin.net,),
        remedy=_path_remedy(word, pin, stage),
        source=PATH_SOURCE,
    )


def _stands(pin: Pin) -> str:
    return "stands" if len(pin.path) == 1 else "stand"


def _bias_current(stage: Stage) -> str:
    figure = None if stage.family is None else stage.family.bias_current.best
    return f" of {si(figure, 'A')}" if figure else ""


def _path_remedy(word: str, pin: Pin, stage: Stage) -> str:
    if word == "inverting" and stage.feedback.resistance is None:
        return (
            f"Give net {pin.net} a resistor to the output of {stage.schematic}, beside the "
            "capacitor in the feedback."
        )
    supply = stage.supply
    to = "0"
    if supply.positive is not None and supply.negative == 0:
        to = f"a reference at {si(supply.positive / 2, 'V')}"
    return f"Fit {si(fit(USUAL_RETURN), 'Ω')} from {pin.net} to {to}."


NO_DC_PATH = Rule(
    name="bias-no-dc-path",
    family="bias",
    looks_at="stage",
    judges="Whether both inputs reach a net of defined potential through elements that conduct at "
    "DC.",
    reason="Every input carries a bias current, if only picoamperes. Without a path it charges "
    "what capacitance there is until the stage saturates: dv/dt = Ib/C.",
    source=PATH_SOURCE,
    silent="An input whose net leaves the netlist (connector, port, opaque element) is listed as "
    "not checked. Unused channels have a rule of their own.",
    judge=judge_path,
)

RULES = (NO_DC_PATH,)
