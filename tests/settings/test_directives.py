"""Comment cards: the same statements as in the user's file, and what happens to bad ones."""

import datetime as dt

import msgspec
import pytest

from railguard.location import Location
from railguard.settings.directives import apply
from railguard.settings.file import parse
from railguard.settings.model import NetLevel, Settings


class Card(msgspec.Struct, frozen=True):
    """A comment card as the reader of netlists hands it over."""

    text: str
    location: Location


def cards(*texts):
    """Put each text on a line of its own, from line 1 on."""
    return [Card(text, Location("station.cir", number)) for number, text in enumerate(texts, 1)]


def obeyed(*texts):
    """Return the settings some directives make, all of them obeyed."""
    made, problems = apply(Settings(), cards(*texts))
    assert problems == ()
    return made


def unplaced(value):
    """Return a value without its places: they differ between the readers, and nothing else may."""
    if isinstance(value, Location):
        return None
    if isinstance(value, msgspec.Struct):
        return type(value), {f: unplaced(getattr(value, f)) for f in value.__struct_fields__}
    if isinstance(value, dict):
        return {name: unplaced(inner) for name, inner in value.items()}
    if isinstance(value, tuple):
        return tuple(unplaced(inner) for inner in value)
    return value


@pytest.mark.parametrize(
    ("directive", "toml"),
    [
        ("rail VBAT 12 tol=10%", '[nets]\nVBAT = { volts = 12.0, tolerance = "10 %" }'),
        ("rail VBAT volts=12V", "[nets]\nVBAT = { volts = 12.0 }"),
        ("rail V-5 -5 tolerance = 0.02", '[nets]\n"V-5" = { volts = -5, tolerance = 0.02 }'),
        (
            "signal LEVEL low=0.5 high=4.5 to=200",
            "[signals]\nLEVEL = { low = 0.5, high = 4.5, to = 200 }",
        ),
        ("signal SENSE peak=50m", '[signals]\nSENSE = { peak = "50 mV" }'),
        (
            "signal bridge between=S+,S- peak=10M common=2.5 ohms=350 to=20",
            '[signals]\nbridge = { between = ["S+", "S-"], peak = 0.01, common = 2.5, '
            "ohms = 350, to = 20 }",
        ),
        (
            "signal LOOP amps=4m,20m from=0.1 to=1k group=loop",
            '[signals]\nLOOP = { amps = [0.004, 0.02], from = 0.1, to = "1 kHz", group = "loop" }',
        ),
        ("load LINE_OUT 600", "[loads]\nLINE_OUT = { ohms = 600 }"),
        (
            "load LINE_OUT farads=1nF to=VREF max-volts=3.3",
            '[loads]\nLINE_OUT = { farads = "1 nF", to = "VREF", max-volts = 3.3 }',
        ),
        ("use XU3 comparator", '[stages]\nXU3 = { use = "comparator" }'),
        (
            "pins XU1 in+ in- v+ v- out",
            '[stages]\nXU1 = { pins = ["in+", "in-", "v+", "v-", "out"] }',
        ),
        ("tolerance resistor 1%", '[tolerances]\nresistor = "1 %"'),
        ("tolerance R1* 0.1%", '[tolerances]\n"R1*" = "0.1 %"'),
        ("kind board", '[review]\nkind = "board"'),
        ("ambient -20 60", "[conditions]\nambient = [-20, 60]"),
        ("ambient 40", "[conditions]\nambient = 40"),
    ],
)
def test_a_statement_means_the_same_in_either_place(directive, toml):
    """Equal values, but for the place."""
    from_file = msgspec.structs.replace(parse(toml, "railguard.toml"), file="")
    assert unplaced(obeyed(directive)) == unplaced(from_file)


@pytest.mark.parametrize(
    ("directive", "toml"),
    [
        (
            "limit headroom-output reserve-share 5%",
            '[limits.headroom-output]\nreserve-share = "5 %"',
        ),
        (
            'waive drive-current XU3 "lamp test only" until=2027-06-30 by="hardware lead" '
            "accepted=-2m net=LAMP",
            '[[waivers]]\nrule = "drive-current"\ndesignator = "XU3"\nreason = "lamp test only"\n'
            'until = 2027-06-30\nby = "hardware lead"\naccepted = -0.002\nnet = "LAMP"',
        ),
    ],
)
def test_a_statement_about_a_rule_means_the_same_in_either_place(directive, toml):
    """Only the file keeps the names for a later check; a directive's are checked at once."""
    from_file = msgspec.structs.replace(parse(toml, "railguard.toml"), file="", named=())
    assert unplaced(obeyed(directive)) == unplaced(from_file)


def test_words_count_in_either_case():
    """A netlist passed through another program may come back in capitals."""
    made = obeyed("RAIL VBAT 12 TOL=10%", "USE XU3 COMPARATOR", "KIND BOARD")
    assert made.nets["VBAT"].tolerance == 0.1
    assert made.uses == {"XU3": "comparator"}
    assert made.kind == "board"


def test_a_comment_behind_a_semicolon_is_no_part_of_the_statement():
    """As everywhere in a netlist."""
    assert obeyed("rail VBAT 12 ; the battery").nets["VBAT"].volts == 12.0


def test_a_waiver_without_a_designator_holds_for_all():
    """As in the file."""
    (waiver,) = obeyed('waive decoupling-bulk "on the next sheet"').waivers
    assert (waiver.designator, waiver.reason, waiver.until) == ("", "on the next sheet", None)


@pytest.mark.parametrize(
    ("toml", "directive", "read", "kept"),
    [
        ("[nets]\nVBAT = { volts = 12 }", "rail vbat 5", lambda s: s.nets["VBAT"].volts, 12.0),
        ("[signals]\nIN = { peak = 1 }", "signal in peak=2", lambda s: s.signals[0].high, 1.0),
        ("[loads]\nOUT = { ohms = 600 }", "load out 50", lambda s: s.loads[0].ohms, 600.0),
        (
            "[stages]\nXU3 = { use = 'linear' }",
            "use xu3 comparator",
            lambda s: s.uses["XU3"],
            "linear",
        ),
        ("[tolerances]\nrail = 0.1", "tolerance rail 2%", lambda s: s.tolerances.rail, 0.1),
        (
            "[tolerances]\n'R1*' = 0.1",
            "tolerance r1* 2%",
            lambda s: s.tolerances.rules,
            (("R1*", 0.1),),
        ),
        (
            "[limits.drive-current]\nreserve = 0.1",
            "limit drive-current reserve 0.5",
            lambda s: s.limits["drive-current"]["reserve"],
            0.1,
        ),
        ("[review]\nkind = 'board'", "kind bench", lambda s: s.kind, "board"),
        ("[conditions]\nambient = 40", "ambient 0", lambda s: s.ambient, (40.0, 40.0)),
    ],
)
def test_the_user_s_file_is_trusted_more(toml, directive, read, kept):
    """A directive on the same thing yields, in whichever case it is spelt."""
    made, problems = apply(parse(toml, "railguard.toml"), cards(directive))
    assert read(made) == kept
    assert problems == ()


def test_what_the_file_leaves_open_a_directive_may_add():
    """Rails, limits of the same rule, waivers, tolerances."""
    base = parse(
        "[nets]\nVBAT = { volts = 12 }\n[limits.drive-current]\nreserve = 0.1\n"
        "[tolerances]\nresistor = 0.01\n[[waivers]]\nrule = 'a'\nreason = 'b'",
        "railguard.toml",
    )
    made, problems = apply(
        base,
        cards(
            "rail V5 5",
            "limit drive-current other 1",
            "tolerance capacitor 5%",
            'waive c "d"',
        ),
    )
    assert problems == ()
    assert list(made.nets) == ["VBAT", "V5"]
    assert made.limits == {"drive-current": {"reserve": 0.1, "other": 1.0}}
    assert (made.tolerances.resistor, made.tolerances.capacitor) == (0.01, 0.05)
    assert [waiver.rule for waiver in made.waivers] == ["a", "c"]


def test_of_two_directives_on_one_thing_the_first_is_kept():
    """And the second is told with the place of the first."""
    made, (problem,) = apply(Settings(), cards("rail VBAT 12", "rail vbat 5"))
    assert made.nets == {"VBAT": NetLevel(12.0, None, Location("station.cir", 1))}
    assert problem.message == (
        'The directive "rail vbat 5" was not obeyed. '
        "station.cir, line 1 states this already, and that is kept."
    )
    assert problem.location.line == 2


def test_the_same_card_met_twice_is_no_contradiction():
    """A subcircuit used twice brings its comment cards twice."""
    card = cards("rail VBAT 12")
    assert apply(Settings(), [*card, *card])[1] == ()


def test_loads_to_different_nets_are_different_things():
    """A filter may hang on ground and on the reference."""
    made = obeyed("load OUT 600", "load OUT 1k to=VREF")
    assert [(load.ohms, load.to) for load in made.loads] == [(600.0, "0"), (1000.0, "VREF")]


KNOWN = "ambient, kind, limit, load, pins, rail, signal, tolerance, use, waive"


@pytest.mark.parametrize(
    ("text", "message", "remedy"),
    [
        ("", "It states nothing.", f"Known here: {KNOWN}."),
        (
            "rial VBAT 12",
            '"rial" is nothing that can be stated.',
            f'The nearest is "rail". Known here: {KNOWN}.',
        ),
        ("rail", "It has too few or too many words.", "Write rail NET VOLTS tol=SHARE."),
        (
            "rail VBAT 12 V",
            "It has too few or too many words.",
            "Write rail NET VOLTS tol=SHARE.",
        ),
        ("rail VBAT", 'The net "VBAT" says no volts.', "State its level in volts."),
        ("rail VBAT 12 volts=5", "It says volts twice.", ""),
        (
            "rail VBAT twelve",
            'The net "VBAT" cannot use its volts: "twelve" is no number that can be read here: '
            "write 12, 12 V or 50 mV.",
            "",
        ),
        (
            "rail VBAT 12 tol=10",
            'The net "VBAT" cannot use its tolerance: 1000 % is no share from 0 to below 100 %.',
            'Write for example "5%" or 0.05.',
        ),
        ('rail VBAT 12 "battery"', 'It has no place for "battery".', ""),
        (
            "signal LEVEL peak=1 to=1MHz",
            'The signal "LEVEL" cannot use its to: "1MHz" is a thousandth in SPICE notation, '
            "where M is milli: write MEG for mega, or a small m.",
            "",
        ),
        (
            "signal LEVEL hihg=3",
            'The signal "LEVEL" has no field "hihg".',
            'The nearest is "high". Known here: amps, between, common, from, group, high, low, '
            "ohms, peak, to.",
        ),
        (
            "load OUT farads=1F",
            'The load on "OUT" cannot use its farads: "1F" leaves open whether F is farad or '
            "femto: write a plain number.",
            "",
        ),
        (
            "use XU3 komparator",
            'The stage "XU3" cannot have "komparator" as its use.',
            'The nearest is "comparator". Known here: comparator, linear, oscillator, unused.',
        ),
        ("use XU3", "It has too few or too many words.", "Write use DESIGNATOR comparator."),
        (
            "pins XU3 in+ in-",
            'The stage "XU3" needs the name of every pin as its pins.',
            "Write for example in+ in- v+ v- out.",
        ),
        (
            "pins",
            "It has too few or too many words.",
            "Write pins DESIGNATOR in+ in- v+ v- out.",
        ),
        (
            "waive drive-current XU3",
            "The waiver says no reason.",
            "A waiver has a rule and a reason.",
        ),
        (
            "waive drive-current XU3 lamp",
            "It has too few or too many words.",
            'Write waive RULE DESIGNATOR "reason" until=YEAR-MONTH-DAY.',
        ),
        (
            'waive drive-current XU3 "lamp" "test"',
            "It gives more than one reason.",
            'Write waive RULE DESIGNATOR "reason" until=YEAR-MONTH-DAY.',
        ),
        (
            'waive drive-current XU3 "lamp test',
            'It cannot be read from ""lamp test" on.',
            "Write words and key=value, and close every quote.",
        ),
        (
            'waive drive-current XU3 "lamp" until=soon',
            'The waiver cannot use its until: "soon" is no day.',
            "Write year-month-day: 2027-06-30.",
        ),
        (
            'waive drive-current XU3 "lamp" file=a.cir',
            "The waiver holds for the netlist it stands in, so it takes no file.",
            "",
        ),
        (
            "tolerance resistors 1%",
            'The statement of tolerances knows no class "resistors".',
            'The nearest is "resistor". Known here: capacitor, inductor, rail, resistor. '
            "A pattern of designators has a digit or a * in it.",
        ),
        (
            "limit drive-current 5",
            "It has too few or too many words.",
            "Write limit RULE LIMIT VALUE.",
        ),
        (
            "kind desk",
            'The netlist cannot have "desk" as its kind.',
            "Known here: bench, board.",
        ),
        ("ambient 60 -20", "The netlist gives its ambient with the higher number first.", ""),
        (
            "ambient",
            "It has too few or too many words.",
            "Write ambient LOWEST HIGHEST, in degrees Celsius.",
        ),
        (
            "rail VBAT 12 =",
            'It cannot be read from "=" on.',
            "Write words and key=value, and close every quote.",
        ),
    ],
)
def test_a_directive_that_cannot_be_obeyed_is_a_problem_and_nothing_more(text, message, remedy):
    """What was found, what was expected, and the place; the others are obeyed all the same."""
    made, (problem,) = apply(Settings(), cards("kind bench", text)[1:] + cards("rail V5 5"))
    assert problem.rule == "netlist-directive"
    assert problem.message == f'The directive "{text}" was not obeyed. {message}'
    assert problem.remedy == remedy
    assert problem.location == Location("station.cir", 2)
    assert list(made.nets) == ["V5"]


@pytest.mark.parametrize(
    ("text", "message", "remedy"),
    [
        (
            'waive drive-curent XU3 "lamp test"',
            'There is no rule "drive-curent".',
            'The nearest is "drive-current". Known here: drive-current.',
        ),
        (
            "limit drive-current reserv 5%",
            'The rule drive-current has no limit "reserv".',
            'The nearest is "reserve". Known here: reserve.',
        ),
        (
            "limit drive-current reserve 5mV",
            "The limit reserve of drive-current is a number without a unit, and the value is in V.",
            "",
        ),
    ],
)
def test_misspelt_rules_are_found_where_the_rules_are_known(text, message, remedy):
    """With the nearest name; nothing is waived or set by a name that does not exist."""
    rules = {"drive-current": {"reserve": ""}}
    made, (problem,) = apply(Settings(), cards(text), rules)
    assert problem.message == f'The directive "{text}" was not obeyed. {message}'
    assert problem.remedy == remedy
    assert made == Settings()


def test_a_day_is_a_day():
    """Inclusive, as written."""
    (waiver,) = obeyed('waive a "b" until=2027-06-30').waivers
    assert waiver.until == dt.date(2027, 6, 30)
