"""Pin orders: from names, comments, packages, and the usual order."""

import pytest

from railguard.devices.catalogue import load
from railguard.devices.model import Channel
from railguard.devices.pinnames import channels_from, roles_of
from railguard.devices.pinouts import PACKAGES, pin_order
from railguard.errors import SettingsError

USUAL = Channel(plus=0, minus=1, positive=2, negative=3, output=4)


@pytest.fixture(scope="module")
def match():
    """Look a name up in the shipped catalogue."""
    return load().match


@pytest.mark.parametrize(
    "ports",
    [
        ("IN+", "IN-", "VCC", "VEE", "OUT"),
        ("inp", "inn", "vdd", "vss", "vout"),
        ("+", "-", "V+", "V-", "O"),
        ("NONINV", "INV", "99", "50", "out"),
        ("non", "inv", "vs+", "vs-", "out"),
        ("ip", "im", "+vs", "-vs", "vo"),
        ("vp", "vn", "vcc", "vee", "out"),
        ("inp", "inn", "vp", "vn", "out"),
        ("p", "n", "vp", "vn", "out"),
        ("pos", "neg", "vcc", "gnd", "out"),
        ("3", "2", "7", "4", "6"),
        ("3", "2", "8", "4", "1"),
        ("5", "6", "8", "4", "7"),
        ("3", "2", "4", "11", "1"),
        ("1", "2", "99", "50", "28"),
    ],
)
def test_header_names_say_the_order(match, ports):
    """Header names say the order."""
    names = tuple({"99": "v+", "50": "v-"}.get(p, p) if "NONINV" in ports else p for p in ports)
    order = pin_order(match("TL072"), 5, names)
    assert (order.channels, order.basis, order.remark) == ((USUAL,), "netlist", "")


@pytest.mark.parametrize(
    ("ports", "channel"),
    [
        (("IN-", "IN+", "OUT", "VCC", "VEE"), Channel(1, 0, 3, 4, 2)),
        (("inm", "inp", "V-", "Out", "V+"), Channel(1, 0, 4, 2, 3)),
        (("OUT", "V-", "IN+", "IN-", "V+"), Channel(2, 3, 4, 1, 0)),
        (("2", "3", "4", "6", "7"), Channel(1, 0, 4, 2, 3)),
    ],
)
def test_an_unusual_header_is_followed(match, ports, channel):
    """An unusual header is followed."""
    assert pin_order(match("TS912"), 5, ports).channels == (channel,)


def test_extra_pins_of_a_named_header_are_left_aside(match):
    """Extra pins of a named header are left aside."""
    ports = ("inn", "inp", "vee", "out", "vcc", "dis")
    order = pin_order(match("OPA847"), 6, ports)
    assert order.channels == (Channel(1, 0, 4, 2, 3),)
    assert order.basis == "netlist"


def test_connection_comments_count_where_the_header_says_nothing(match):
    """Connection comments count where the header says nothing."""
    notes = (
        "inverting input",
        "non-inverting input",
        "output",
        "positive power supply",
        "negative power supply",
    )
    order = pin_order(match("TS912"), 5, ("1", "2", "3", "4", "5"), notes)
    assert (order.channels, order.basis) == ((Channel(1, 0, 3, 4, 2),), "netlist")


def test_the_user_outranks_the_header(match):
    """The user outranks the header."""
    ports = ("IN+", "IN-", "VCC", "VEE", "OUT")
    order = pin_order(match("TL072"), 5, ports, user=("out", "in-", "in+", "v-", "v+"))
    assert (order.channels, order.basis) == ((Channel(2, 1, 4, 3, 0),), "user")


@pytest.mark.parametrize(
    "user", [("in+", "in-", "out"), ("in+", "in+", "v+", "v-", "out"), ("a", "b", "c", "d", "e")]
)
def test_a_statement_that_describes_no_amplifier_is_refused(match, user):
    """A statement that describes no amplifier is refused."""
    with pytest.raises(SettingsError, match="do not describe an amplifier on a card with 5 nets"):
        pin_order(match("TL072"), 5, user=user)


def test_numbers_in_sequence_say_nothing_and_the_usual_order_is_assumed(match):
    """Numbers in sequence say nothing and the usual order is assumed."""
    order = pin_order(match("TL072"), 5, ("1", "2", "3", "4", "5"))
    assert (order.channels, order.basis) == ((USUAL,), "assumed")
    assert order.remark == (
        "the usual pin order is assumed (non-inverting, inverting, positive supply, negative "
        "supply, output)"
    )


def test_seven_nets_are_five_and_two_left_aside(match):
    """Seven nets are five and two left aside."""
    order = pin_order(match("NE5534"), 7)
    assert (order.channels, order.basis) == ((USUAL,), "assumed")
    assert "the nets after the fifth (2) are left aside" in order.remark


@pytest.mark.parametrize(
    ("ports", "channel", "basis"),
    [
        ((), Channel(0, 1, None, None, 2), "assumed"),
        (("out", "a", "b"), Channel(1, 2, None, None, 0), "assumed"),
        (("inn", "inp", "out"), Channel(1, 0, None, None, 2), "netlist"),
        (("vp", "vn", "o"), Channel(0, 1, None, None, 2), "netlist"),
    ],
)
def test_three_pins_are_an_ideal_amplifier_either_way_round(match, ports, channel, basis):
    """Three pins are an ideal amplifier either way round."""
    order = pin_order(match("OPAMP"), 3, ports)
    assert (order.channels, order.basis) == ((channel,), basis)
    assert ("some libraries put the inverting input first" in order.remark) is (basis == "assumed")


def test_a_dual_package_as_one_card_is_two_channels(match):
    """A dual package as one card is two channels."""
    order = pin_order(match("TL072"), 8)
    assert order.channels == (Channel(2, 1, 7, 3, 0, "A"), Channel(4, 5, 7, 3, 6, "B"))
    assert order.basis == "assumed"
    assert order.remark == "its nets are taken as pins 1 to 8 of a package (dual, 8 pins)"


def test_a_quad_package_is_four_channels(match):
    """A quad package is four channels."""
    order = pin_order(match("TL074"), 14, board=True)
    assert [c.suffix for c in order.channels] == ["A", "B", "C", "D"]
    assert order.channels[0] == Channel(2, 1, 3, 10, 0, "A")
    assert order.channels[3] == Channel(11, 12, 3, 10, 13, "D")


def test_a_wide_quad_package_has_two_free_pins(match):
    """A wide quad package has two free pins."""
    order = pin_order(match("OP495"), 16, board=True)
    assert order.channels[2] == Channel(11, 10, 3, 12, 9, "C")


def test_a_board_export_of_a_common_package_rests_on_practice_and_draws_no_remark(match):
    """A board export of a common package rests on practice and draws no remark."""
    assert pin_order(match("TL072"), 8, board=True).basis == "practice"
    assert pin_order(match("TL071"), 8, board=True).channels == (Channel(2, 1, 6, 3, 5),)


def test_power_duals_have_pins_of_their_own(match):
    """Power duals have pins of their own."""
    order = pin_order(match("L272"), 8, board=True)
    assert order.channels == (Channel(6, 7, 1, 3, 0, "A"), Channel(5, 4, 1, 3, 2, "B"))


@pytest.mark.parametrize(
    ("name", "channel"),
    [
        ("AD8605ARTZ", Channel(2, 3, 4, 1, 0)),
        ("MCP6001T-I/OT", Channel(2, 3, 4, 1, 0)),
        ("MCP6001UT-I/OT", Channel(0, 2, 4, 1, 3)),
        ("MCP6001RT-I/OT", Channel(2, 3, 1, 4, 0)),
        ("LMV321IDBVR", Channel(0, 2, 4, 1, 3)),
        ("LM675T", Channel(0, 1, 4, 2, 3)),
    ],
)
def test_five_pin_packages_differ_and_are_assumed(match, name, channel):
    """Five pin packages differ and are assumed."""
    order = pin_order(match(name), 5, board=True)
    assert order.channels == (channel,)


def test_named_pins_of_a_whole_package_split_into_channels(match):
    """Named pins of a whole package split into channels."""
    ports = ("OUTA", "INA-", "INA+", "VEE", "INB+", "INB-", "OUTB", "VCC")
    order = pin_order(match("TL072"), 8, ports)
    assert order.channels == (Channel(2, 1, 7, 3, 0, "A"), Channel(4, 5, 7, 3, 6, "B"))
    assert order.basis == "netlist"


@pytest.mark.parametrize(
    ("name", "count"), [("TL072", 2), ("TL072", 4), ("TL072", 14), ("TL074", 9)]
)
def test_a_count_no_op_amp_has_gives_none(match, name, count):
    """A count no op amp has gives none."""
    assert pin_order(match(name), count) is None


@pytest.mark.parametrize("pins", PACKAGES.values(), ids=PACKAGES)
def test_every_package_table_describes_whole_amplifiers(pins):
    """Each pin stands once, and every channel has its supplies."""
    channels = channels_from(pins)
    used = [p for c in channels for p in (c.plus, c.minus, c.output)]
    assert len(used) == len(set(used)) == len(pins) - 2 - pins.count("nc")
    assert all(c.positive is not None and c.negative is not None for c in channels)


@pytest.mark.parametrize(
    "names",
    [
        ("IN+", "IN-", "VCC", "OUT", "FOO"),
        ("IN+", "IN-", "VCC", "VDD", "OUT"),
        ("IN+", "IN+", "VCC", "VEE", "OUT"),
        ("1", "2", "3", "4", "5"),
        (),
    ],
)
def test_names_that_do_not_say_it_all_describe_nothing(names):
    """Names that do not say it all describe nothing."""
    assert channels_from(names) == ()


def test_single_names_have_roles():
    """Single names have roles."""
    assert roles_of(("N/C", "IN1+", "1OUT", "+INA", "VSUP-", "zebra")) == (
        "other",
        "in+",
        "out",
        "in+",
        "v-",
        None,
    )
