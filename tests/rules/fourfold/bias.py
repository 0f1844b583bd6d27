"""The bias family."""

from tests.rules.fourfold.four import DUAL, NOBODYS, Four


def _coupled(bias: str) -> str:
    return (
        f"{DUAL}VIN in 0 SIN(0 1 1k)\nC1 in p 1u\n{bias}\nXU1 p out vp vn out TL072\nRL out 0 10k\n"
    )


def _level(volts: float, peak: str = "AC 1", device: str = "MCP6002") -> str:
    return (
        f"VP vp 0 5\nCP vp 0 100n\nVIN in 0 {peak}\nC1 in p 1u\nVB b 0 {volts}\nR1 b p 100k\n"
        f"XU1 p out vp 0 out {device}\nRL out 0 100k\n"
    )


def _source(ohms: str, device: str = "OP27G") -> str:
    """1 V peak; 80 nA of bias current."""
    return (
        f"{DUAL}VIN in 0 SIN(0 1 10)\nRS in p {ohms}\nXU1 p out vp vn out {device}\nRL out 0 10k\n"
    )


def _spare(cards: str) -> str:
    used = "VIN in 0 SIN(2 1 10)\nXU1A in out vp 0 out MCP6002\nRL out 0 100k\n"
    return f"VP vp 0 5\nCP vp 0 100n\n{used}{cards}\n"


def _at(volts: float, device: str = "LM358") -> str:
    spare = f"R1 vp r {100e3 * (5 - volts) / volts:.6g}\nR2 r 0 100k\nXU1B r o vp 0 o {device}"
    return _spare(spare).replace("MCP6002", device)


CASES = {
    "bias-no-dc-path": Four(
        passing=_coupled("R1 p 0 100k"),
        failing=_coupled(""),
        inside=_coupled("R1 p 0 1g"),  # a path, however high; its error is another rule's
        outside=_coupled("C2 p 0 1u"),
        unknown=f"{DUAL}J1 p 0 CONN2\nXU1 p out vp vn out TL072\nRL out 0 10k\n",
    ),
    "bias-level": Four(
        passing=_level(2.5),
        failing=_level(0.1),
        inside=_level(0.52),  # a tenth of 5 V
        outside=_level(0.48),
        unknown=_level(0.1, device=NOBODYS),
        listed="netlist-device-unknown",
    ),
    "bias-current-error": Four(
        passing=_source("1k"),
        failing=_source("2meg"),
        inside=_source("240k"),  # 1 % of 2 V over 80 nA is 250 kilohm
        outside=_source("260k"),
        unknown=_source("2meg", NOBODYS),
        listed="netlist-device-unknown",
    ),
    "bias-unused": Four(
        passing=_spare("R1 vp m 100k\nR2 m 0 100k\nXU1B m o vp 0 o MCP6002"),
        failing=_spare("XU1B m o vp 0 o MCP6002"),
        inside=_at(3.45),  # inputs reach 1.5 V below the 5 V rail
        outside=_at(3.55),
        unknown=_spare(""),  # the other channel is not on the netlist
        listed=None,
    ),
}
