"""The feedback family."""

from tests.rules.fourfold.four import DUAL, LOAD, NOBODYS, Four


def _inverting(r1: str, r2: str, device: str = "TL072", peak: float = 1.0) -> str:
    return (
        f"{DUAL}VIN in 0 SIN(0 {peak} 10)\nR1 in n {r1}\nR2 n out {r2}\n"
        f"XU1 0 n vp vn out {device}\n{LOAD}"
    )


def _both(plus: str, minus: str) -> str:
    """Feedback to both inputs: positive where more comes back to the plus."""
    return (
        f"{DUAL}VA a 0 SIN(0 1 10)\nR1 a p 10k\nR2 p out {plus}\nR3 0 n 10k\nR4 n out {minus}\n"
        f"XU1 p n vp vn out OPA197\n{LOAD}"
    )


def _current_type(ohms: str, device: str = "THS3091") -> str:
    return (
        f"VP vp 0 12\nVN vn 0 -12\nCP vp 0 100n\nCN vn 0 100n\nVIN in 0 SIN(0 1 1k)\n"
        f"R1 0 n {ohms}\nR2 n out {ohms}\nXU1 in n vp vn out {device}\nRL out 0 1k\n"
    )


def _difference(common: float, tolerance: str = "* railguard: tolerance resistor 1%\n") -> str:
    """0.4 V of span at the output; 4 times 1 % of the common level comes on top."""
    return (
        f"{DUAL}{tolerance}VA a 0 SIN({common} 0.1 10)\nVB b 0 SIN({common} 0.1 13)\nR1 a n 10k\n"
        f"R2 n out 10k\nR3 b p 10k\nR4 p 0 10k\nXU1 p n vp vn out OPA197\n{LOAD}"
    )


CASES = {
    "feedback-reversed": Four(
        passing=_inverting("10k", "20k"),
        failing=_inverting("10k", "20k").replace("0 n vp", "n 0 vp"),
        inside=_both("10.5k", "10k"),
        outside=_both("9.5k", "10k"),
        unknown=f"{DUAL}VIN in 0 SIN(0 1 10)\nXU1 in n vp vn out TL072\nVX out 0 3\nVY n 0 1\n",
    ),
    "feedback-open": Four(
        passing=_inverting("10k", "20k"),
        failing=_inverting("10k", "20k").replace("R2 n out 20k\n", ""),
        inside=_inverting("10k", "20k").replace("R2 n out 20k", "R2 n out 10meg\nC2 n out 1u"),
        outside=_inverting("10k", "20k").replace("R2 n out 20k", "C2 n out 1u"),
        unknown=_inverting("10k", "20k").replace("R2 n out 20k", "C2 n out 1u\nU9 n out x DG999"),
    ),
    "feedback-low": Four(
        passing=_inverting("10k", "20k"),
        failing=_inverting("20", "40"),
        # the guaranteed 5 mA of the swing test, half of it: 2 V peak over 800 ohm
        inside=_inverting("420", "840"),
        outside=_inverting("380", "760"),
        unknown=_inverting("20", "40", NOBODYS),
    ),
    "feedback-high": Four(
        passing=_inverting("10k", "20k"),
        failing=_inverting("10meg", "20meg", "OP27G"),
        # 10 pF where nothing is listed, and 0.2 MHz: a pole there with 80 kilohm at the input
        inside=_inverting("112k", "224k", "OP07C"),
        outside=_inverting("127k", "254k", "OP07C"),
        unknown=_inverting("10meg", "20meg", NOBODYS),
    ),
    "feedback-current-type": Four(
        passing=_current_type("1.2k"),
        failing=_current_type("100"),
        inside=_current_type("1k"),
        outside=_current_type("700"),
        unknown=_current_type("1k", "TL072"),
        listed=None,
    ),
    "feedback-matching": Four(
        passing=_difference(0.02),
        failing=_difference(5),
        inside=_difference(0.04),
        outside=_difference(0.4),
        unknown=_difference(0.0),  # no common level, nothing to reject
        listed=None,
    ),
}
