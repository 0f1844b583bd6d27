"""The equations of circuits made by hand, and what stands in none."""

import numpy as np
import pytest

from railguard.analysis.network import Network
from railguard.circuit.model import Control, Element


def part(kind, designator, *nets, **fields):
    """Make an element."""
    return Element(kind=kind, designator=designator, nets=nets, **fields)


def solved(*elements, **drives):
    """Return the network of some elements and the level of each of its nets."""
    network = Network(elements, ())
    x = np.linalg.solve(network.g, network.right_hand_side(drives.items()).real)
    return network, {net: x[row] for net, row in network.rows.items()}


@pytest.mark.parametrize(("value", "ohms"), [(None, 1e-3), (0.0, 1e-3), (10.0, 10.0)])
def test_a_link_conducts_as_it_says_or_as_a_wire_does(value, ohms):
    """A fuse or a jumper into 1 ohm; ten where it has as much."""
    link, load = part("link", "F1", "a", "b", value=value), part("R", "R1", "b", "0", value=1.0)
    _, levels = solved(part("V", "V1", "a", "0"), link, load, V1=1.0)
    assert levels["b"] == pytest.approx(1 / (1 + ohms))


def test_ground_and_a_net_nobody_is_on_have_no_row():
    """Every other net has one of its own."""
    network, _ = solved(part("R", "R1", "a", "0", value=1.0))
    assert [network.row(net) for net in ("a", "0", "nowhere")] == [0, -1, -1]


@pytest.mark.parametrize(
    "control", [None, Control(gain=None, nets=("a", "0")), Control(gain=1.0, nets=("a",))]
)
@pytest.mark.parametrize("kind", ["G", "E"])
def test_a_source_that_says_too_little_is_a_plain_one(kind, control):
    """Without a control, its gain or its two nets: no current, or the volts it is given."""
    source = part(kind, "S1", "b", "0", control=control)
    rest = (part("V", "V1", "a", "0"), part("R", "R1", "b", "0", value=1e3))
    drives = {"V1": 1.0, "S1": 2.0} if kind == "E" else {"V1": 1.0}
    _, levels = solved(source, *rest, **drives)
    assert levels["b"] == pytest.approx(2.0 if kind == "E" else 0.0)


def test_controlled_sources_follow_their_controls():
    """E: three times a volt; G: 2 mS of it out of 1 kilohm, minus two volts."""
    _, levels = solved(
        part("V", "V1", "a", "0"),
        part("E", "E1", "e", "0", control=Control(gain=3.0, nets=("a", "0"))),
        part("G", "G1", "g", "0", control=Control(gain=2e-3, nets=("a", "0"))),
        part("R", "R1", "g", "0", value=1e3),
        V1=1.0,
    )
    assert levels["e"] == pytest.approx(3.0)
    assert levels["g"] == pytest.approx(-2.0)
