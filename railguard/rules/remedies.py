"""What to change, with a value that can be bought: the arithmetic of remedies."""

import math

from railguard.analysis.bound import Bound
from railguard.analysis.loop import Balance
from railguard.analysis.stage import Design, Stage
from railguard.circuit.model import GROUND, Element
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


LEAST_CAPACITOR = 1e-12
"""F; the smallest anybody fits: less is what the board has by itself."""


def compensation(stage: Stage, farads: float | None) -> float | None:
    """Return the capacitance across the feedback that leaves about 65 degrees, F.

    farads  at the inverting input, without what the netlist holds there
    Source  sqrt(Cin / (2 pi RF GBW)): S. Franco, 3rd ed., ch. 8; TI SBOS981J
    """
    ohms, loop = stage.feedback.resistance, stage.loop
    gbw = None if stage.family is None else stage.family.gain_bandwidth.best
    found = [math.sqrt(farads / (2 * math.pi * ohms * gbw))] if farads and ohms and gbw else []
    bare = stage.topology == "transimpedance" and not stage.feedback.capacitance
    if bare and ohms and loop.crossover:
        # The loop closes at sqrt(GBW / (2 pi RF Cin)), the source's own capacitance included.
        found.append(1 / (2 * math.pi * ohms * loop.crossover))
    return max(found, default=None)


def element_named(designator: str, design: Design) -> Element | None:
    """Return an element of the flat circuit by its designator."""
    return next((e for e in design.circuit.elements if e.designator == designator), None)


def own_gain(stage: Stage) -> float | None:
    """Return what one stage alone makes of its signal, V/V; None where it has several inputs."""
    if stage.topology == "difference" and stage.balance is not None:
        return stage.balance.gain
    if len(stage.gain) == 1 and not stage.after:
        return stage.gain[0][1] or None
    noise_gain = stage.loop.noise_gain_dc
    if noise_gain is None:
        return None
    return {"non-inverting": noise_gain, "inverting": 1 - noise_gain}.get(stage.topology)


def kept_level(stage: Stage) -> float | None:
    """Return the output's level at which no gain matters: what the gain multiplies counts from it.

    For a non-inverting stage the potential its ground leg goes to, for an inverting one that of its
    non-inverting input; the output's own level where the gain at DC is one. Otherwise a signal that
    is level and swing at once is taken to count from ground.
    """
    level, gain, plus = stage.output.level, stage.loop.noise_gain_dc, stage.inputs.plus.level
    if stage.topology == "difference" and stage.balance is not None and not stage.ac_coupled:
        return stage.balance.reference
    if level is None or (stage.ac_coupled and (gain is None or gain < ONE)):
        return level
    if stage.topology.startswith("inverting") or stage.topology in ("summing", "transimpedance"):
        return plus if plus is not None else level
    if stage.topology == "follower":
        return 0.0
    if stage.topology.startswith("non-inverting") and gain is not None and plus is not None:
        return (level - gain * plus) / (1.0 - gain) if gain >= ONE else 0.0
    return level


ONE = 1.02
"""A noise gain below this is one: nothing multiplies the level."""


def share_that_fits(stage: Stage, bound: Bound, other: Bound) -> float:
    """Return the largest share of a stage's gain that keeps `bound`, or 0 where none does.

    Every limit known counts, at nominal and at the corners; those of the other side where less gain
    helps there as well.
    """
    kept = kept_level(stage)
    if kept is None:
        return 0.0
    nominal = [_share(bound, kept, bound.demand, limit) for limit in _limits(bound)]
    corners = [
        _share(side, kept, pair.demand, pair.limit)
        for side in (bound, other)
        for pair in (side.stated, side.default)
        if pair is not None
    ]
    corners += [_share(other, kept, other.demand, limit) for limit in _limits(other)]
    least = min([*nominal, *(share for share in corners if share > 0)], default=0.0)
    return least if LEAST_SHARE <= least < 1 else 0.0


def _limits(bound: Bound) -> tuple[float, ...]:
    found = (bound.guaranteed, bound.typical, bound.absolute)
    return tuple(limit for limit in found if limit is not None)


def _share(bound: Bound, kept: float, demand: float | None, limit: float) -> float:
    """Return the share of the way from the kept level to a demand that meets its limit."""
    if demand is None or ((demand <= limit) if bound.upper else (demand >= limit)):
        return 1.0
    return (limit - kept) / (demand - kept) if demand != kept else 0.0


LEAST_SHARE = 0.05
"""A smaller share of the gain is no remedy: the level is what stands wrong."""


def level_amplified(stage: Stage) -> bool:
    """Tell whether an AC amplifier multiplies the level it rests at past what its output reaches.

    Its ground leg then wants a capacitor: what it is to amplify comes through one.
    """
    level, gain = stage.output.level, stage.loop.noise_gain_dc
    if not stage.ac_coupled or stage.topology != "non-inverting" or level is None:
        return False
    low, high = stage.output.low, stage.output.high
    over = high.typical is not None and level > high.typical
    under = low.typical is not None and level < low.typical
    return gain is not None and gain >= ONE and (over or under)


def blocked_leg(stage: Stage, design: Design) -> str:
    """Say where a capacitor keeps the level out of the gain; "" where that is not the fault."""
    if not level_amplified(stage):
        return ""
    net, own = stage.inputs.minus.net, stage.feedback.elements
    legs = [
        e
        for e in design.circuit.elements
        if e.kind == "R" and e.fitted and net in e.nets[:2] and e.designator not in own
    ]
    if len(legs) != 1:
        return ""
    return (
        f"put a capacitor in series with {legs[0].designator}, so that the level is not amplified"
    )


def smaller_gain(stage: Stage, factor: float, design: Design) -> str:
    """Say how to lower a stage's gain by a factor below one: `R2 = 82 kΩ instead of 100 kΩ`.

    Names a resistor only where the feedback is a single one, so that the sum is sure.
    """
    if not 0 < factor < 1:
        return ""
    gain, noise_gain = own_gain(stage), stage.loop.noise_gain_dc
    unity = stage.topology == "follower" or (
        stage.topology.startswith("Sallen-Key") and noise_gain is not None and noise_gain < ONE
    )
    if unity and (gain is None or gain > 1 / ONE):
        return f"attenuate its signal to at most {si(100 * factor, '%')} of what it is"
    if gain is None:
        return f"lower the gain to {si(100 * factor, '%')} of what it is"
    target = gain * factor
    words = f"lower the gain from {si(gain, '')} to at most {si(target, '')}"
    if stage.topology == "difference" and stage.balance is not None:
        return f"{words}{_both(stage.balance, factor, design)}"
    resistor = _single_feedback_resistor(stage, design)
    if resistor is None or resistor.value is None or fed_both_ways(stage, design):
        return words
    if stage.topology == "non-inverting" and noise_gain is not None and noise_gain >= ONE:
        gain = noise_gain  # what stands before the input divides, and stays
    wanted = _feedback_for(stage.topology, resistor.value, gain, gain * factor)
    if wanted is None or wanted <= 0:
        return words
    new = si(fit(wanted, "down"), "Ω")
    return f"{words} ({resistor.designator} = {new} instead of {si(resistor.value, 'Ω')})"


def fed_both_ways(stage: Stage, design: Design) -> bool:
    """Tell whether resistors lead the output to the non-inverting input as well.

    In a current pump the ratios on both sides are one: no resistor is changed alone.
    """
    out, plus, minus = stage.output.net, stage.inputs.plus.net, stage.inputs.minus.net
    stiff = {GROUND, minus, *(rail.net for rail in design.rails)} - {out}
    around: dict[str, list[str]] = {}
    for element in design.circuit.elements:
        if element.kind == "V":
            stiff |= set(element.nets[:2]) - {out}
        elif element.kind == "R" and element.fitted:
            for one, other in (element.nets[:2], element.nets[1::-1]):
                around.setdefault(one, []).append(other)
    seen, queue = {plus}, [plus] if plus not in stiff and out != minus else []
    while queue:
        for net in around.get(queue.pop(), ()):
            if net == out:
                return True
            if net not in seen and net not in stiff:
                seen.add(net)
                queue.append(net)
    return False


def _both(balance: Balance, factor: float, design: Design) -> str:
    """Say what becomes of the two resistors that set a difference amplifier's gain together."""
    _lead, back, _first, fellow = (element_named(d, design) for d in balance.elements)
    if back is None or fellow is None or not back.value or not fellow.value:
        return ""
    values = [(e, si(fit((e.value or 0.0) * factor, "down"), "Ω")) for e in (back, fellow)]
    return f" ({' and '.join(f'{e.designator} = {new}' for e, new in values)})"


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


def other_rail(stage: Stage, upper: bool, missing: float, both: bool = False) -> str:
    """Say which rail would make room, where the device may be run on it; "" where none would.

    both  True where the other end lacks room as well: symmetrical rails then move together
    """
    supply = stage.supply
    rail = supply.positive if upper else supply.negative
    total = supply.total
    highest = stage.family.supply_high if stage.family is not None else None
    if rail is None or total is None or missing <= 0 or highest is None:
        return ""
    if not upper and rail == 0:
        return ""  # a negative rail is no small change to a single supply
    steps = (rail + missing) / RAIL_STEP if upper else (rail - missing) / RAIL_STEP
    wanted = RAIL_STEP * (math.ceil(steps - 1e-9) if upper else math.floor(steps + 1e-9))
    added = abs(wanted - rail)
    together = both and supply.positive is not None and supply.positive == -(supply.negative or 0)
    if total + added * (2 if together else 1) > highest:
        return ""
    if together:
        return f"move the rails out to at least ±{si(abs(wanted), 'V')}"
    if upper:
        return f"raise the positive rail to at least {si(wanted, 'V')}"
    return f"take the negative rail down to at least {si(wanted, 'V')}"


def reached_unloaded(stage: Stage, demand: float, upper: bool) -> bool:
    """Tell whether an output would reach a level at the lightest load the data sheet lists."""
    if stage.family is None:
        return False
    rail = stage.supply.positive if upper else stage.supply.negative
    points = stage.family.swing_high if upper else stage.family.swing_low
    drops = [p.typical if p.typical is not None else p.guaranteed for p in points]
    known = [drop for drop in drops if drop is not None]
    if rail is None or not known:
        return False
    return demand <= rail - min(known) if upper else demand >= rail + min(known)


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
    if stage.topology == "transimpedance":
        return ""  # there the resistor is the gain
    if not resistors or len(resistors) > MOST_NAMED:
        return f"{verb} all resistors of the feedback network"
    values = [f"{e.designator} = {si((e.value or 0.0) * 10.0**power, 'Ω')}" for e in resistors]
    names = " and ".join([", ".join(values[:-1]), values[-1]] if len(values) > 1 else values)
    other = "divide" if power > 0 else "multiply"
    capacitors = f", and {other} its capacitors by as much" if _has_capacitor(stage, design) else ""
    return f"{verb} the feedback network, which keeps the gain: {names}{capacitors}"


def _has_capacitor(stage: Stage, design: Design) -> bool:
    """Tell whether capacitors share in the network, so that its time constants must be kept."""
    net = stage.inputs.minus.net
    return any(e.kind == "C" and net in e.nets[:2] for e in design.circuit.elements)
