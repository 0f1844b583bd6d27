"""Comment cards `* railguard: ...` to the same statements as the user's file.

The user's file is trusted more: what it states stays, and a directive on the same thing yields.
Of two directives on one thing the first is kept and the second is a problem. Numbers are in SPICE
notation (M is milli), its traps refused; words count in either case. A directive that cannot be
read is a problem, never an exception.
"""

import re
from collections.abc import Callable, Collection, Iterable, Mapping
from typing import NamedTuple, Protocol

import msgspec

from railguard.location import Location
from railguard.notices import Problem
from railguard.settings import statements
from railguard.settings.fields import Fields, StatementError
from railguard.settings.model import Named, Settings
from railguard.settings.names import advice, misnamed
from railguard.units import QuantityError, parse_quantity, split_quantity

RULE = "netlist-directive"


class Written(Protocol):
    """A comment card: the words after `railguard:`, and where it stands."""

    @property
    def text(self) -> str:
        """The words behind the colon."""

    @property
    def location(self) -> Location:
        """Where the card stands."""


Rules = Mapping[str, Collection[str]]


class _Statement(NamedTuple):
    """What a directive states.

    about   what it is about: two directives on one thing contradict; () never does
    stands  tells whether the user's file states it
    add     puts it into settings
    named   the rule it names
    """

    about: tuple[str, ...]
    stands: Callable[[Settings], bool]
    add: Callable[[Settings], Settings]
    named: Named | None = None


def apply(
    settings: Settings, directives: Iterable[Written], rules: Rules | None = None
) -> tuple[Settings, tuple[Problem, ...]]:
    """Add what a netlist's comment cards state.

    settings  from the user's file
    rules     rule -> names of its limits (or units by name), to find misspelt ones; None: not
              checked

    Returns the settings with the statements added, and a problem for each directive not obeyed.
    """
    from_file = settings
    stated: dict[tuple[str, ...], Location] = {}
    problems: list[Problem] = []
    for directive in directives:
        try:
            statement = _read(directive, rules)
            first = stated.setdefault(statement.about, directive.location)
            # a subcircuit used twice brings the same card twice
            if statement.about and first != directive.location:
                raise StatementError(f"{first} states this already, and that is kept.")
            if not statement.stands(from_file):
                settings = statement.add(settings)
        except StatementError as fault:
            message = f'The directive "{directive.text.strip()}" was not obeyed. {fault.what}'
            problems.append(Problem(RULE, message, fault.remedy, directive.location))
    return settings, tuple(problems)


_TOKEN = re.compile(
    r"""\s*(?:(?P<key>[A-Za-z-]+)\s*=\s*)?(?:"(?P<quoted>[^"]*)"|(?P<bare>[^\s"=]+))"""
)


class _Words:
    """A directive taken apart: its words in order, and its `key=value` fields."""

    def __init__(self, text: str) -> None:
        self.words: list[str] = []
        self.quoted: list[str] = []
        self.fields: dict[str, object] = {}
        at = 0
        text = text.strip()
        while at < len(text):
            match = _TOKEN.match(text, at)
            if match is None:
                raise StatementError(
                    f'It cannot be read from "{text[at:].strip()}" on.',
                    remedy="Write words and key=value, and close every quote.",
                )
            at = match.end()
            key, quoted, bare = match["key"], match["quoted"], match["bare"]
            if key:
                self._field(key.casefold(), quoted if bare is None else bare)
            elif bare is None:
                self.quoted.append(quoted)
            elif bare.startswith(";"):
                break
            else:
                self.words.append(bare)

    def _field(self, key: str, value: str) -> None:
        key = "tolerance" if key == "tol" else key
        if key in self.fields:
            raise StatementError(f"It says {key} twice.")
        self.fields[key] = value.split(",") if key in ("between", "amps") else value

    def take(self, form: str, *keys: str, least: int = 1) -> list[str]:
        """Return the word behind the verb, and put the further words under `keys`.

        form  the whole statement, shown where the words do not fit it
        """
        words = self.words[1:]
        if not least <= len(words) <= 1 + len(keys):
            raise StatementError("It has too few or too many words.", remedy=f"Write {form}.")
        for key, word in zip(keys, words[1:], strict=False):
            self._field(key, word)
        return words


def _number(raw: object, unit: str | None) -> tuple[float, str]:
    if not isinstance(raw, str):
        raise QuantityError("it is no number.")
    if unit is None:
        return split_quantity(raw, spice=True)
    return parse_quantity(raw, unit, spice=True), unit


def _read(directive: Written, rules: Rules | None) -> _Statement:
    words = _Words(directive.text)
    verb = words.words[0].casefold() if words.words else ""
    reader = _READERS.get(verb)
    if reader is None:
        what = f'"{verb}" is nothing that can be stated.' if verb else "It states nothing."
        raise StatementError(what, remedy=advice(verb, _READERS))
    if words.quoted and verb != "waive":
        raise StatementError(f'It has no place for "{words.quoted[0]}".')
    statement = reader(words, directive.location)
    fault = misnamed(statement.named, rules) if statement.named and rules is not None else None
    if fault is not None:
        raise StatementError(fault[0], remedy=fault[1])
    return statement


def _has(names: Iterable[str], name: str) -> bool:
    return name.casefold() in (known.casefold() for known in names)


def _rail(words: _Words, place: Location) -> _Statement:
    net = words.take("rail NET VOLTS tol=SHARE", "volts")[0]
    made = statements.net_level(net, Fields(f'the net "{net}"', words.fields, _number), place)
    return _Statement(
        ("rail", net.casefold()),
        lambda s: _has(s.nets, net),
        lambda s: msgspec.structs.replace(s, nets={**s.nets, net: made}),
    )


def _signal(words: _Words, place: Location) -> _Statement:
    name = words.take("signal NET low=VOLTS high=VOLTS to=HERTZ")[0]
    made = statements.signal(name, Fields(f'the signal "{name}"', words.fields, _number), place)
    return _Statement(
        ("signal", name.casefold()),
        lambda s: _has((signal.name for signal in s.signals), name),
        lambda s: msgspec.structs.replace(s, signals=(*s.signals, made)),
    )


def _load(words: _Words, place: Location) -> _Statement:
    net = words.take("load NET OHMS farads=FARADS to=NET", "ohms")[0]
    made = statements.load(net, Fields(f'the load on "{net}"', words.fields, _number), place)
    return _Statement(
        ("load", net.casefold(), made.to.casefold()),
        lambda s: _has((load.net for load in s.loads), net),
        lambda s: msgspec.structs.replace(s, loads=(*s.loads, made)),
    )


def _placed(settings: Settings, stage: str, place: Location) -> Settings:
    """Note where a stage is spoken of, the first place where there are several."""
    return msgspec.structs.replace(settings, stages_at={stage: place, **settings.stages_at})


def _use(words: _Words, place: Location) -> _Statement:
    form = "use DESIGNATOR comparator"
    stage, *rest = words.take(form, "use", least=2)
    fields = Fields(f'the stage "{stage}"', {**words.fields, "use": rest[0].casefold()}, _number)
    fields.only("use")
    made = fields.word("use", statements.USES)
    if made is None:
        raise fields.fault("says no use.", remedy=f"Write {form}.")
    return _Statement(
        ("use", stage.casefold()),
        lambda s: _has(s.uses, stage),
        lambda s: _placed(msgspec.structs.replace(s, uses={**s.uses, stage: made}), stage, place),
    )


def _pins(words: _Words, place: Location) -> _Statement:
    if len(words.words) < 2:
        remedy = "Write pins DESIGNATOR in+ in- v+ v- out."
        raise StatementError("It has too few or too many words.", remedy=remedy)
    stage = words.words[1]
    raw = {**words.fields, "pins": words.words[2:]}
    fields = Fields(f'the stage "{stage}"', raw, _number)
    fields.only("pins")
    made = statements.pins(fields)
    return _Statement(
        ("pins", stage.casefold()),
        lambda s: _has(s.pins, stage),
        lambda s: _placed(msgspec.structs.replace(s, pins={**s.pins, stage: made}), stage, place),
    )


def _waive(words: _Words, place: Location) -> _Statement:
    form = 'waive RULE DESIGNATOR "reason" until=YEAR-MONTH-DAY'
    rule = words.take(form, "designator")[0].casefold()
    if len(words.quoted) > 1:
        raise StatementError("It gives more than one reason.", remedy=f"Write {form}.")
    raw = {**words.fields, "rule": rule}
    if words.quoted:
        raw["reason"] = words.quoted[0]
    fields = Fields("the waiver", raw, _number)
    if "file" in raw:
        raise fields.fault("holds for the netlist it stands in, so it takes no file.", "file")
    made = statements.waiver(fields, place)
    return _Statement(
        (),
        lambda _: False,
        lambda s: msgspec.structs.replace(s, waivers=(*s.waivers, made)),
        Named(rule, location=place),
    )


def _tolerance(words: _Words, _: Location) -> _Statement:
    form = "tolerance resistor 1% or tolerance R1* 0.1%"
    name, share = words.take(form, "share", least=2)
    name = name.casefold() if name.casefold() in statements.CLASSES else name
    words.fields.pop("share")
    fields = Fields("the statement of tolerances", {**words.fields, name: share}, _number)
    made = statements.tolerances(fields)

    def stands(settings: Settings) -> bool:
        patterns = (pattern for pattern, _ in settings.tolerances.rules)
        return getattr(settings.tolerances, name, None) is not None or _has(patterns, name)

    def add(settings: Settings) -> Settings:
        before = settings.tolerances
        known = {c: v for c in statements.CLASSES if (v := getattr(made, c)) is not None}
        after = msgspec.structs.replace(before, rules=(*before.rules, *made.rules), **known)
        return msgspec.structs.replace(settings, tolerances=after)

    return _Statement(("tolerance", name.casefold()), stands, add)


def _limit(words: _Words, place: Location) -> _Statement:
    rule, limit, *_ = words.take("limit RULE LIMIT VALUE", "limit", "value", least=3)
    rule, limit = rule.casefold(), limit.casefold()
    fields = Fields(f'the limit "{limit}"', words.fields, _number)
    fields.only("limit", "value")
    made, unit = fields.with_unit("value")

    def add(settings: Settings) -> Settings:
        limits = {**settings.limits, rule: {**settings.limits.get(rule, {}), limit: made}}
        return msgspec.structs.replace(settings, limits=limits)

    return _Statement(
        ("limit", rule, limit),
        lambda s: limit in s.limits.get(rule, {}),
        add,
        Named(rule, limit, unit, place),
    )


def _kind(words: _Words, _: Location) -> _Statement:
    word = words.take("kind board or kind bench")[0].casefold()
    fields = Fields("the netlist", {**words.fields, "kind": word}, _number)
    fields.only("kind")
    made = fields.word("kind", statements.KINDS) or ""
    return _Statement(
        ("kind",), lambda s: bool(s.kind), lambda s: msgspec.structs.replace(s, kind=made)
    )


def _ambient(words: _Words, _: Location) -> _Statement:
    bounds = words.take("ambient LOWEST HIGHEST, in degrees Celsius", "highest")
    words.fields.pop("highest", None)
    raw = {**words.fields, "ambient": bounds if len(bounds) == 2 else bounds[0]}
    fields = Fields("the netlist", raw, _number)
    fields.only("ambient")
    made = statements.ambient(fields)
    return _Statement(
        ("ambient",),
        lambda s: s.ambient is not None,
        lambda s: msgspec.structs.replace(s, ambient=made),
    )


_READERS: dict[str, Callable[[_Words, Location], _Statement]] = {
    "rail": _rail,
    "signal": _signal,
    "load": _load,
    "use": _use,
    "pins": _pins,
    "waive": _waive,
    "tolerance": _tolerance,
    "limit": _limit,
    "kind": _kind,
    "ambient": _ambient,
}
