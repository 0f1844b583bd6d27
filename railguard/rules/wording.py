"""Words that the sentences of several rules share."""

from collections.abc import Iterable

from railguard.analysis.rail import Supply
from railguard.analysis.stage import Carrier, Stage
from railguard.rules.severity import Breach
from railguard.units import si
from railguard.words import Basis

NO_SOURCE = "common practice, no source"

_ORIGIN: dict[Basis, str] = {
    "netlist": "netlist",
    "catalogue": "data sheet",
    "memory": "data sheet from memory",
    "practice": "common practice",
    "assumed": "assumed",
    "user": "as stated",
}

_SPOKEN_WITH_VOWEL = "AEFHILMNORSX"
"""Letters whose names begin with a vowel: an LM358, a TL072."""


def origin(basis: Basis) -> str:
    """Say in a few words where a number came from."""
    return _ORIGIN[basis]


def of_gain(carrier: Carrier) -> str:
    """Say what a transistor carries and by which gain: `carries 2 A at a current gain of 50`."""
    verb = "carries" if len(carrier.designators) == 1 else "carry"
    carries = f"{verb} {si(carrier.carries, 'A')}"
    if carrier.gain is None:
        return carries
    stated = "as its model states" if len(carrier.designators) == 1 else "as their models state"
    note = stated if carrier.gain_stated else NO_GAIN
    return f"{carries} at a current gain of {si(carrier.gain, '')} ({note})"


NO_GAIN = "common practice; no model states it"


def either(carrier: Carrier) -> str:
    """Name a transistor, or the two of which either may conduct."""
    return " or ".join(carrier.designators)


def of_volts(carrier: Carrier) -> str:
    """Say what stands between an output and what its transistor holds."""
    ends = "from base to emitter" if carrier.gain is not None else "from gate to source"
    note = "" if carrier.volts_stated else " (common practice)"
    return f"{si(carrier.volts, 'V')} {ends} of {either(carrier)}{note}"


def listed(words: Iterable[str]) -> str:
    """Join words as in a sentence: `U1, U2 and U3`."""
    items = list(words)
    if len(items) < 2:
        return "".join(items)
    return f"{', '.join(items[:-1])} and {items[-1]}"


def count(number: int, noun: str, plural: str = "") -> str:
    """Write a number with its noun: `1 package`, `3 packages`."""
    return f"{number} {noun if number == 1 else plural or noun + 's'}"


def device(stage: Stage) -> str:
    """Name the device with its article: `a TL072`, `an LM358`, `an amplifier of unknown type`."""
    name = stage.device.strip()
    if stage.generic or not name:
        return "an amplifier without a type"
    article = "an" if name[0].upper() in _SPOKEN_WITH_VOWEL else "a"
    return f"{article} {name}"


def rails(supply: Supply) -> str:
    """Write the supply: `5 V`, `±12 V`, `12 V and -5 V`, or "" where it is not known."""
    positive, negative = supply.positive, supply.negative
    if positive is None or negative is None:
        return ""
    if negative == 0:
        return si(positive, "V")
    if abs(positive + negative) <= 1e-3 * abs(positive):
        return f"±{si(abs(positive), 'V')}"
    return f"{si(positive, 'V')} and {si(negative, 'V')}"


def device_on(stage: Stage) -> str:
    """Name the device and its supply: `a TL072 on ±12 V`."""
    words = rails(stage.supply)
    return f"{device(stage)} on {words}" if words else device(stage)


def limit_note(kind: str, basis: Basis, condition: str = "") -> str:
    """Say in brackets what sort of limit it is: `(typical, 10 kΩ load, data sheet)`."""
    return f"({', '.join(filter(None, (kind, condition, origin(basis))))})"


def sheet(stage: Stage, broken: Breach, practice: str = NO_SOURCE) -> str:
    """Cite what a device's limit rests on."""
    if broken.broken == "absolute" and broken.limit_basis in ("netlist", "user"):
        return f"the supply itself ({origin(broken.limit_basis)})"
    if stage.family is None or broken.limit_basis in ("practice", "assumed"):
        return practice
    return cited(stage, broken.limit_basis)


def cited(stage: Stage, basis: Basis) -> str:
    """Cite the data sheet of a stage's device; say so where the figure is from memory."""
    if stage.family is None or basis in ("practice", "assumed"):
        return NO_SOURCE
    if basis == "user":
        return "the user's own device table"
    title = str(stage.family.source)
    return f"{title} (figure from memory)" if basis == "memory" else title


def capital(text: str) -> str:
    """Begin a sentence with a capital letter, whatever the rest holds."""
    return text[:1].upper() + text[1:]
