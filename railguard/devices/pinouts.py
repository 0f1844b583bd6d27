"""Which net of a card is which pin of the amplifier.

In order of trust: the user's statement, the names of the `.subckt` header, connection comments, the
package's own pins, the usual order for that number of nets.
"""

from railguard.devices.model import Channel, Match, PinOrder
from railguard.devices.pinnames import channels_from, roles_of
from railguard.errors import SettingsError
from railguard.words import Basis

USUAL = ("in+", "in-", "v+", "v-", "out")
"""The order of nine out of ten published op-amp subcircuits."""

USUAL_CHANNEL = (Channel(plus=0, minus=1, positive=2, negative=3, output=4),)

_WORDS = "non-inverting, inverting, positive supply, negative supply, output"

PACKAGES: dict[str, tuple[str, ...]] = {
    "single, 8 pins": ("nc", "in-", "in+", "v-", "nc", "out", "v+", "nc"),
    "dual, 8 pins": ("1out", "1in-", "1in+", "v-", "2in+", "2in-", "2out", "v+"),
    "power dual, 8 pins": ("1out", "v+", "2out", "v-", "2in-", "2in+", "1in+", "1in-"),
    "quad, 14 pins": (
        *("1out", "1in-", "1in+", "v+", "2in+", "2in-", "2out"),
        *("3out", "3in-", "3in+", "v-", "4in+", "4in-", "4out"),
    ),
    "quad, 16 pins": (
        *("1out", "1in-", "1in+", "v+", "2in+", "2in-", "2out", "nc"),
        *("nc", "3out", "3in-", "3in+", "v-", "4in+", "4in-", "4out"),
    ),
    "SOT-23-5": ("out", "v-", "in+", "in-", "v+"),
    "SC70-5": ("in+", "v-", "in-", "out", "v+"),
    "SOT-23-5 reversed": ("out", "v+", "in+", "in-", "v-"),
    "five-lead power": ("in+", "in-", "v-", "out", "v+"),
}
"""Pins 1 to n of the packages op-amps come in, as makers' data sheets draw them."""

_POWER_DUAL = ("L272", "TCA0372")
_FIVE_LEAD = ("LM675", "TDA2030", "L165")
_SC70_ORDER = ("LMV358", "LMV358A")


def pin_order(
    match: Match,
    count: int,
    ports: tuple[str, ...] = (),
    notes: tuple[str, ...] = (),
    user: tuple[str, ...] = (),
    board: bool = False,
) -> PinOrder | None:
    """Return where an amplifier's pins stand among a card's nets, or None: that is no op-amp.

    match  what the card's name stands for: the channels in its package
    count  nets on the card
    ports  names of the subcircuit's header, where the deck has one
    notes  pin names from a comment beside the header or card
    user   pin names the user stated, in the order of the card
    board  True: the nets are in the order of the package's pins, 1 to n

    Raises:
        SettingsError: the user's pin names do not describe an amplifier with that many pins.
    """
    if user:
        return _stated(user, count)
    if not board:
        for names in (ports, notes):
            if len(names) == count and (channels := channels_from(names)):
                return PinOrder(channels=channels, basis="netlist")
    package = _package(match, count, board)
    numbered = not ports or ports == tuple(str(pin) for pin in range(1, count + 1))
    if package and (board or numbered or (match.channels or 2) > 1):
        return _of_package(package, board)
    if count == 3:
        return _three_pins(ports)
    return _usual(count) if 5 <= count <= 8 else None


def _stated(user: tuple[str, ...], count: int) -> PinOrder:
    channels = channels_from(user) if len(user) == count else ()
    if not channels:
        raise SettingsError(
            f"The stated pins ({', '.join(user)}) do not describe an amplifier on a card with "
            f"{count} nets.",
            remedy="State one name for each net, of in+, in-, v+, v-, out and nc.",
        )
    return PinOrder(channels=channels, basis="user")


def _package(match: Match, count: int, board: bool) -> str:
    """Return the package whose pins the card's nets can be, or ""."""
    family = match.device.family if match.device else ""
    channels = match.channels
    if count == 8:
        if family in _POWER_DUAL:
            return "power dual, 8 pins"
        if channels == 1:
            return "single, 8 pins"
        return "dual, 8 pins" if channels in (2, None) else ""
    if count in (14, 16):
        return f"quad, {count} pins" if channels in (4, None) else ""
    if count == 5 and board and channels == 1 and match.sort == "op-amp":
        return _five_pins(family, match.name.upper())
    return ""


def _five_pins(family: str, name: str) -> str:
    if family in _FIVE_LEAD:
        return "five-lead power"
    if family in _SC70_ORDER or (family == "MCP6001" and name.startswith("MCP6001U")):
        return "SC70-5"
    return "SOT-23-5 reversed" if name.startswith("MCP6001R") else "SOT-23-5"


def _of_package(package: str, board: bool) -> PinOrder:
    """Take the nets as a package's pins, 1 to n.

    On a board export that is what the order of nets means, and the pin-outs of eight pins and more
    are an industry standard: common practice, not an assumption.
    """
    standard = board and package not in ("SOT-23-5", "SC70-5", "SOT-23-5 reversed")
    basis: Basis = "practice" if standard else "assumed"
    remark = f"its nets are taken as pins 1 to {len(PACKAGES[package])} of a package ({package})"
    if package == "SOT-23-5":
        remark += "; a second pin-out with the input on pin 1 exists"
    return PinOrder(channels=channels_from(PACKAGES[package]), basis=basis, remark=remark)


def _usual(count: int) -> PinOrder:
    extra = count - len(USUAL)
    more = f"; the nets after the fifth ({extra}) are left aside" if extra else ""
    return PinOrder(
        channels=USUAL_CHANNEL,
        basis="assumed",
        remark=f"the usual pin order is assumed ({_WORDS}){more}",
    )


def _three_pins(ports: tuple[str, ...]) -> PinOrder:
    """Take a card without supply pins as an ideal amplifier."""
    roles = roles_of(ports)
    if roles[:1] == ("out",):
        channel = Channel(plus=1, minus=2, positive=None, negative=None, output=0)
        words = "output, non-inverting, inverting"
    else:
        channel = Channel(plus=0, minus=1, positive=None, negative=None, output=2)
        words = "non-inverting, inverting, output"
    return PinOrder(
        channels=(channel,),
        basis="assumed",
        remark=f"an amplifier without supply pins, taken as {words}; some libraries put the "
        "inverting input first",
    )
