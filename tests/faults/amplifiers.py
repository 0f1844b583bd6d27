"""The op-amps the faults are tried on: each on a usual supply, with what it is known to stand.

The figures size signals and faults only. They are rounded from each maker's data sheet, and every
fault crosses its limit by a fifth at least, so that no rounding decides.
"""

from typing import NamedTuple


class Amplifier(NamedTuple):
    """A device on its supply.

    positive, negative  volts of the rails
    middle   the level signals swing round, V
    peak     the swing that is safe at the output and at the inputs of a follower, V
    low      a total supply on which it does not work, V
    high     a total supply that breaks it, V
    amperes  its short-circuit current or what comes near it, A
    slew     V/s
    product  gain-bandwidth product, Hz
    offset   the worst offset voltage, V
    leak     the worst bias current, A
    draws    what a package with one channel in use draws, A
    channels amplifiers in a package
    reach    common-mode range: (above the negative rail, above the positive rail), V
    """

    name: str
    positive: float
    negative: float
    middle: float
    peak: float
    low: float
    high: float
    amperes: float
    slew: float
    product: float
    offset: float
    leak: float
    draws: float
    channels: int
    reach: tuple[float, float]

    @property
    def single(self) -> bool:
        """Tell whether its negative pin stands on ground."""
        return self.negative == 0

    @property
    def bottom(self) -> str:
        """The net of its negative supply pin."""
        return "0" if self.single else "vn"

    @property
    def reference(self) -> str:
        """The net of the middle level."""
        return "ref" if self.middle else "0"


# name, rails, middle, peak, low, high, amperes, slew, product, offset, leak, draws, channels, reach
# fmt: off
_ROWS = (
    ("TL072", 12, -12, 0, 3.0, 6, 44, 0.040, 13e6, 3e6, 10e-3, 200e-12, 2.8e-3, 2, (4, -4)),
    ("OP07C", 15, -15, 0, 4.0, 4, 54, 0.030, 0.3e6, 0.6e6, 150e-6, 7e-9, 2.7e-3, 1, (2, -2)),
    ("OP27G", 12, -12, 0, 3.0, 5, 54, 0.040, 2.8e6, 8e6, 100e-6, 80e-9, 3e-3, 1, (4, -4)),
    ("OPA2134", 6, -6, 0, 1.5, 3.6, 44, 0.040, 20e6, 8e6, 2e-3, 100e-12, 8e-3, 2, (2.5, -2.5)),
    ("NE5532", 12, -12, 0, 3.0, 5, 54, 0.040, 9e6, 10e6, 4e-3, 800e-9, 8e-3, 2, (3, -3)),
    ("OPA197", 12, -12, 0, 3.0, 3.2, 50, 0.065, 20e6, 10e6, 100e-6, 20e-12, 1e-3, 1, (-0.1, 0.1)),
    ("LM358", 12, 0, 5, 2.0, 2.0, 40, 0.040, 0.3e6, 1e6, 7e-3, 250e-9, 0.7e-3, 2, (0, -1.5)),
    ("LT1013", 12, 0, 5, 2.0, 2.8, 54, 0.025, 0.4e6, 0.8e6, 300e-6, 30e-9, 0.7e-3, 2, (0, -1.5)),
    ("MCP6002", 5, 0, 2.5, 1.0, 1.2, 8.6, 0.023, 0.6e6, 1e6, 4.5e-3, 5e-12, 0.2e-3, 2, (-0.3, 0.3)),
    ("TLV9002", 3.3, 0, 1.6, 0.7, 1.2, 7.4, 0.040, 2e6, 1e6, 1.6e-3, 5e-12, 0.12e-3, 2, (-0.1, 0.1)),
    ("OPA333", 5, 0, 2.5, 1.0, 1.2, 8.6, 0.005, 0.16e6, 0.35e6, 10e-6, 200e-12, 17e-6, 1, (-0.1, 0.1)),
    ("AD8605", 5, 0, 2.5, 1.0, 1.9, 7.4, 0.080, 5e6, 10e6, 65e-6, 1e-12, 1e-3, 1, (0, 0)),
    ("AD822", 6, 0, 2.5, 0.8, 3.6, 44, 0.025, 3e6, 1.8e6, 800e-6, 25e-12, 1.3e-3, 2, (-0.2, -1)),
)
# fmt: on
AMPLIFIERS = tuple(Amplifier(*row) for row in _ROWS)

# fmt: off
_MORE_ROWS = (
    ("TL074", 15, -15, 0, 5.0, 6, 44, 0.040, 13e6, 3e6, 10e-3, 200e-12, 7e-3, 4, (4, -4)),
    ("LF412CN", 12, -12, 0, 3.0, 6, 44, 0.025, 10e6, 3e6, 3e-3, 200e-12, 4e-3, 2, (4, -4)),
    ("AD712JN", 15, -15, 0, 5.0, 6, 44, 0.025, 16e6, 3e6, 3e-3, 75e-12, 5e-3, 2, (4, -2)),
    ("OP177G", 12, -12, 0, 5.0, 4, 54, 0.025, 0.3e6, 0.6e6, 60e-6, 3e-9, 2e-3, 1, (2, -2)),
    ("LT1001CN8", 15, -15, 0, 6.0, 4, 54, 0.025, 0.25e6, 0.8e6, 60e-6, 4e-9, 2e-3, 1, (2, -2)),
    ("OPA277PA", 5, -5, 0, 1.5, 3, 44, 0.035, 0.8e6, 1e6, 50e-6, 2.8e-9, 1e-3, 1, (2, -2)),
    ("OPA2188AID", 5, -5, 0, 2.0, 3, 50, 0.018, 0.8e6, 2e6, 25e-6, 1.4e-9, 1e-3, 2, (0, -1.5)),
    ("LM833N", 12, -12, 0, 4.0, 4, 44, 0.029, 5e6, 10e6, 5e-3, 750e-9, 5e-3, 2, (2, -2)),
    ("OPA4197ID", 15, -15, 0, 8.0, 3, 50, 0.065, 20e6, 10e6, 100e-6, 20e-12, 5e-3, 4, (-0.1, 0.1)),
    ("LM2904DR", 12, 0, 4.5, 2.0, 2, 33, 0.030, 0.3e6, 1e6, 10e-3, 250e-9, 1e-3, 2, (0, -1.5)),
    ("TLC274CN", 10, 0, 4, 1.5, 2, 22, 0.015, 3.6e6, 1.7e6, 10e-3, 60e-12, 5e-3, 4, (-0.2, -1)),
    ("TS912IN", 5, 0, 2.5, 1.5, 2, 22, 0.040, 1e6, 1.4e6, 10e-3, 5e-12, 0.4e-3, 2, (0, 0)),
    ("LMC6482AIN", 12, 0, 6, 3.0, 2, 20, 0.015, 1.3e6, 1.5e6, 3e-3, 4e-12, 1.5e-3, 2, (0, 0)),
    ("MCP6024-I/P", 5, 0, 2.5, 1.5, 2, 8.6, 0.030, 7e6, 10e6, 500e-6, 5e-12, 4e-3, 4, (-0.3, 0.3)),
    ("MCP601", 5, 0, 2.0, 1.0, 2, 8.6, 0.022, 2.3e6, 2.8e6, 2e-3, 5e-12, 0.3e-3, 1, (-0.3, -1.2)),
    ("TLV9064IDR", 3.3, 0, 1.6, 1.0, 1.4, 7.4, 0.050, 6.5e6, 10e6, 1.6e-3, 5e-12, 2e-3, 4, (-0.1, 0.1)),
    ("OPA4333AID", 3.3, 0, 1.6, 1.0, 1.4, 8.6, 0.005, 0.16e6, 0.35e6, 10e-6, 200e-12, 70e-6, 4, (-0.1, 0.1)),
    ("OPA2340UA", 5, 0, 2.5, 1.5, 2, 8.6, 0.050, 6e6, 5.5e6, 500e-6, 10e-12, 2e-3, 2, (-0.3, 0.3)),
    ("MCP6002-I/SN", 3.3, 0, 1.6, 1.0, 1.2, 8.6, 0.015, 0.6e6, 1e6, 4.5e-3, 5e-12, 0.2e-3, 2, (-0.3, 0.3)),
)
# fmt: on
MORE = tuple(Amplifier(*row) for row in _MORE_ROWS)
"""Further devices that sound designs are made of."""
