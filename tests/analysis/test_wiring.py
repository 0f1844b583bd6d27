"""Pin orders that the wiring shows."""

import pytest

from railguard.reviewing import review

CARDS = """station
VP vcc 0 12
VN vee 0 -12
VIN in 0 SIN(0 0.5 500)
R1 in m 10k
R2 out m 100k
R3 p 0 9.1k
C1 vcc 0 100n
C2 vee 0 100n
"""


def stage(card):
    """Review the amplifier of one X card; return its stage and the design's remarks."""
    design = review(CARDS + card + "\n", plugins=False).designs[0].design
    (found,) = design.stages
    return found, " ".join(remark.message for remark in design.remarks)


@pytest.mark.parametrize(
    "card",
    [
        "XU1 p m vcc vee out TL072",
        "XU1 p m out vcc vee TL072",
        "XU1 p m out vee vcc TL072",
    ],
)
def test_the_supplies_are_where_sources_stand(card):
    """Whatever the order, the output is the net that nothing else holds."""
    found, _ = stage(card)
    assert (found.supply.positive, found.supply.negative) == (12.0, -12.0)
    assert found.topology == "inverting"
    assert found.output.demand.high == pytest.approx(5.0, rel=0.01)


@pytest.mark.parametrize("card", ["U1 p m vcc vee out OP27G", "U1 out vee p m vcc OP27G"])
def test_a_board_card_in_the_order_of_its_symbol_or_its_package(card):
    """Both are exported; the nets tell which."""
    found, _ = stage(card)
    assert (found.supply.positive, found.supply.negative) == (12.0, -12.0)
    assert found.output.demand.high == pytest.approx(5.0, rel=0.01)


@pytest.mark.parametrize(
    "card",
    [
        "XU1 out vee p m vcc TLV9061",  # pins 1 to 5 of SOT-23-5: out, V-, in+, in-, V+
        "XU1 p vee m out vcc LMV321",  # TI SLOS263, SOT-23-5 and SC70-5: in+, GND, in-, out, VCC
        "U1 p vee m out vcc OP27G",
    ],
)
def test_an_export_in_the_order_of_a_small_package(card):
    """Nets in the order of pins 1 to 5, as schematic editors write them: no swapped supplies."""
    found, remarks = stage(card)
    assert (found.supply.positive, found.supply.negative) == (12.0, -12.0)
    assert found.output.demand.high == pytest.approx(5.0, rel=0.02)
    assert "taken from what stands on the nets" in remarks


def test_supplies_swapped_at_a_small_package_stay_swapped():
    """The output shows the package; which supply pin is which, the package says."""
    found, _ = stage("XU1 out vcc p m vee TLV9061")
    assert (found.supply.positive, found.supply.negative) == (-12.0, 12.0)


def test_an_output_on_a_supply_is_no_other_order():
    """Nothing feeds the third net back: the output is tied, which is a fault."""
    found, remarks = stage("XU1 p m vcx 0 vcc TL072\nRX vcc vcx 10")
    assert "usual pin order" in remarks
    assert found.supply.positive == pytest.approx(12.0, abs=0.1)


def test_the_report_says_where_the_order_comes_from():
    """An order taken from the wiring is an assumption, and named."""
    assert "output, positive supply, negative supply" in stage("XU1 p m out vcc vee TL072")[1]
    assert "usual pin order" in stage("XU1 p m vcc vee out TL072")[1]


def test_swapped_supplies_stay_swapped():
    """The usual order with its supplies exchanged is the fault it looks like, not another order."""
    found, remarks = stage("XU1 p m vee vcc out TL072")
    assert (found.supply.positive, found.supply.negative) == (-12.0, 12.0)
    assert "usual pin order" in remarks


def test_analyses_of_a_control_block_count():
    """They are never run, but they say that the deck was made to simulate something."""
    bench = CARDS.replace("C1 vcc 0 100n\nC2 vee 0 100n\n", "") + "XU1 p m vcc vee out TL072\n"
    block = ".control\ntran 1u 1m\nplot v(out)\n.endc\n"
    assert review(bench, plugins=False).designs[0].design.kind == "unstated"
    assert review(bench + block, plugins=False).designs[0].design.kind == "bench"
