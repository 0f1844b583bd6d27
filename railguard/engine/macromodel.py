"""An op-amp's behaviour as a subcircuit for ngspice, in our own words.

A transconductance that saturates (slew rate) feeds a capacitor (gain-bandwidth) and a resistor
(open-loop gain) to the middle of the supply. Their voltage drives the output through a resistance,
within what the drop at each rail and the current limit allow. Inputs beyond the input range stop
acting. The load's current is drawn from the supply pins. Bias current is modelled. Left out: offset
(the demand is worked out without it), noise, rejection, temperature, a second pole, phase reversal.
Where a figure is not listed a stand-in is used and named.
"""

import math

from railguard.engine.figures import Figures
from railguard.engine.waves import number

PINS = ("inp", "inn", "vcc", "vee", "out")
"""Order of a macromodel's nets."""

_TRANSCONDUCTANCE = 1e-5
_COMMON_MODE_OHMS = 1e13
_OUTSIDE_GAIN = 3.0
"""What is left of the open-loop gain for the part of an input beyond its range: so little that a
follower visibly stops following, enough that a stage driven out of its range has one answer."""
_CORNER = 0.3
"""Milliamperes over which drop and current limit blend into one another."""
_DEAD_BAND = 0.02
"""Volts the inner node may run ahead of what the output stage takes before it is held."""
_HOLD_VOLTS = 2e-3
"""Volts beyond the dead band that take up the whole slewing current."""


def limited(name: str, figures: Figures, straight: bool = False) -> str:
    """Return a macromodel with all of a device's limits.

    straight  True: without slew rate, which makes a difficult operating point easier to find
    """
    f = figures
    farads = _TRANSCONDUCTANCE / (2 * math.pi * f.bandwidth)
    slewing = f.slew * farads
    steep = _TRANSCONDUCTANCE / slewing
    act = f"({_input('p', f)})-({_input('n', f)}){f.offset:+.9g}"
    gm = (
        f"{number(_TRANSCONDUCTANCE)}*({act})"
        if straight
        else f"{number(slewing)}*tanh(({act})*{number(steep)})"
    )
    ohms = number(f.output_ohms)
    # Currents of the output stage are node voltages in milliamperes, which ngspice scales well.
    high, low = number(1e3 / f.ohms_high), number(1e3 / f.ohms_low)
    source, sink = f.source * 1e3, f.sink * 1e3
    ahead = f"{ohms}*1e-3"
    lines = [
        *_front(name, f, farads),
        f"Bgm 0 g i={gm}",
        f"Bha ha 0 v=(v(vcc)-v(out)-{number(f.drop_high)})*{high}",
        f"Bla la 0 v=(v(out)-v(vee)-{number(f.drop_low)})*{low}",
        f"Bih ih 0 v={_least('v(ha)', source)}",
        f"Bil il 0 v={_least('v(la)', sink)}",
        f"Bio io 0 v=max(min((v(g)-v(out))*{number(1e3 / f.output_ohms)},v(ih)),-v(il))",
        "Bup vcc out i=1e-3*max(v(io),0)",
        "Bdn out vee i=1e-3*max(-v(io),0)",
        f"Bcl g 0 i={number(slewing / _HOLD_VOLTS)}*("
        f"max(v(g)-v(out)-{ahead}*v(ih)-{number(_DEAD_BAND)},0)"
        f"-max(v(out)-v(g)-{ahead}*v(il)-{number(_DEAD_BAND)},0))",
        f".ends {name}",
    ]
    return "\n".join(lines) + "\n"


def _front(name: str, f: Figures, farads: float) -> list[str]:
    """Return what both kinds share: header, inputs, gain node, quiescent current."""
    half = number(f.input_farads / 2)
    return [
        f".subckt {name} {' '.join(PINS)}",
        f"Rid inp inn {number(f.input_ohms)}",
        f"Rcp inp mid {number(_COMMON_MODE_OHMS)}",
        f"Rcn inn mid {number(_COMMON_MODE_OHMS)}",
        f"Ccp inp 0 {half}",
        f"Ccn inn 0 {half}",
        f"Cid inp inn {half}",
        f"Ibp inp vee dc {number(f.bias)}",
        f"Ibn inn vee dc {number(f.bias)}",
        "Bmid mid 0 v=0.5*(v(vcc)+v(vee))",
        f"R1 g mid {number(f.gain / _TRANSCONDUCTANCE)}",
        f"C1 g 0 {number(farads)}",
        # The quiescent current fades with a supply that is switched off.
        f"Biq vcc vee i={number(f.supply_current)}*tanh(max(v(vcc)-v(vee),0)*2.5)",
    ]


def _input(sign: str, f: Figures) -> str:
    """Return one input's voltage as the input stage sees it through its range."""
    pin = f"v(in{sign})"
    above = f"max({pin}-v(vcc){-f.input_high:+.9g},0)" if f.input_high is not None else "0"
    below = f"max(v(vee){f.input_low:+.9g}-{pin},0)" if f.input_low is not None else "0"
    return f"{pin}-{number(1 - _OUTSIDE_GAIN / f.gain)}*({above}-{below})"


def _least(expression: str, limit: float) -> str:
    """Return the smaller of an expression and a limit, rounded where they cross."""
    most, corner = number(limit), number(min(_CORNER, limit / 10) ** 2)
    return f"0.5*({expression}+{most}-sqrt(({expression}-{most})*({expression}-{most})+{corner}))"
