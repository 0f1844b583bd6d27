"""What the reader tells of a netlist: the trap, what looks like it, and what cannot be told.

`unknown` is a netlist in which the matter cannot be decided: the rule claims nothing. Where another
rule says what is missing, it is named.
"""

from tests.rules.fourfold.four import DUAL, FOLLOWER, Four

_BASE = DUAL + FOLLOWER
_ASKED = "netlist-parameter"
"""The rule that tells of a value which rests on a parameter nobody defines."""


def _with(*cards: str) -> str:
    return _BASE + "\n".join(cards) + "\n"


def _raw(text: str) -> str:
    return "!" + text


_BLOCK = ".subckt STAGE a b\nRS a b 10k\n.ends"
_BENCH = f"VP vp 0 12\nVN vn 0 -12\n.tran 1u 1m\n{FOLLOWER}"
_MODEL = "D1 out a DSIG\nRD a 0 10k"


def _nested(depth: int) -> list[str]:
    """Return subcircuits one inside the other, and a call of the outermost."""
    cards = [".subckt S0 a", "RI a 0 10k", ".ends"]
    for level in range(1, depth):
        cards += [f".subckt S{level} a", f"XI a S{level - 1}", ".ends"]
    return [*cards, f"XS out S{depth - 1}"]


CASES = {
    "netlist-value-suffix": Four(
        passing=_with("RX out 0 1meg"),
        failing=_with("RX out 0 1M"),
        inside=_with("RX out 0 1MEG"),
        outside=_with("CX out 0 1F"),
        unknown=_with("RX out 0 {load}"),
        listed=_ASKED,
    ),
    "netlist-value-second-number": Four(
        passing=_with("RX out 0 10k"),
        failing=_with("RX out 0 10k 0603"),
        inside=_with("RX out 0 10k ; 0603"),
        outside=_with("CX vp 0 10u 16V"),
        unknown=_with("RX out 0 {load}"),
        listed=_ASKED,
    ),
    "netlist-sources-fight": Four(
        passing=_with("VX x 0 5", "RX x 0 1k"),
        failing=_with("VX x 0 5", "VY x 0 6", "RX x 0 1k"),
        inside=_with("VX x 0 5", "VY y 0 5.1", "RY y x 1", "RX x 0 1k"),
        outside=_with("VX x 0 5", "VY x 0 5.1", "RX x 0 1k"),
        unknown=_with("VX x 0 5", "J1 x 0 CONN2", "RX x 0 1k"),  # what comes there nobody says
        listed=None,
    ),
    "netlist-no-solution": Four(
        passing=_BASE,
        failing=_with("EX x 0 x 0 1", "RX x q 1k", "RY q r 1k", "XU2 0 q vp vn r TL072"),
        # a conductance of -1 mS on one of 1 mS leaves nothing
        inside=_with("IX 0 x 1u", "GX x 0 x 0 -0.9m", "RX x 0 1k", "XU2 x r vp vn r TL072"),
        outside=_with("IX 0 x 1u", "GX x 0 x 0 -1m", "RX x 0 1k", "XU2 x r vp vn r TL072"),
        unknown=_with("IX 0 x 1u", "GX x 0 x 0 {amps}", "RX x 0 1k", "XU2 x r vp vn r TL072"),
        listed="headroom-output",
    ),
    "netlist-value-missing": Four(
        passing=_with("RX out 0 10k"),
        failing=_with("RX out 0"),
        inside=_with("RX out 0 R=10k"),
        outside=_with("CX out 0"),
        unknown=_with("RX out 0 {load}"),
        listed=_ASKED,
    ),
    "netlist-value-form": Four(
        passing=_with("RX out 0 20.5k"),
        failing=_with("RX out 0 20,5k"),
        inside=_with("RX out 0 2.05e4"),
        outside=_with("RX out 0 1.2.3k"),
        unknown=_with("RX out 0 {load}"),
        listed=_ASKED,
    ),
    "netlist-value-sign": Four(
        passing=_with("RX out 0 10k"),
        failing=_with("RX out 0 -10k"),
        inside=_with("RX out x 1m", "RY x 0 10k"),
        outside=_with("CX out 0 -1p"),
        unknown=_with("RX out 0 {load}"),
        listed=_ASKED,
    ),
    "netlist-unreadable": Four(
        passing=_BASE,
        failing=_raw(" \n\n"),
        inside=_raw("title only\nC1 a 0 1u\nR1 a 0 1k\n.end\n"),
        outside=_raw("title only\n* C1 a 0 1u\n.end\n"),
        unknown=_raw("title only\nR1 a 0 1k\n"),  # readable, and no op-amp in it
        listed="all rules of stages",
    ),
    "netlist-encoding": Four(
        passing=_with("CX out 0 10u"),
        failing=_with("CX out 0 10\ufffdF"),
        inside=_with("CX out 0 10µ"),  # a micro sign is known
        outside=_with("RX out\u00a00 10k"),
        unknown=_with("* \ufffd is lost in a comment"),
        listed=None,
    ),
    "netlist-title": Four(
        passing=_BASE,
        failing=_raw(f"V9 x 0 5\n{_BASE}RX x 0 1k\n.end\n"),
        inside=_raw(f"R1 of the gauge\n{_BASE}.end\n"),
        outside=_raw(f"R1 out 0 10k\n{_BASE}.end\n"),
        unknown=_raw(f"\n{_BASE}.end\n"),
        listed=None,
    ),
    "netlist-continuation": Four(
        passing=_with("RX out 0", "+ 10k"),
        failing=_raw(f"river gauge\n+ 10k\n{_BASE}.end\n"),
        inside=_with("RX out 0", "* between", "+ 10k"),
        outside=_with("* a comment", "+ that goes on").replace(_BASE, ""),
        unknown=_with("RX out 0", "+"),
        listed="netlist-value-missing",
    ),
    "netlist-end": Four(
        passing=_BASE,
        failing=_raw(f"river gauge\n{_BASE}.end\nRX out 0 10k\n"),
        inside=_raw(f"river gauge\n{_BASE}.end\n* behind it a comment\n\n"),
        outside=_with(".subckt STAGE a b", "RS a b 10k"),
        unknown=_raw(f"river gauge\n{_BASE}"),  # no .end at all: where it ends nobody says
        listed=None,
    ),
    "netlist-card": Four(
        passing=_BASE,
        failing=_with("§ out 0 10k"),
        inside=_with("; out 0 10k"),
        outside=_with("(((( out"),
        unknown=_with("ZZ9 out 0 10k"),
        listed=None,
    ),
    "netlist-node-count": Four(
        passing=_with(_BLOCK, "XS out 0 STAGE"),
        failing=_with(_BLOCK, "XS out STAGE"),
        inside=_with(_BLOCK, "XS out 0 STAGE m=1"),
        outside=_with(_BLOCK, "XS out 0 vp STAGE"),
        unknown=_BENCH + "XS out 0 vp NOBODY\n",  # how many it has nobody says
        listed="netlist-model",
    ),
    "netlist-duplicate": Four(
        passing=_with("RX out 0 10k", "RY out 0 10k"),
        failing=_with("RX out 0 10k", "RX vp 0 10k"),
        inside=_with("RX out 0 10k", "RX1 out 0 10k"),
        outside=_with("RX out 0 10k", "rx vp 0 10k"),
        unknown=_with(_BLOCK, "XA out 0 STAGE", "XB out 0 STAGE"),  # one in each block
        listed=None,
    ),
    "netlist-model": Four(
        passing=_BENCH + _MODEL + "\n.model DSIG D(IS=1n)\n",
        failing=_BENCH + _MODEL + "\n",
        inside=_BENCH + _MODEL + "\n.MODEL dsig d\n",
        outside=_BENCH + _MODEL + "\n.model DSIG2 D\n",
        unknown=_BENCH + _MODEL + '\n.include "diodes.lib"\n',  # it may stand there
        listed="netlist-include",
    ),
    "netlist-include": Four(
        passing=_BASE,
        failing=_with('.include "not_there.lib"'),
        inside=_with('* .include "not_there.lib"'),
        outside=_with('.include "../outside.lib"'),
        unknown=_with(".options savecurrents"),
        listed=None,
    ),
    "netlist-parameter": Four(
        passing=_with(".param load=10k", "RX out 0 {load}"),
        failing=_with("RX out 0 {load}"),
        inside=_with(".param load={2*half} half=5k", "RX out 0 {load}"),
        outside=_with(".param load={half} half={load}", "RX out 0 {load}"),
        unknown=_with("RX out 0 {10k*}"),
        listed="netlist-expression",
    ),
    "netlist-expression": Four(
        passing=_with("RX out 0 {2*5k}"),
        failing=_with("RX out 0 {10k*}"),
        inside=_with("RX out 0 {1/(2-1)*10k}"),
        outside=_with("RX out 0 {1/(2-2)*10k}"),
        unknown=_with("RX out 0 {load}"),
        listed=_ASKED,
    ),
    "netlist-source": Four(
        passing=_with("VX x 0 PULSE(0 5 0 1u 1u 1m 2m)", "RX x 0 1k"),
        failing=_with("VX x 0 PWL(0 1 2)", "RX x 0 1k"),
        inside=_with("VX x 0 PWL(0 1 2 1)", "RX x 0 1k"),
        outside=_with("VX x 0 PWL(0 1 2 1 1 5)", "RX x 0 1k"),
        unknown=_with("BX x 0 V=time*2", "RX x 0 1k"),  # only a simulation tells
        listed=None,
    ),
    "netlist-ground": Four(
        passing=_BASE,
        failing=_BASE.replace(" 0 ", " com "),
        inside=_with("RX out gnd 10k"),
        outside=_with("RX out ground 10k", "RY ground 0 1"),
        unknown=_raw("title only\n.end\n"),
        listed="all rules of stages",
    ),
    "netlist-directive": Four(
        passing=_with("* railguard: load out 10k"),
        failing=_with("* railguard: lode out 10k"),
        inside=_with("* a railguard stands on every rail"),
        outside=_with("* railguard: load out"),
        unknown=_with("* lode out 10k"),
        listed=None,
    ),
    "netlist-waiver-stale": Four(
        passing=_with('RX out out 1k', '* railguard: waive netlist-shorted RX "spare"'),
        failing=_with('* railguard: waive netlist-shorted RX "spare"'),
        inside=_with('RX out out 1k', '* railguard: waive netlist-shorted rx "spare"'),
        outside=_with('RX out out 1k', '* railguard: waive netlist-shorted RY "spare"'),
        unknown=_BASE,
        listed=None,
    ),
    "netlist-stage-unknown": Four(
        passing=_with("* railguard: use XU1 linear"),
        failing=_with("* railguard: use XU9 comparator"),
        inside=_with("* railguard: use u1 linear"),
        outside=_with("* railguard: use XU11 linear"),
        unknown=_BASE,
        listed=None,
    ),
    "netlist-bound": Four(
        passing=_with(*_nested(10)),
        failing=_with(*_nested(200)),
        inside=_with(*_nested(63)),  # 64 instances inside one another
        outside=_with(*_nested(66)),
        unknown=_BENCH + "XS out NOBODY\n",  # how deep it goes nobody says
        listed="netlist-model",
    ),
    "netlist-other-dialect": Four(
        passing=_BASE,
        failing=_with(".wibble out"),
        inside=_with(".tran 1u 1m"),
        outside=_with("RX out 0 {2^3*1k}"),
        unknown=_with("* .wibble out"),
        listed=None,
    ),
}  # fmt: skip
