"""The decoupling family."""

from tests.rules.fourfold.four import FOLLOWER, NOBODYS, Four

_TWO = FOLLOWER + "XU2 out o2 vp vn o2 TL072\nRM o2 0 10k\n"
_SOURCES = "VP vp 0 12\nVN vn 0 -12\nCN vn 0 100n\nCM vn 0 100n\n"


def _one(*capacitors: str) -> str:
    cards = "\n".join(f"C{n} vp 0 {value}".rstrip() for n, value in enumerate(capacitors, 1))
    return f"{_SOURCES}{cards}\n{FOLLOWER}"


def _pair(*capacitors: str) -> str:
    return _one(*capacitors).replace(FOLLOWER, _TWO)


def _before(ohms: str, value: str = "100n") -> str:
    return f"VP raw 0 12\nRS raw vp {ohms}\nC1 raw 0 {value}\nVN vn 0 -12\nCN vn 0 100n\n{FOLLOWER}"


def _across(small: str, value: str = "100n") -> str:
    cards = f"C2 vp 0 {small}\nC3 vn 0 {small}\n" if small else ""
    return f"VP vp 0 12\nVN vn 0 -12\nC1 vp vn {value}\n{cards}{FOLLOWER}"


def _bulk(value: str) -> str:
    rails = f"VP raw 0 12\nRS raw vp 1\nC1 vp 0 100n\nC2 vp 0 {value}\n"
    return f"{rails}VN vn 0 -12\nCN vn 0 100n\n{FOLLOWER}"


def _fast(value: str, device: str = "OPA690") -> str:
    rails = f"VP vp 0 5\nVN vn 0 -5\nC1 vp 0 100n\nC2 vn 0 100n\nC3 vp 0 {value}\nC4 vn 0 {value}\n"
    return rails + "VIN in 0 SIN(0 1 1k)\nXU1 in out vp vn out " + device + "\nRL out 0 1k\n"


def _reference(value: str) -> str:
    bypass = f"CB ref 0 {value}\n"
    return (
        f"VP vp 0 5\nCP vp 0 100n\nR1 vp ref 10k\nR2 ref 0 10k\n{bypass}"
        "XU1 ref out vp 0 out MCP6002\nRL out 0 100k\n"
    )


CASES = {
    "decoupling-absent": Four(
        passing=_one("100n"),
        failing=_one("100p"),
        inside=_one("10n"),
        outside=_one("9.9n"),
        unknown=_one(""),
    ),
    "decoupling-few": Four(
        passing=_pair("100n", "100n"),
        failing=_pair("100n"),
        inside=_pair("100n", "10n"),
        outside=_pair("100n", "9.9n"),
        unknown=_pair("100n", ""),
    ),
    "decoupling-behind-series": Four(
        passing=_one("100n"),
        failing=_before("10"),
        inside=_before("0.5"),  # what a jumper or a trace has
        outside=_before("0.51"),
        unknown=_before("10", ""),
        listed="decoupling-absent",
    ),
    "decoupling-rail-to-rail-only": Four(
        passing=_across("100n"),
        failing=_across(""),
        inside=_across("10n"),
        outside=_across("9.9n"),
        unknown=_across("", ""),
        listed="decoupling-absent",
    ),
    "decoupling-bulk": Four(
        passing=_bulk("10u"),
        failing=_bulk("100n"),
        inside=_bulk("1u"),
        outside=_bulk("0.98u"),
        unknown=_bulk(""),
        listed=None,
    ),
    "decoupling-fast": Four(
        passing=_fast("1n"),
        failing=_fast("100n"),
        inside=_fast("10n"),
        outside=_fast("10.2n"),
        unknown=_fast("100n", NOBODYS),
        listed=None,
    ),
    "decoupling-reference": Four(
        passing=_reference("10u"),
        failing=_reference("1n"),
        inside=_reference("33n"),  # with 5 kilohm a corner at 965 Hz
        outside=_reference("31n"),  # 1027 Hz
        unknown=_reference("BYPASS"),
    ),
    "decoupling-rating": Four(
        passing=_one("100n 50V"),
        failing=_one("100n 10V"),
        inside=_one("100n 17.2V"),  # 12 V are 70 % of 17.14 V
        outside=_one("100n 17.1V"),
        unknown=_one("100n"),
        listed=None,
    ),
}
