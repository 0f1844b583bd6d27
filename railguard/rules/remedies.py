"""What to change, with a value that can be bought: the arithmetic of remedies."""

import math

from railguard.analysis.stage import Design, Stage
from railguard.circuit.model import Element
from railguard.units import preferred, si

RAIL_STEP = 0.5
"""V; a rail proposed is a multiple of this: nobody fits a 13.87 V regulator."""
SERIES = "E24"
"""IEC 60063: values every stockist has, in 1 % as well as in 5 %."""


def fit(value: float, direction: str = "nearest") -> float:
    """Return a resistance that can be bought, at, above or below a value worked out."""
    match direction:
        case "up":
            return preferred(value, SERIES, "up")
        case "down":
            return preferred(value, SERIES, "down")
        case _:
            return preferred(value, SERIES)


def element_named(designator: str, design: Design) -> Element | None:
    """Return an element of the flat circuit by its designator."""
    return next((e for e in design.circuit.elements if e.designator == designator), None)


def smaller_gain(stage: Stage, factor: float, design: Design) -> str:
    """Say how to lower a stage's gain by a factor below one: `R2 = 82 kΩ instead of 100 kΩ`.

    Names a resistor only where the feedback is a single one, so that the sum is sure.
    """
    if not 0 < factor < 1:
        return ""
    gains = [gain for _, gain in stage.gain]
    if len(gains) != 1 or not gains[0]:
        return f"lower the gain to {si(100 * factor, '%')} of what it is"
    target = gains[0] * factor
    words = f"lower the gain from {si(gains[0], '')} to at most {si(target, '')}"
    resistor = _single_feedback_resistor(stage, design)
    if resistor is None or resistor.value is None:
        return words
    wanted = _feedback_for(stage.topology, resistor.value, gains[0], target)
    if wanted is None or wanted <= 0:
        return words
    new = si(fit(wanted, "down"), "Ω")
    return f"{words} ({resistor.designator} = {new} instead of {si(resistor.value, 'Ω')})"


def _single_feedback_resistor(stage: Stage, design: Design) -> Element | None:
    if len(stage.feedback.elements) != 1:
        return None
    element = element_named(stage.feedback.elements[0], design)
    return element if element is not None and element.kind == "R" and element.value else None


def _feedback_for(topology: str, ohms: float, gain: float, target: float) -> float | None:
    """Return the feedback resistance that turns `gain` into `target`, ohm."""
    if topology == "inverting" and gain < 0:
        return ohms * target / gain
    if topology == "non-inverting" and gain > 1 and target > 1:
        return ohms * (target - 1) / (gain - 1)
    return None


def other_rail(stage: Stage, upper: bool, missing: float) -> str:
    """Say which rail would make room, where the device may be run on it; "" where none would."""
    supply = stage.supply
    rail = supply.positive if upper else supply.negative
    total = supply.total
    if rail is None or total is None or missing <= 0:
        return ""
    steps = (rail + missing) / RAIL_STEP if upper else (rail - missing) / RAIL_STEP
    wanted = RAIL_STEP * (math.ceil(steps - 1e-9) if upper else math.floor(steps + 1e-9))
    added = abs(wanted - rail)
    highest = stage.family.supply_high if stage.family is not None else None
    if highest is None or total + added > highest:
        return ""
    if upper:
        return f"raise the positive rail to at least {si(wanted, 'V')}"
    return f"take the negative rail down to at least {si(wanted, 'V')}"


def sentence(*choices: str) -> str:
    """Join remedies into one sentence: `Lower the gain, or raise the rail.`."""
    kept = [choice for choice in choices if choice]
    if not kept:
        return ""
    text = ", or ".join(kept)
    return f"{text[:1].upper()}{text[1:]}."


MOST_NAMED = 4
"""Resistors named in one remedy; more make a sentence nobody reads."""


def network_resistors(stage: Stage, design: Design) -> tuple[Element, ...]:
    """Return the resistors that set the noise gain: of the way back, and at the inverting input."""
    net = stage.inputs.minus.net
    return tuple(
        e
        for e in design.circuit.elements
        if e.kind == "R"
        and e.value
        and e.fitted
        and (e.designator in stage.feedback.elements or net in e.nets[:2])
    )


def decades(ratio: float) -> int:
    """Return the decades by which resistors change so that a ratio of at least `ratio` is won.

    A whole decade keeps the gain exactly and every value in its series.
    """
    return max(1, math.ceil(math.log10(max(ratio, 1.0)) - 1e-9))


def scaled_network(stage: Stage, design: Design, power: int) -> str:
    """Say what the feedback network becomes at the same gain: `R1 = 1 kΩ and R2 = 10 kΩ`.

    power  of ten by which all resistors change: -1 divides them by ten
    """
    resistors = network_resistors(stage, design)
    verb = f"{'multiply' if power > 0 else 'divide'} by {10 ** abs(power)}"
    if not resistors or len(resistors) > MOST_NAMED:
        return f"{verb} all resistors of the feedback network"
    values = [f"{e.designator} = {si((e.value or 0.0) * 10.0**power, 'Ω')}" for e in resistors]
    names = " and ".join([", ".join(values[:-1]), values[-1]] if len(values) > 1 else values)
    return f"{verb} the feedback network, which keeps the gain: {names}"
