"""The supply family."""

from tests.rules.fourfold.four import DUAL, FOLLOWER, NOBODYS, Four

_REST = "VN vn 0 -12\nCP vp 0 100n\nCN vn 0 100n\n"
_OUTSIDE = "J1 vp 0 CONN2\n" + _REST + FOLLOWER


def _rails(positive: float, negative: float) -> str:
    return f"VP vp 0 {positive}\nVN vn 0 {negative}\nCP vp 0 100n\nCN vn 0 100n\n"


def _opa(half: float) -> str:
    return _rails(half, -half) + FOLLOWER.replace("TL072", "OPA2134").replace("SIN(0 2", "SIN(0 .2")


def _series(value: str) -> str:
    rails = f"VP raw 0 12\nRS raw vp {value}\nCP vp 0 100n\nVN vn 0 -12\nCN vn 0 100n\n"
    return rails + "VIN in 0 0\nXU1 in out vp vn out OPA2134\nRL out 0 100k\n"


def _named(volts: float) -> str:
    return (DUAL + FOLLOWER).replace(" vp", " +12V").replace("0 12\n", f"0 {volts}\n")


_SPLIT = """XU1A in out vp vn out TL072
XU1B in o2 {} vn o2 TL072
VIN in 0 SIN(0 2 100)
VQ vq 0 12
CQ vq 0 100n
RL out 0 10k
RM o2 0 10k
"""

CASES = {
    "supply-missing": Four(
        passing=DUAL + FOLLOWER,
        failing=_REST + FOLLOWER,
        inside=_rails(0.15, 0).replace("VN vn 0 0\n", "VN vn 0 0\n") + FOLLOWER,
        outside=_rails(0.05, 0) + FOLLOWER,  # 0.1 V is no supply
        unknown=_OUTSIDE,
    ),
    "supply-reversed": Four(
        passing=DUAL + FOLLOWER,
        failing=_rails(-12, 12) + FOLLOWER,
        inside=_rails(-11.85, -12) + FOLLOWER,
        outside=_rails(-11.95, -12) + FOLLOWER,
        unknown=_OUTSIDE,
    ),
    "supply-package-split": Four(
        passing=DUAL + _SPLIT.format("vp"),
        failing=DUAL + _SPLIT.format("vq"),
        inside=DUAL + _SPLIT.format("VP"),  # one net to SPICE
        outside=DUAL + _SPLIT.format("vq"),  # of the same level, and yet another net
        unknown=DUAL + FOLLOWER,  # the other channel is not on the netlist
        listed=None,
    ),
    "supply-range": Four(
        passing=_opa(6),
        failing=_opa(1.9),
        inside=_opa(2.65),  # 5 V is recommended, less 5 % of tolerance is 5.035 V
        outside=_opa(2.6),  # 4.94 V
        unknown=DUAL + FOLLOWER.replace("TL072", NOBODYS),
    ),
    "supply-drop": Four(
        passing=_series("50"),
        failing=_series("300"),
        inside=_series("145"),  # 4 mA typical; 5 % of 12 V is 150 ohm
        outside=_series("155"),
        unknown=_series(""),
        listed="netlist-value-missing",
    ),
    "supply-name-disagrees": Four(
        passing=_named(12),
        failing=_named(5),
        inside=_named(13.15),  # a tenth
        outside=_named(13.25),
        unknown=_named(12).replace("VP +12V 0 12\n", "J1 +12V 0 CONN2\n"),  # the name alone tells
        listed=None,
    ),
}
