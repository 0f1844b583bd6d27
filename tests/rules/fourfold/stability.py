"""The stability family."""

from tests.rules.fourfold.four import DUAL, NOBODYS, Four


def _gain(gain: float, device: str = "OP37G") -> str:
    return (
        f"{DUAL}VIN in 0 SIN(0 0.1 100)\nR1 0 n 1k\nR2 n out {1e3 * (gain - 1):.6g}\n"
        f"XU1 in n vp vn out {device}\nRL out 0 10k\n"
    )


def _network(ohms: float, device: str = "AD822") -> str:
    """2.8 pF of input capacitance are listed, and 1.8 MHz."""
    return (
        f"{DUAL}VIN in 0 SIN(0 1 100)\nR1 in n {ohms}\nR2 n out {ohms}\n"
        f"XU1 0 n vp vn out {device}\nRL out 0 10k\n"
    )


def _loaded(farads: str, device: str = "MCP6002") -> str:
    return (
        f"VP vp 0 5\nCP vp 0 100n\nVIN in 0 SIN(2.5 1 100)\nXU1 in out vp 0 out {device}\n"
        f"CL out 0 {farads}\nRL out 0 100k\n"
    )


def _diode(ohms: str, across: str = "", device: str = "OPA2134") -> str:
    return (
        f"{DUAL}IPD n 0 SIN(1u 1u 10)\nRF n out {ohms}\n{across}\nXU1 0 n vp vn out {device}\n"
        "RL out 0 10k\n"
    )


CASES = {
    "stability-noise-gain": Four(
        passing=_gain(10),
        failing=_gain(2),
        inside=_gain(4.8),  # five, less 5 %
        outside=_gain(4.7),
        unknown=_gain(2, NOBODYS),
    ),
    "stability-phase-margin": Four(
        passing=_network(10e3),
        failing=_network(2e6),
        inside=_network(60e3),
        outside=_network(300e3),
        unknown=_network(2e6, NOBODYS),
    ),
    "stability-load-capacitance": Four(
        passing=_loaded("100p"),
        failing=_loaded("100n"),
        # beyond the 500 pF listed, and with 200 ohm, the most that is usual, 45 degrees at 1.1 nF
        inside=_loaded("1.05n"),
        outside=_loaded("1.15n"),
        unknown=_loaded("100n", NOBODYS),
    ),
    "stability-transimpedance": Four(
        passing=_diode("100k", "CF n out 10p"),
        failing=_diode("1meg"),
        inside=_diode("9.9k"),
        outside=_diode("10k"),
        unknown=_diode("1meg", "J1 n 0 CONN2"),
        listed=None,
    ),
}
