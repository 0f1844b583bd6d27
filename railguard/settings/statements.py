"""What can be stated, whoever reads it: named fields of text or numbers to the model's values.

Both readers hand their fields over here, so that a statement means the same in railguard.toml and
in a comment card. They differ only in how a number is written.
"""

from typing import get_args

from railguard.location import Location
from railguard.settings.fields import Fields
from railguard.settings.model import Load, NetLevel, Signal, Tolerances, Waiver
from railguard.settings.names import advice
from railguard.words import Kind, Use

USES: tuple[Use, ...] = get_args(Use)
KINDS: tuple[Kind, ...] = ("board", "bench")
CLASSES = ("resistor", "capacitor", "inductor", "rail")
"""Element classes a tolerance can be stated for."""

_FEWEST_PINS = 3
"""Two inputs and an output: less is no amplifier."""
_ABSOLUTE_ZERO = -273.15  # degrees Celsius


def net_level(_: str, fields: Fields, place: Location | None) -> NetLevel:
    """Make what a net is held at."""
    fields.only("volts", "tolerance")
    volts = fields.number("volts", "V")
    if volts is None:
        raise fields.fault("says no volts.", remedy="State its level in volts.")
    return NetLevel(volts, fields.share("tolerance"), place)


def signal(name: str, fields: Fields, place: Location | None) -> Signal:
    """Make what arrives from outside the deck."""
    fields.only("low", "high", "peak", "amps", "between", "common", "ohms", "from", "to", "group")
    low, high, current = _extremes(fields)
    between = fields.words("between")
    if "between" in fields.raw and (len(between) != 2 or between[0] == between[1]):
        raise fields.fault("needs two different nets as its between.", "between")
    common = fields.number("common", "V")
    if common is not None and not between:
        raise fields.fault(
            "has a common level and no between.", "common", "Name its two nets: between."
        )
    start = fields.at_least_zero("from", "Hz")
    stop = fields.above_zero("to", "Hz")
    if start is not None and (stop is None or start > stop):
        raise fields.fault("needs a to that is not below its from.", "from")
    return Signal(
        name=name,
        between=between,
        current=current,
        low=low,
        high=high,
        common=common,
        ohms=fields.at_least_zero("ohms", "Ω") or 0.0,
        start=start or 0.0,
        stop=stop,
        group=fields.text("group"),
        location=place,
    )


def _extremes(fields: Fields) -> tuple[float, float, bool]:
    """Return the lowest and highest value of a signal, and whether they are amperes."""
    ways = [w for w in (("low", "high"), ("peak",), ("amps",)) if any(k in fields.raw for k in w)]
    if len(ways) != 1:
        what = "says its values in more than one way." if ways else "says no values."
        raise fields.fault(what, remedy="State low and high, or peak, or amps.")
    peak = fields.above_zero("peak", "V")
    if peak is not None:
        return -peak, peak, False
    amps = fields.pair("amps", "A")
    if amps is not None:
        return *amps, True
    low, high = fields.number("low", "V"), fields.number("high", "V")
    if low is None or high is None:
        missing = "low" if low is None else "high"
        raise fields.fault(f"says no {missing}.", remedy="State low and high, or peak.")
    if low > high:
        raise fields.fault("has a low above its high.", "low")
    return low, high, False


def load(net: str, fields: Fields, place: Location | None) -> Load:
    """Make what hangs on a net outside the deck."""
    fields.only("ohms", "farads", "to", "max-volts")
    made = Load(
        net=net,
        ohms=fields.above_zero("ohms", "Ω"),
        farads=fields.at_least_zero("farads", "F"),
        to=fields.text("to") or "0",
        max_volts=fields.above_zero("max-volts", "V"),
        location=place,
    )
    if made.ohms is None and made.farads is None and made.max_volts is None:
        raise fields.fault("says nothing of it.", remedy="State ohms, farads or max-volts.")
    return made


def pins(fields: Fields) -> tuple[str, ...]:
    """Make the names of a card's pins, in the order of the card.

    Which names there are is known to `devices.pinouts`, which refuses what describes no amplifier.
    """
    made = fields.words("pins")
    if "pins" in fields.raw and len(made) < _FEWEST_PINS:
        raise fields.fault(
            "needs the name of every pin as its pins.",
            "pins",
            "Write for example in+ in- v+ v- out.",
        )
    return made


def ambient(fields: Fields) -> tuple[float, float] | None:
    """Make the ambient range, degrees Celsius; one number is a range of no width."""
    raw = fields.raw.get("ambient")
    if raw is None:
        return None
    if isinstance(raw, list | tuple):
        made = fields.pair("ambient", "°C")
    else:
        value = fields.number("ambient", "°C")
        made = None if value is None else (value, value)
    if made is not None and made[0] < _ABSOLUTE_ZERO:
        raise fields.fault("has an ambient below absolute zero.", "ambient")
    return made


def waiver(fields: Fields, place: Location | None) -> Waiver:
    """Make an acceptance of a finding. Without a rule and a reason it is none."""
    fields.only("rule", "designator", "net", "file", "reason", "by", "accepted", "until")
    for key in ("rule", "reason"):
        if not fields.text(key).strip():
            raise fields.fault(f"says no {key}.", remedy="A waiver has a rule and a reason.")
    return Waiver(
        rule=fields.text("rule"),
        reason=fields.text("reason").strip(),
        designator=fields.text("designator"),
        net=fields.text("net"),
        file=fields.text("file"),
        by=fields.text("by"),
        accepted=fields.number("accepted", None),
        until=fields.day("until"),
        location=place,
    )


def tolerances(fields: Fields) -> Tolerances:
    """Make tolerances: of the element classes, and of patterns of designators in their order."""
    classes: dict[str, float] = {}
    rules: list[tuple[str, float]] = []
    for name in fields.raw:
        pattern = any(c.isdigit() or c in "*?." for c in name)
        if name not in CLASSES and not pattern:
            remedy = f"{advice(name, CLASSES)} A pattern of designators has a digit or a * in it."
            raise fields.fault(f'knows no class "{name}".', name, remedy)
        share = fields.share(name)
        if share is None:
            continue
        if pattern:
            rules.append((name, share))
        else:
            classes[name] = share
    return Tolerances(**classes, rules=tuple(rules))
