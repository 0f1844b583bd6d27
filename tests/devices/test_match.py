"""What names stand for."""

import pytest

from railguard.devices.catalogue import load
from railguard.devices.match import normalised, spell_out


@pytest.fixture(scope="module")
def catalogue():
    """The shipped catalogue."""
    return load()


@pytest.mark.parametrize(
    ("written", "family", "channels"),
    [
        ("TL072CP", "TL07x", 2),
        ("MCP6002-I/SN", "MCP6001", 2),
        ("OP-07E", "OP07", 1),
        ("AD820_ALT_XU1", "AD822", 1),
        ("TL081/301/TI", "TL08x", 1),
        ("tl072", "TL07x", 2),
        ('"TL072"', "TL07x", 2),
        ("'NE5532AP'", "NE5532", 2),
        ("LM358 SO-8 dual", "LM358", 2),
        ("Amplifier_Operational:TL074", "TL07x", 4),
        ("µA741CN", "uA741", 1),
        ("μA741", "uA741", 1),
        ("JRC4558D", "RC4558", 2),
        ("4558", "RC4558", 2),
        ("NJM072D", "TL07x", 2),
        ("HA17358A", "LM358", 2),
        ("lm358.sub", "LM358", 2),
        ("TI_TL084", "TL08x", 4),
        ("TL07x", "TL07x", None),
        ("ADA4522-2ARMZ", "ADA4522", 2),
    ],
)
def test_names_as_seen_in_netlists_lead_to_their_family(catalogue, written, family, channels):
    """Names as seen in netlists lead to their family."""
    match = catalogue.match(written)
    assert (match.sort, match.device.family, match.channels) == ("op-amp", family, channels)
    assert match.name == written


@pytest.mark.parametrize(
    ("written", "family"),
    [
        ("LM358BIDR", "LM358B"),
        ("LM358ADR", "LM358"),
        ("TL072HIDR", "TL07xH"),
        ("LMV321AIDBVR", "LMV358A"),
        ("LMV321IDBVR", "LMV358"),
        ("LTC2050HVCS5", "LTC2050HV"),
        ("LTC2050CS5", "LTC2050"),
        ("LM2904VDR", "LM2904V"),
        ("LT1677CS8", "LT1677"),
        ("LT1678CS8", "LT1678"),
        ("OP1177ARZ", "OP1177"),
        ("OP177GPZ", "OP177"),
        ("MCP601-I/P", "MCP601"),
        ("MCP6001T-I/OT", "MCP6001"),
    ],
)
def test_the_longest_base_wins(catalogue, written, family):
    """A grade that is another die has its own base, longer than its relative's."""
    assert catalogue.match(written).device.family == family


@pytest.mark.parametrize("written", ["LM3580", "TL0721", "OP0712", "NE55321", "AD8220X7"])
def test_a_digit_behind_a_base_makes_it_another_device(catalogue, written):
    """A digit behind a base makes it another device."""
    match = catalogue.match(written)
    assert match.device is None


@pytest.mark.parametrize(
    ("written", "channels"),
    [("LMC6032/NS", 2), ("LMV321LIDBVR", 1), ("OPA1604AIDR", 4), ("OPA2999", 2), ("OPA4131UA", 4)],
)
def test_an_op_amp_without_figures_is_still_an_op_amp(catalogue, written, channels):
    """An op amp without figures is still an op amp."""
    match = catalogue.match(written)
    assert (match.sort, match.device, match.channels) == ("op-amp", None, channels)


@pytest.mark.parametrize(
    "written",
    [
        "OPAMP",
        "opamp",
        "OPAMP5",
        "IDEAL_OPAMP",
        "UNIVERSALOPAMP",
        "UniversalOpamp2",
        "kicad_builtin_opamp",
        "op_amp",
        "my_op-amp_3",
        "OA1",
    ],
)
def test_an_amplifier_without_a_type_is_generic(catalogue, written):
    """An amplifier without a type is generic."""
    match = catalogue.match(written)
    assert (match.sort, match.device) == ("generic", None)


@pytest.mark.parametrize(
    "written",
    [
        "",
        '""',
        "FILTER",
        "RC_LOWPASS",
        "SENSOR_BRIDGE",
        "BC547",
        "1N4148",
        "2N7002",
        "RELAY",
        "{x}",
    ],
)
def test_what_is_no_device_known_here_is_unknown(catalogue, written):
    """What is no device known here is unknown."""
    match = catalogue.match(written)
    assert (match.sort, match.device, match.also) == ("unknown", None, ())


@pytest.mark.parametrize("written", ["LM358_FILTER", "TL072_PREAMP", "GAUGE_OPAMP_STAGE"])
def test_a_sheet_named_after_a_device_is_no_device(catalogue, written):
    """A sheet named after a device is no device."""
    assert catalogue.match(written).sort == "unknown"


def test_two_families_are_both_named(catalogue):
    """A value that names alternatives, and a number without letters that several families share."""
    either = catalogue.match("TL072/NE5532")
    assert (either.device.family, either.also) == ("TL07x", ("NE5532",))
    bare = catalogue.match("358")
    assert bare.device is None
    assert bare.also == ("LM358", "LMV358")
    assert bare.channels == 2


def test_second_sources_of_one_family_are_no_alternatives(catalogue):
    """Second sources of one family are no alternatives."""
    assert catalogue.match("TL072/TL071").also == ()


@pytest.mark.parametrize(
    ("written", "nearest"),
    [("TL07Z", "TL07"), ("NE553Z", "NE553"), ("OPA213A", ""), ("LM35B", ""), ("MCP60O2", "MCP60")],
)
def test_a_slip_of_one_letter_suggests_a_name(catalogue, written, nearest):
    """The suggestion is a family's name; which member of the series it is cannot be known."""
    match = catalogue.match(written)
    assert match.device is None
    if nearest:
        assert match.nearest.startswith(nearest)


@pytest.mark.parametrize("written", ["FILTER1", "SUPPLY", "N015", "R1", "CHANNEL", "XREG"])
def test_what_looks_like_no_order_code_suggests_nothing(catalogue, written):
    """What looks like no order code suggests nothing."""
    assert catalogue.match(written).nearest == ""


def test_order_codes_are_read_without_quotes_marks_and_the_rest_of_the_line():
    """Order codes are read without quotes marks and the rest of the line."""
    assert normalised(" 'op-07' precision") == "OP07"
    assert normalised("OP_27G") == "OP27G"
    assert normalised("ADA4522-1") == "ADA4522-1"
    assert normalised("") == ""


def test_character_sets_are_spelled_out():
    """Character sets are spelled out."""
    assert list(spell_out("TL07[124]")) == ["TL071", "TL072", "TL074"]
    assert list(spell_out("A[12]B[34]")) == ["A1B3", "A1B4", "A2B3", "A2B4"]
    assert list(spell_out("OP07")) == ["OP07"]
