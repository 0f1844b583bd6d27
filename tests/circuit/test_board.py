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
        ("K1", "opaque"), ("T1", "opaque"),
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
