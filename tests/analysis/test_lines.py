"""A transistor as a straight line: what its curve says, by hand."""

import math

import pytest

from railguard.analysis.lines import (
    Line,
    control,
    first_line,
    injection_of,
    limits,
    paired,
    share_off,
    touching,
)
from railguard.analysis.transistors import Bipolar, FieldEffect


class Rows:
    """Stands for a network: each net's row is its place here, ground has none."""

    nets = ("b", "c", "e", "g", "d", "s", "Q1 inside", "M1 inside")

    def row(self, net):
        """Return it."""
        return self.nets.index(net) if net in self.nets else -1


def bipolar(name="Q1", sign=1, base="b", emitter="e"):
    """Return a transistor of a gain of 100."""
    return Bipolar(
        designator=name, collector="c", base=base, emitter=emitter, sign=sign, gain=100.0,
        gain_stated=True,
    )  # fmt: skip


MOS = FieldEffect(
    designator="M1", drain="d", gate="g", source="s", sign=1, threshold=2.0, factor=0.5
)


def test_complements_make_a_pair_only_at_the_same_nets():
    """NPN and PNP on one base and one emitter; elsewhere each stands for itself."""
    (pair,) = paired([bipolar("Q1"), bipolar("Q2", sign=-1)])
    assert (pair.npn.designator, pair.pnp.designator) == ("Q1", "Q2")
    assert len(paired([bipolar("Q1"), bipolar("Q2", sign=-1, base="b2")])) == 2
    assert len(paired([bipolar("Q1"), bipolar("Q2", sign=-1, emitter="e2")])) == 2
    assert len(paired([bipolar("Q1"), bipolar("Q2")])) == 2


def test_a_voltage_has_the_name_of_its_two_ends():
    """As a report says it."""
    assert injection_of(bipolar()) == "base-emitter voltage of Q1"
    assert injection_of(MOS) == "gate voltage of M1"


def test_a_channel_without_current_is_sought_nearer_to_its_threshold():
    """The tangent at an overdrive v stands at vto + v/2, its slope K v; a quarter of it next."""
    line = first_line(MOS)
    before = line.slope / 0.5
    assert line.volts == pytest.approx(2.0 + before / 2)
    after = touching(MOS, line, 0.0)
    assert after.slope == pytest.approx(0.5 * before / 4)
    assert after.volts == pytest.approx(2.0 + before / 8)


def test_a_channel_at_a_current():
    """K/2 v^2 of 1 A at 0.5 A/V^2 is an overdrive of 2 V."""
    line = touching(MOS, first_line(MOS), 1.0)
    assert (line.volts, line.slope) == pytest.approx((3.0, 1.0))


def test_only_a_junction_may_be_off():
    """0.1 V of 0.7 V; a threshold is that of its model."""
    assert share_off(bipolar(), Line(0.7, 10.0)) == pytest.approx(0.1 / 0.7)
    assert share_off(MOS, Line(2.0, 1.0)) == 0.0
    assert share_off(bipolar(), Line(-0.1, 10.0)) == 0.0


def test_what_opens_it_stands_between_two_nets():
    """Base less emitter, gate less source; ground stands in no row."""
    assert control(bipolar(), Rows()) == ((0, 1.0), (2, -1.0))
    assert control(bipolar(emitter="0"), Rows()) == ((0, 1.0),)
    assert control(MOS, Rows()) == ((3, 1.0), (5, -1.0))


def test_a_channel_is_a_current_source_beyond_its_overdrive():
    """Vds of at least sqrt(2 I / K): 2 V at 1 A."""
    flows, source = limits(MOS, first_line(MOS), Rows(), 1.0)
    assert (flows.why, source.why) == ("stops conducting", "is no current source any more")
    assert source.entries == ((4, 1.0), (5, -1.0))
    assert source.least == pytest.approx(math.sqrt(2 * 1.0 / 0.5))
