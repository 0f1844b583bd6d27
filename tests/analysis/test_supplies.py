"""Rails: level, basis and capacitors."""

import pytest

from railguard.analysis.recognise import keeps_closed, recognise
from railguard.analysis.supplies import Feed, feeds, supply_nets
from railguard.circuit.flatten import flatten
from railguard.circuit.rails import level_from_name
from railguard.deck.files import deck_from_text
from railguard.devices import catalogue
from railguard.reviewing import review
from railguard.settings.file import parse
from railguard.settings.model import Settings

FOLLOWER = "VIN in 0 SIN(2 1 1k)\nXU1 in out vcc 0 out MCP6002\n"


@pytest.mark.parametrize(
    ("name", "volts"),
    [
        ("+12V", 12.0),
        ("-5VA", -5.0),
        ("12V0", 12.0),
        ("3V3", 3.3),
        ("+3.3V", 3.3),
        ("VCC_3V3", 3.3),
        ("15+", 15.0),
        ("15-", -15.0),
        ("/power/+5V", 5.0),
        ("N12V", -12.0),
        ("+5", 5.0),
        ("5V", 5.0),
        ("1V8D", 1.8),
    ],
)
def test_a_name_with_a_volt_or_a_sign_states_a_level(name, volts):
    """Rails as boards call them."""
    assert level_from_name(name) == pytest.approx(volts)


@pytest.mark.parametrize(
    "name",
    [
        "N015",
        "12",
        "N001",
        "VCC",
        "V+",
        "Net-_U1A--_",
        "$N_0003",
        "in-2",
        "OUT5",
        "A1",
        "V5",
        "in+",
    ],
)
def test_an_automatic_name_states_nothing(name):
    """A letter and digits alone are no voltage."""
    assert level_from_name(name) is None


def test_level_comes_through_a_ferrite(design):
    """The rail at the pin is the source behind the ferrite, less its drop."""
    supply = "V1 bat 0 5\nR9 bat vcc 10\nC1 vcc 0 100n"
    rail = design(FOLLOWER, supply=supply).rails[0]
    assert rail.level == pytest.approx(5.0, abs=0.02)
    assert rail.level < 5.0
    assert rail.series == ("R9",)
    assert [c.designator for c in rail.decoupling] == ["C1"]


def test_stacked_and_reversed_sources_are_solved(design):
    """A negative rail drawn with its plus pin to ground."""
    cards = "VIN in 0 0\nXU1 in out vp vn out TL072"
    supply = "V1 vp mid 6\nV2 mid 0 6\nV3 0 vn 12"
    levels = {r.net: r.level for r in design(cards, supply=supply).rails}
    assert levels["vp"] == pytest.approx(12.0)
    assert levels["vn"] == pytest.approx(-12.0)


def test_user_statement_outranks_the_source(design):
    """What the user's file says of a net wins over the deck."""
    found = design(FOLLOWER, '[nets]\n"vcc" = { volts = 3.3 }', "V1 vcc 0 5\nC1 vcc 0 100n")
    assert found.rails[0].level == pytest.approx(3.3)
    assert found.rails[0].basis == "user"


def test_name_counts_where_no_source_is(design):
    """A board's rail without a source takes the level of its name."""
    cards = "VIN in 0 SIN(2 1 1k)\nXU1 in out +5V 0 out MCP6002"
    rail = design(cards, supply="C1 +5V 0 100n").rails[0]
    assert rail.level == pytest.approx(5.0)
    assert rail.origin == "its name"


def test_a_supply_nobody_states_is_unknown(design):
    """No level is made up for a net called VCC."""
    found = design(FOLLOWER, supply="C1 vcc 0 100n\nJ1 vcc 0 CONN_2")
    assert found.rails[0].level is None
    assert "supply" in found.stages[0].unknown


def test_capacitor_behind_a_ferrite_is_upstream(design):
    """A capacitor on the far side of a ferrite does not count at the pins."""
    rail = design(FOLLOWER, supply="V1 bat 0 5\nL1 bat vcc 1u\nC1 bat 0 100n").rails[0]
    assert rail.decoupling == ()
    assert [(c.designator, c.behind) for c in rail.upstream] == [("C1", "L1")]


def test_one_large_resistor_from_a_source_feeds_a_pin():
    """A micropower stage behind 10 kilohm is fed, and told what the resistor takes."""
    text = "t\nVP raw 0 5\nRS raw vp 10k\nC1 vp 0 100n\nVIN in 0 1\nXU1 in o vp 0 o MCP6041\n.end\n"
    (design,) = review(text, plugins=False).designs
    (rail,) = design.design.rails
    assert rail.series == ("RS",)
    assert rail.level == pytest.approx(5.0, abs=0.1)
    none = text.replace("RS raw vp 10k", "RS raw x 10k\nRT x vp 10k")
    (design,) = review(none, plugins=False).designs
    assert "supply-missing" in {f.rule for f in design.findings}


def test_a_source_of_zero_volts_holds_a_rail_at_ground(design):
    """A bench often draws its negative rail so; one in the way of a rail is an ammeter."""
    cards = "VIN in 0 SIN(2 1 1k)\nXU1 in out vcc vee out MCP6002\n"
    supply = "V1 bat 0 5\nVM bat vcc 0\nV2 vee 0 0\nC1 vcc 0 100n"
    levels = {r.net: r.level for r in design(cards, supply=supply).rails}
    assert levels == {"vcc": pytest.approx(5.0), "vee": pytest.approx(0.0)}


def test_a_return_that_carries_no_current_stands_at_ground(design):
    """A loop-powered part: what arithmetic leaves of zero is zero, as a reader sees it."""
    cards = "RL lm 0 250\nR9 v5 lm 1k\nV9 in lm 2\nRS in p 1k\nR2 p lm 1meg\nXU1 p o v5 lm o OPA333"
    supply = "VLOOP v24 0 24\nRA v24 b 100k\nRB b 0 100k\nV1 v5 lm 5\nC1 v5 lm 100n"
    (stage,) = design(cards, supply=supply).stages
    assert stage.supply.negative == 0.0
    assert stage.supply.positive == 5.0


@pytest.mark.parametrize(
    ("volts", "positive", "negative"),
    [(4.0, 12 - 0.1 - 1.0, -11.9), (-4.0, 11.9, -12 + 0.1 + 1.0), (0.0, 11.9, -11.9)],
)
def test_what_an_output_gives_at_rest_comes_through_the_rail(design, volts, positive, negative):
    """10 mA into 400 ohm, and 1 mA of its own, over 100 ohm in each rail: 1.1 V are lost."""
    supply = "V1 r1 0 12\nR1 r1 vp 100\nV2 r2 0 -12\nR2 r2 vn 100\nC1 vp 0 1u\nC2 vn 0 1u"
    cards = f"VIN in 0 {volts}\nXU1 in out vp vn out OPA197\nRL out 0 400"
    (stage,) = design(cards, supply=supply).stages
    assert stage.family.supply_current.typical == 1e-3
    assert stage.supply.positive == pytest.approx(positive, abs=1e-3)
    assert stage.supply.negative == pytest.approx(negative, abs=1e-3)


def test_a_rail_too_weak_for_its_output_is_not_turned_round(design):
    """47 kohm before 17 uA and a load of 0.12 mA: 5.7 V would be lost of 5 V.

    The output clips long before; what stands at the pin then nobody can say, and it is not below
    ground. The level that its own current leaves is given, and the drop is told.
    """
    supply = "V1 r1 0 5\nR1 r1 vp 47k\nC1 vp 0 1u"
    cards = "VIN in 0 2.5\nXU1 in out vp 0 out OPA333\nRL out 0 20k"
    (stage,) = design(cards, supply=supply).stages
    own = stage.family.supply_current.typical
    assert stage.supply.positive == pytest.approx(5 - 47e3 * own, abs=1e-3)
    assert stage.output.available.high < 2.5


def test_a_neighbour_s_output_takes_from_the_rail_they_share(design):
    """What one channel gives at rest is missing to what the other reaches."""
    supply = "V1 r1 0 12\nR1 r1 vp 100\nC1 vp 0 1u"
    cards = "VA a 0 {volts}\nXU1 a oa vp 0 oa OPA197\nRA oa 0 400\nVB b 0 6\n"
    cards += "XU2 b ob vp 0 ob OPA197\nRB ob 0 100k"
    reached = []
    for volts in (0, 4):
        stages = design(cards.format(volts=volts), supply=supply).stages
        reached.append(next(s for s in stages if s.designator == "XU2").output.available.high)
    assert reached[0] - reached[1] == pytest.approx(1.0, abs=0.01)


def test_a_return_of_its_own_carries_only_what_leaves_it(design):
    """Load and amplifier return to the same net: over its resistor to ground nothing flows."""
    cards = "RS lm 0 250\nVIN in lm 2\nXU1 in out v5 lm out OPA197\nRL out lm 1k"
    (stage,) = design(cards, supply="V1 v5 lm 5\nC1 v5 lm 1u").stages
    assert stage.supply.negative == pytest.approx(0.0, abs=1e-6)
    assert stage.supply.positive == pytest.approx(5.0, abs=1e-6)


TWO_WIRE = """VLOOP lp 0 24
RL lm 0 250
D1 lp vin DX
V1 v5 com 5
C1 v5 com 100n
VSET set com PWL(0 {low} 10 2.0)
R1 set p 100k
R2 p lm 4.99k
XU1 p com v5 com g OPA333
Q1 vin g e QN
RE e com 100
RS com lm 50
C3 g com 1n
.model QN NPN(BF=200)
.model DX D(IS=1e-8)"""


@pytest.mark.parametrize(("low", "moves"), [(0.4, True), (1.9, False)])
def test_rails_that_the_signal_moves_are_not_taken_for_standing(design, low, moves):
    """The return of a two-wire transmitter rides on its loop's current: so do its inputs.

    Held against a level that stood still they lay beyond it.
    """
    (stage,) = design(TWO_WIRE.format(low=low), supply="").stages
    assert ("input" in stage.unknown) == moves
    assert (stage.inputs.low.demand is None) == moves
    assert (stage.output.demand.low is None) == moves
    if moves:
        assert "the signal moves its negative rail by " in stage.unknown["input"].why


def test_a_battery_that_comes_and_goes_is_a_supply(design):
    """Its lower end stands still."""
    cards = "VIN in 0 SIN(2 1 10)\nXU1 in out vp 0 out MCP6002\nRL out 0 10k"
    (stage,) = design(cards, supply="VB vp 0 PWL(0 4.5 10 5.5 20 4.5)\nC1 vp 0 100n").stages
    assert "input" not in stage.unknown
    assert stage.inputs.low.demand == pytest.approx(1.0, abs=1e-6)


def fed(cards, settings="", net="vp"):
    """Return what feeds one supply net of a follower on it and ground."""
    stated = parse(settings, "railguard.toml")
    devices = catalogue.load()
    text = f"t\n{cards}\nVIN in 0 1\nXU1 in o {net} 0 o MCP6002\n.end\n"
    circuit = flatten(deck_from_text(text), keeps_closed(devices))
    amplifiers = recognise(circuit, devices, stated).amplifiers
    return feeds(supply_nets(amplifiers), circuit.elements, stated, amplifiers)[net]


RAW = '[nets]\n"raw" = { volts = 5, tolerance = "2 %" }'
STATED = {"basis": "user", "origin": "railguard.toml", "tolerance": 0.02}


@pytest.mark.parametrize(
    ("cards", "settings", "fields"),
    [
        # what the user states, at the pin's own net, behind a ferrite, behind one large resistor
        ("C1 vp 0 1u", RAW.replace("raw", "vp"), {"level": 5.0, "at": "vp", **STATED}),
        ("L1 raw vp 1u", RAW, {"level": 5.0, "at": "raw", "series": ("L1",), **STATED}),
        ("RS raw vp 10k", RAW, {"at": "raw", "series": ("RS",), **STATED}),
        # a source, straight, behind all that counts as in series, behind one large resistor
        ("VP vp 0 5", "", {"origin": "VP", "source": "VP", "at": "vp"}),
        ("VP a 0 5\nR1 a b 1k\nL1 b vp 1u", "",
         {"origin": "VP", "source": "VP", "at": "a", "series": ("L1", "R1")}),
        ("VP a 0 5\nR1 a vp 1001", "",
         {"origin": "VP", "source": "VP", "at": "a", "series": ("R1",)}),
        ("BT1 a 0 3V\nR1 a vp 10k", "",
         {"origin": "BT1", "source": "BT1", "at": "a", "series": ("R1",)}),
        ("BT1 vp 0 3V", "", {"origin": "BT1", "source": "BT1", "at": "vp"}),
        ("H1 vp 0 VX 5\nVX x 0 1\nRX x 0 1", "", {"origin": "H1", "source": "H1", "at": "vp"}),
        # an amplifier's output behind a resistor
        ("VR r 0 4\nXU2 r q vcc 0 q MCP6002\nV2 vcc 0 5\nR1 q vp 10", "",
         {"origin": "the output of XU2", "source": "XU2", "at": "q", "series": ("R1",)}),
        # a net's name behind a coil
        ("L1 +5V vp 1u\nC1 +5V 0 1u", "",
         {"level": 5.0, "origin": "its name", "at": "+5V", "series": ("L1",)}),
    ],
)  # fmt: skip
def test_what_feeds_a_supply_net(cards, settings, fields):
    """Level, origin, where it is stated, and what stands between: nearest to the pin first."""
    usual = {"net": "vp", "level": None, "basis": "netlist"}
    assert fed(cards, settings) == Feed(**{**usual, **fields})


def test_what_feeds_nothing():
    """Neither two large resistors, nor one to ground, nor a battery that does not say its volts."""
    for cards in (
        "BT1 vp 0 CR2032",
        "VP a 0 5\nR1 a b 10k\nR2 b vp 10k",
        "R1 vp 0 10k",
        "VP a 0 5\nR1 a vp 101k",
    ):
        found = fed(cards)
        assert (found.held, found.basis, found.level, found.at) == (False, "assumed", None, "vp")


def test_a_rail_is_positive_or_negative_by_the_pins_it_feeds(design):
    """Ground is no rail."""
    cards = "VIN in 0 1\nXU1 in a vp vn a TL072\nXU2 in b vp 0 b TL072"
    amplifiers = recognise(design(cards).circuit, catalogue.load(), Settings()).amplifiers
    assert supply_nets(amplifiers) == {"vp": "positive", "vn": "negative"}


@pytest.mark.parametrize(
    ("tie", "returns"),
    [("RT agnd 0 0", ("0", "agnd")), ("FB1 agnd 0 600R", ("0", "agnd")), ("RT agnd 0 1k", ("0",))],
)
def test_a_ground_behind_a_tie_or_a_ferrite_is_a_return(design, tie, returns):
    """A capacitor to it decouples; behind 1 kilohm it does not."""
    (rail,) = design(FOLLOWER, supply=f"V1 vcc 0 5\nC1 vcc agnd 100n\n{tie}").rails
    assert rail.returns == returns
    assert [c.designator for c in rail.decoupling] == (["C1"] if "agnd" in returns else [])


def test_a_ferrite_keeps_a_capacitor_from_the_pins(design):
    """What stands before it is upstream, whatever its card says of its ohms."""
    (rail,) = design(FOLLOWER, supply="V1 bat 0 5\nFB1 bat vcc 600R\nC1 bat 0 100n").rails
    assert [(c.designator, c.behind) for c in rail.upstream] == [("C1", "FB1")]
    assert rail.decoupling == ()
    assert rail.series == ("FB1",)
    assert rail.drop == pytest.approx(0.0, abs=1e-3)


def test_both_rails_with_their_ends_and_their_cards(design):
    """5 % either way, at the line of the source that feeds each; a dual has two channels."""
    found = design("VIN in 0 1\nXU1 in out vp vn out TL072", supply="V1 vp 0 15\nV2 vn 0 -12")
    rails = {r.net: r for r in found.rails}
    assert (rails["vp"].sign, rails["vn"].sign) == ("positive", "negative")
    for net, volts, line in (("vp", 15.0, 4), ("vn", -12.0, 5)):
        worst = rails[net].worst
        assert sorted((worst.low, worst.high)) == pytest.approx(
            sorted((volts * 0.95, volts * 1.05))
        )
        assert worst.low < worst.high
        assert rails[net].location.line == line
        assert rails[net].drop == 0.0
    (package,) = found.packages
    assert (package.designator, package.size, package.channels) == ("U1", 2, ("XU1",))


def test_a_rail_nobody_states_has_no_drop(design):
    """Though the equations give its net a level; its place is the first card on it."""
    found = design(FOLLOWER, supply="C1 vcc 0 100n\nJ1 vcc 0 CONN_2")
    (rail,) = found.rails
    assert (rail.level, rail.drop, rail.feed) == (None, None, "outside")
    assert rail.location.line == 3
