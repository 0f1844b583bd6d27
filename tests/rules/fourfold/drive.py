"""The drive family."""

from tests.rules.fourfold.four import DUAL, FOLLOWER, NOBODYS, SINGLE, Four


def _load(ohms: float, device: str = "LM358") -> str:
    """10 V peak and 1 V at rest into a load on 12 V."""
    return (
        f"VP vp 0 12\nCP vp 0 100n\nVIN in 0 SIN(3 2 10)\nXU1 in out vp 0 out {device}\n"
        f"RL out 0 {ohms}\n"
    )


def _joined(between: str) -> str:
    join = f"RJ out o2 {between}\n" if between else ""
    second = "o2" if between else "out"
    return f"{DUAL}{FOLLOWER}{join}XU2 in {second} vp vn {second} TL072\n"


def _tied(card: str, output: str = "out") -> str:
    return (
        f"{DUAL}{card}\nVIN in 0 SIN(0 1 10)\nR1 0 n 10k\nR2 n {output} 10k\n"
        f"XU1 in n vp vn {output} TL072\nRL {output} 0 10k\n"
    )


def _capacitor(farads: str, device: str = "LM358") -> str:
    """No signal is known; 0.3 V/us."""
    return (
        f"VP vp 0 12\nCP vp 0 100n\nVIN in 0 DC 5 AC 1\nXU1 in out vp 0 out {device}\n"
        f"CL out 0 {farads}\n"
    )


def _above(volts: float, series: str = "100") -> str:
    source = f"VIN in 0 {volts}\n" if volts else "J1 in 0 CONN2\n"
    return f"{SINGLE}{source}RS in p {series}\nXU1 p out vp 0 out MCP6002\nRL out 0 100k\n"


def _heat(hottest: float, device: str = "LM358") -> str:
    """30 V and 20 mA at half of it: 0.31 W with the quiescent current."""
    return (
        f"* railguard: ambient 0 {hottest}\nVP vp 0 28\nCP vp 0 100n\nVIN in 0 SIN(14 5 10)\n"
        f"XU1 in out vp 0 out {device}\nRL out 0 1k\n"
    )


CASES = {
    "drive-current": Four(
        passing=_load(10e3),
        failing=_load(50),
        inside=_load(255),  # 20 mA are guaranteed: 5 V into 250 ohm, with 1 % more for tolerance
        outside=_load(245),
        unknown=f"{DUAL}J1 in 0 CONN2\nXU1 in out vp vn out TL072\nRL out 0 10k\n",
    ),
    "drive-joined": Four(
        passing=_joined("100"),
        failing=_joined(""),
        inside=_joined("1"),
        outside=_joined("").replace("in out vp vn out TL072\nRL", "in OUT vp vn OUT TL072\nRL"),
        unknown=f"{DUAL}{FOLLOWER}J1 out 0 CONN2\n",  # another sheet may join one to it
        listed=None,
    ),
    "drive-tied": Four(
        passing=_tied(""),
        failing=_tied("VX out 0 3"),
        inside=_tied("VX out x 3\nRX x 0 10k"),
        outside=_tied("", "vp"),
        unknown=_tied("J1 out 0 CONN2"),
        listed=None,
    ),
    "drive-capacitive": Four(
        passing=_capacitor("1n"),
        failing=_capacitor("1u"),
        inside=_capacitor("32n"),  # 10 mA of sink current over 0.3 V/us are 33 nF
        outside=_capacitor("35n"),
        unknown=_capacitor("1u", NOBODYS),
    ),
    "drive-input-above-rail": Four(
        passing=_above(4),
        failing=_above(12),
        inside=_above(5.75),  # 0.45 V beyond the diode's 0.3 V over 100 ohm: 4.5 mA
        outside=_above(5.85),
        unknown=_above(0),
        listed=None,
    ),
    "drive-power": Four(
        passing=_heat(25),
        failing=_heat(110),
        inside=_heat(40),
        outside=_heat(84),
        unknown=_heat(110, NOBODYS),
    ),
}
