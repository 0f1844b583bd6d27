"""The arms of a sensor bridge: a sensor's own resistors, whatever else hangs on its excitation."""

import pytest

from railguard.reviewing import review

BOARD = """pressure bridge of the river gauge
V1 vdd 0 5
C1 vdd 0 100n
C2 vdd 0 100n
C3 vdd 0 10u
R1 vdd sp {arm}
R2 sp 0 {arm}
R3 vdd sn {arm}
R4 sn 0 {arm}
I1 0 sp SIN(0 28u 10)
{amplifier}
R20 vdd mid 10k
R21 mid 0 10k
C21 mid 0 1u
"""
THREE = """XU1A sp n1 vdd 0 o1 OPA2333
XU1B sn n2 vdd 0 o2 OPA2333
R5 o1 n1 24.9k
RG n1 n2 499
R6 o2 n2 24.9k
R7 o1 p3 10k
R8 p3 ref 10k
R9 o2 n3 10k
R10 out n3 10k
XU2A p3 n3 vdd 0 out OPA2333
XU2B mid ref vdd 0 ref OPA2333
RL out 0 10k"""
TWO = """XU1A sn n1 vdd 0 o1 OPA2333
XU1B sp n2 vdd 0 out OPA2333
R5 ref n1 49.9k
R6 n1 o1 1k
R7 o1 n2 1k
R8 n2 out 49.9k
XU2 mid ref vdd 0 ref OPA333
RL out 0 10k"""
APART = """XU1A sp o1 vdd 0 o1 OPA2333
XU1B sn o2 vdd 0 o2 OPA2333
RL o1 0 10k
RM o2 0 10k
XU2 mid ref vdd 0 ref OPA333"""


def reviewed(amplifier, arm="350"):
    """Review a bridge, a reference divider on the same rail, and what reads the bridge."""
    text = BOARD.format(arm=arm, amplifier=amplifier)
    return review(text, plugins=False).designs[0]


@pytest.mark.parametrize("amplifier", [THREE, TWO])
def test_a_bridge_beside_a_reference_divider_is_a_sensor(amplifier):
    """28 uA into 175 ohm is 4.9 mV, 0.5 V at a gain of 101, or 0.25 V at 50.9: sound.

    1 % arms would make 5 V of nothing; 350 ohm is of no series; a capacitor takes the signal.
    """
    design = reviewed(amplifier)
    assert design.design.bridges == {"R1", "R2", "R3", "R4"}
    assert [f.rule for f in design.findings if f.severity != "remark"] == []
    assert not {"netlist-value-series", "decoupling-reference"} & {f.rule for f in design.findings}


def test_equal_dividers_that_nothing_compares_are_references():
    """Two amplifiers with a divider each: both want a capacitor."""
    design = reviewed(APART, "10k")
    assert design.design.bridges == frozenset()
    assert [f.rule for f in design.findings].count("decoupling-reference") == 2
