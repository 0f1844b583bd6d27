"""Board exports: designators that are no SPICE letters."""

import pytest

from railguard.circuit.board import kind_of
from railguard.circuit.flatten import flatten
from railguard.deck.files import deck_from_text


def elements(cards):
    """Flatten the cards of a board."""
    return {e.designator: e for e in flatten(deck_from_text(f"board\n{cards}\n")).elements}


@pytest.mark.parametrize(
    ("designator", "kind"),
    [
        ("U1", "ic"), ("IC12", "ic"), ("FB1", "link"), ("F1", "link"), ("J1", "open"),
        ("CN3", "open"), ("P1", "open"), ("BT1", "battery"), ("RV1", "pot"), ("JP2", "link"),
        ("NT1", "link"), ("TP4", "open"), ("LED1", "diode"), ("SW1", "opaque"), ("RN1", "opaque"),
        ("K1", "opaque"), ("T1", "opaque"), ("DA1", "ic"), ("VD3", "diode"), ("GB1", "battery"),
        ("VR1", "pot"), ("REG2", "ic"), ("PTC1", "link"), ("MP1", "open"), ("XTAL1", "opaque"),
    ],
)  # fmt: skip
def test_designator_table(designator, kind):
    """Each prefix of the table."""
    assert kind_of(designator) == kind


def test_ic_without_an_x_keeps_its_pins_and_value():
    """Eight package pins in order, the value last."""
    found = elements("V1 +5V 0 5\nU1 a b c 0 d e f +5V TL072")["U1"]
    assert (found.kind, found.model, len(found.nets)) == ("ic", "TL072", 8)


def test_ferrite_and_fuse_conduct():
    """They are links between their nets."""
    found = elements("V1 a 0 5\nFB1 a b 600R\nF1 b c 500mA\nR1 c 0 1k")
    assert found["FB1"].kind == found["F1"].kind == "link"


def test_connector_is_open_pins():
    """Nothing is known of what it brings."""
    assert elements("V1 a 0 5\nJ1 a b 0 CONN_3\nR1 b 0 1k")["J1"].kind == "open"


def test_trimmer_is_two_resistors_at_mid_position():
    """Three nodes and a value."""
    found = elements("V1 a 0 5\nRV1 a w 0 10k\nR1 w 0 1k")
    assert found["RV1.1"].value == found["RV1.2"].value == 5000.0


def test_battery_states_its_level_or_not():
    """A value with a V is a level, a name is none."""
    assert elements("BT1 a 0 12V\nR1 a 0 1k")["BT1"].source.level == 12.0
    assert not elements("BT1 a 0 CR2032\nR1 a 0 1k")["BT1"].source.stated


def test_resistor_that_is_not_fitted():
    """DNP is kept, and conducts nothing."""
    assert not elements("V1 a 0 5\nR1 a 0 DNP")["R1"].fitted


@pytest.mark.parametrize(
    ("card", "kind", "nets"),
    [
        ("IC1 a b c 0 d e f +5V TL072", "ic", 8),
        ("DA1 a b c 0 d e f +5V TL072", "ic", 8),
        ("N1 a b c 0 d e f +5V TL072", "ic", 8),
        ("VR1 +5V 0 a AMS1117-3.3", "ic", 3),
        ("REG1 +5V 0 a LP2950", "ic", 3),
        ("CN1 1 2 3 HEADER", "open", 3),
        ("CON2 a b c d SOCKET_4", "open", 4),
        ("CR1 a 0 1N4148", "D", 2),
        ("LED1 a 0 GREEN", "D", 2),
        ("VD1 a 0 BAT54", "D", 2),
        ("HL1 a 0 RED", "D", 2),
        ("RN1 a b c d 10k_NETWORK", "opaque", 4),
        ("GB1 a 0 12V", "battery", 2),
        ("XFB1 a b 600R", "link", 2),
        ("X§J1 a b 0 SENSOR", "open", 3),
        ("PTC1 a b 100mA", "link", 2),
    ],
)
def test_designator_that_begins_with_a_letter_of_spice(card, kind, nets):
    """It is what the table says where the card is not one of its letter."""
    (found,) = [e for n, e in elements(f"V1 +5V 0 5\n{card}").items() if n != "V1"]
    assert (found.kind, len(found.nets)) == (kind, nets)


@pytest.mark.parametrize(
    ("card", "kind"),
    [
        ("RT1 a b 10k", "R"), ("RN1 a b 4k7 5%", "R"), ("CX1 a b 100n", "C"), ("LF1 a b 10u", "L"),
        ("VR1 a 0 5", "V"), ("VD1 a 0 DC 5 AC 1", "V"), ("IC1 a 0 1m", "I"), ("VR1 a 0", "V"),
        ("DA1 a 0 dm", "D"), ("GB1 b 0 a 0 1m", "G"), ("LED1 a b 10u", "L"), ("CR1 a b {2*k}", "C"),
        ("R1 a b rm", "R"),
    ],
)  # fmt: skip
def test_card_that_fits_its_letter_stays_one(card, kind):
    """However its designator begins."""
    cards = f"V9 a 0 5\n.param k=1n\n.model dm d\n.model rm r(r=1k)\n{card}"
    (found,) = [e for n, e in elements(cards).items() if n != "V9"]
    assert found.kind == kind


@pytest.mark.parametrize(
    ("card", "found"),
    [
        ("NT1 0 agnd NetTie_2", [("NT1", "link", ("0", "agnd"))]),
        (
            "NT1 0 agnd pgnd NetTie_3",
            [("NT1.1", "link", ("0", "agnd")), ("NT1.2", "link", ("0", "pgnd"))],
        ),
        ("JP1 a b c SolderJumper_3_Bridged12", [("JP1", "link", ("a", "b"))]),
        (
            "JP1 a b c SolderJumper_3_Bridged123",
            [("JP1.1", "link", ("a", "b")), ("JP1.2", "link", ("a", "c"))],
        ),
        ("JP1 a b c Jumper_3_Open", [("JP1", "opaque", ("a", "b", "c"))]),
        ("FB1 a b 600R 0805", [("FB1", "link", ("a", "b", "600R"))]),
    ],
)
def test_pads_that_a_tie_or_a_jumper_joins(card, found):
    """A net tie joins all; a jumper those its value says, and what it does not say is not seen."""
    made = elements(f"V1 a 0 5\n{card}").values()
    assert [(e.designator, e.kind, e.nets) for e in made if e.kind != "V"] == found
