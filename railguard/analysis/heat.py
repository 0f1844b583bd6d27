"""One channel's heat and its ends: the output followed, or bounded by the resistors at it."""

import msgspec

from railguard.analysis.bound import Range
from railguard.analysis.rail import Supply
from railguard.analysis.stage import Current, Output
from railguard.analysis.switching import is_given, most_current, most_heat
from railguard.analysis.thermal import at_ends, dissipation
from railguard.analysis.view import View
from railguard.words import Use


class Heat(msgspec.Struct, frozen=True):
    """W of one channel, and what rails and the output's range make of it at their ends.

    bounded  True where the output is not followed, and cannot be asked for more than is given
    """

    watts: float | None
    worst: Range = Range()
    bounded: bool = False


def heat_of(
    view: View, supply: Supply, output: Output, current: Current, load: float | None, use: Use
) -> Heat:
    """Return a channel's heat.

    load  resistance the output works into, ohm
    """
    device = view.amplifier.match.device
    heat = dissipation(device, supply, output, current, load)
    ends = at_ends(supply)
    if heat is not None:
        if ends is None:
            return Heat(heat)
        wide = msgspec.structs.replace(output, demand=output.worst)
        low = dissipation(device, ends[0], output, current, load)
        return Heat(heat, Range(low, dissipation(device, ends[1], wide, current, load)))
    if use == "linear":
        return Heat(None)
    most = most_current(view.amplifier, view.solution.ways, supply)
    worst = Range()
    if ends is not None:
        low, high = (
            most_heat(device, end, most_current(view.amplifier, view.solution.ways, end))
            for end in ends
        )
        worst = Range(low, high)
    return Heat(most_heat(device, supply, most), worst, is_given(most, current))
