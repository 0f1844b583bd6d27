"""What is odd about a circuit that was read without trouble."""

from tests.rules.fourfold.four import DUAL, FOLLOWER, NOBODYS, Four

_BASE = DUAL + FOLLOWER

CASES = {
    "netlist-dangling": Four(
        passing=_BASE,
        failing=_BASE + "RX out nowhere 10k\n",
        inside=_BASE + "RX out field 10k\n* railguard: load field 10k\n",
        outside=_BASE + "RX out field 10k\n* railguard: load fields 10k\n",
        unknown=_BASE + "RX out field 10k\nJ1 field CONN1\n",  # what comes there nobody says
        listed=None,
    ),
    "netlist-shorted": Four(
        passing=_BASE + "RX out 0 10k\n",
        failing=_BASE + "RX out out 10k\n",
        inside=_BASE + "RX out x 0\nRY x 0 10k\n",  # a jumper joins two nets
        outside=_BASE + "RX out OUT 10k\n",
        unknown=_BASE + "RX out out DNP\n",
        listed=None,
    ),
    "netlist-device-unknown": Four(
        passing=_BASE,
        failing=_BASE.replace("TL072", NOBODYS),
        inside=_BASE.replace("TL072", "TL072XYZ"),  # an order code of the family
        outside=_BASE.replace("TL072", "TQ072"),
        unknown=_BASE + "XU9 a b c d e f g NEVERHEARD\n",
        listed=None,
    ),
    "netlist-value-series": Four(
        passing=_BASE + "RX out 0 10k\n",
        failing=_BASE + "RX out 0 12345\n",
        inside=_BASE + "RX out 0 10.2k\n",  # E96
        outside=_BASE + "RX out 0 10.3k\n",  # between 10.2k and 10.4k (E192)
        unknown=_BASE + "RX out 0 {load}\n",
        listed="netlist-parameter",
    ),
}
