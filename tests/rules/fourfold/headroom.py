"""The headroom family."""

from tests.rules.fourfold.four import DUAL, NOBODYS, Four


def _follower(peak: float, device: str = "OPA197", level: float = 0.0) -> str:
    return f"{DUAL}VIN in 0 SIN({level} {peak} 10)\nXU1 in out vp vn out {device}\nRL out 0 10k\n"


def _gain(peak: float, device: str = "OPA197") -> str:
    return (
        f"{DUAL}VIN in 0 SIN(0 {peak} 10)\nR1 0 n 10k\nR2 n out 10k\n"
        f"XU1 in n vp vn out {device}\nRL out 0 10k\n"
    )


def _open(volts: float, device: str = "OP27G", series: str = "1") -> str:
    return (
        f"{DUAL}VIN in 0 SIN({volts / 2} {volts / 2} 10)\nRS in p {series}\nVT t 0 0\n"
        f"XU1 p t vp vn out {device}\nRB out base 10k\nQ1 lamp base 0 QN\nRL vp lamp 1k\n"
        "* railguard: use XU1 comparator\n.model QN NPN\n"
    )


def _offset(gain: float, device: str = "TL072") -> str:
    return (
        f"{DUAL}VIN in 0 SIN(0 {1 / gain:.6g} 1)\nR1 0 n 100\nR2 n out {100 * (gain - 1):.6g}\n"
        f"XU1 in n vp vn out {device}\nRL out 0 20k\n"
    )


def _load(peak: float, most: str = "max-volts=3") -> str:
    signal = f"VIN in 0 SIN(0 {peak} 10)\n" if peak else "J1 in 0 CONN2\n"
    return (
        f"{DUAL}* railguard: load out 100k {most}\n{signal}XU1 in out vp vn out OPA197\n"
        "RL out 0 100k\n"
    )


CASES = {
    "headroom-output": Four(
        passing=_gain(2),
        failing=_gain(7),
        # 12 V less 5 % of tolerance is 11.4 V; at 2 mA 0.16 V are guaranteed, offset comes on top
        inside=_gain(5.45),
        outside=_gain(5.75),
        unknown=f"{DUAL}J1 in 0 CONN2\nR1 0 n 10k\nR2 n out 10k\nXU1 in n vp vn out OPA197\n"
        "RL out 0 10k\n",
    ),
    "headroom-input": Four(
        passing=_follower(2, "TL072"),
        failing=_follower(10, "TL072"),
        inside=_follower(7.2, "TL072"),  # 4 V above the negative rail, less 5 %: -7.4 V
        outside=_follower(7.6, "TL072"),
        unknown=f"{DUAL}J1 in 0 CONN2\nXU1 in out vp vn out TL072\nRL out 0 10k\n",
    ),
    "headroom-phase-reversal": Four(
        passing=_follower(2, "TL072"),
        failing=_follower(11, "TL072"),
        inside=_follower(8.95, "TL072"),  # typically 3 V above the negative rail
        outside=_follower(9.05, "TL072"),
        unknown=_follower(11, "OP177"),  # nobody says whether it turns over
        listed=None,
    ),
    "headroom-differential": Four(
        passing=_open(0.5),
        failing=_open(3),
        inside=_open(0.69),
        outside=_open(0.72),
        unknown=_open(3, "OP177"),
    ),
    "headroom-offset": Four(
        passing=_offset(10),
        failing=_offset(300),
        inside=_offset(93),  # 10 mV of offset; twice that is a tenth of some 20 V at a gain of 100
        outside=_offset(107),
        unknown=_offset(300, NOBODYS),
        listed="headroom-output",
    ),
    "headroom-load": Four(
        passing=_load(1),
        failing=_load(5),
        inside=_load(2.98),
        outside=_load(3.02),
        unknown=_load(0),
    ),
}
