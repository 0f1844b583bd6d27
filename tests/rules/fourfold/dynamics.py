"""The dynamics family."""

from tests.rules.fourfold.four import DUAL, NOBODYS, Four


def _gain(hertz: str, gain: float = 10.0, peak: float = 0.01, device: str = "TL072") -> str:
    return (
        f"{DUAL}VIN in 0 SIN(0 {peak} {hertz})\nR1 0 n 1k\nR2 n out {1e3 * (gain - 1):.6g}\n"
        f"XU1 in n vp vn out {device}\nRL out 0 10k\n"
    )


def _coupled(farads: str, signal: str = "VIN in 0 SIN(0 1 100)") -> str:
    return (
        f"{DUAL}{signal}\nC1 in p {farads}\nR1 p 0 10k\nXU1 p out vp vn out TL072\nRL out 0 10k\n"
    )


def _filter(ohms: float, device: str = "TL072") -> str:
    """A Butterworth Sallen-Key; 10 nF and 20 nF."""
    return (
        f"{DUAL}VIN in 0 SIN(0 1 100)\nR1 in a {ohms}\nR2 a p {ohms}\nC1 a out 20n\nC2 p 0 10n\n"
        f"XU1 p out vp vn out {device}\nRL out 0 100k\n"
    )


CASES = {
    "dynamics-loop-gain": Four(
        passing=_gain("1k"),
        failing=_gain("300k"),
        inside=_gain("41k"),  # 3 MHz over a noise gain of ten over seven: 42.9 kHz
        outside=_gain("45k"),
        unknown=_gain("300k", device=NOBODYS),
    ),
    "dynamics-slew": Four(
        passing=_gain("100", 2, 1.0),
        failing=_gain("1meg", 1.01, 5.0),
        inside=_gain("410k", 1.01, 2.0),  # 8 V/us guaranteed, two thirds of it: 424 kHz at 2 V
        outside=_gain("440k", 1.01, 2.0),
        unknown=_gain("300k", device=NOBODYS),
    ),
    "dynamics-coupling": Four(
        passing=_coupled("10u"),
        failing=_coupled("10n"),
        inside=_coupled("330n"),  # 10 kilohm: 48 Hz, half of 100 Hz
        outside=_coupled("300n"),
        unknown=_coupled("10n", "VIN in 0 AC 1"),  # no band is stated
        listed=None,
    ),
    "dynamics-filter": Four(
        passing=_filter(10e3),
        failing=_filter(100),
        inside=_filter(390),  # 1 / (2 pi 14.1 nF 375) is 30 kHz, a hundredth of 3 MHz
        outside=_filter(360),
        unknown=_filter(100, NOBODYS),
    ),
}
