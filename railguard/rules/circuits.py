"""Circuits that are no plain stage: how each is known, and what is assumed of it.

`railguard rules circuits` prints this. Names are for people: the rules rest on the algebra of the
loops, and only the use of a stage (linear, comparator, oscillator, unused) changes what is judged.
"""

import msgspec


class Assumed(msgspec.Struct, frozen=True):
    """What is assumed of one kind of circuit.

    seen     how it is known
    assumed  what the numbers and the rules take for granted of it
    instead  what a user states or runs where that is not so
    """

    name: str
    seen: str
    assumed: str
    instead: str


_STATE = 'state the use: [stages] "U3" = { use = "linear" }'

CIRCUITS = (
    Assumed(
        "comparator",
        "More of its output comes back to the non-inverting input than to the other one, or none "
        "comes back, and the output reaches only a switch, gate, base, diode or lamp; or it is "
        "stated.",
        "Its output stands at one of its limits and has no headroom to judge. Its thresholds are "
        "printed. Resistors at its output bound its current, their other ends between its rails. "
        "Its gain turns no other stage's loop round, over a common rail for one.",
        _STATE,
    ),
    Assumed(
        "relaxation oscillator",
        "Its output charges a capacitor at its inverting input and sets the level at the other "
        "one.",
        "As a comparator. A threshold divided from a rail needs no capacitor: it may follow it.",
        _STATE,
    ),
    Assumed(
        "sine oscillator",
        "With ideal amplifiers and no signal the circuit moves by itself; or it is stated.",
        "Its amplitude is set by something that is not followed, so its range and what it drives "
        "are not checked.",
        "--engine ngspice, which follows it",
    ),
    Assumed(
        "precision rectifier, limiter, peak detector",
        "Its loop is open as drawn and closed once its diodes conduct.",
        "The loop has the sign its conducting diodes give it; it is neither open nor reversed. "
        "Levels that rest on the diodes are not checked.",
        "--engine ngspice",
    ),
    Assumed(
        "current pump",
        "Both inputs have feedback, and with its load and all other stages active the negative one "
        "outweighs the positive one.",
        "It is a linear stage at the values as drawn. What mismatch of its resistors does to its "
        "output resistance is not judged.",
        "resistor tolerances under [tolerances]: the corners of its range then count them",
    ),
    Assumed(
        "state-variable filter",
        "Integrators without a DC path of their own that stand in a ring of stages.",
        "The ring holds their levels: none is open. Loops are judged with all other stages active, "
        "corners and coupling inside the ring are meant.",
        _STATE,
    ),
    Assumed(
        "composite amplifier",
        "One stage stands inside the feedback of another.",
        "Each loop is judged with the other one active; a stage that is open by itself is held by "
        "the outer loop.",
        _STATE,
    ),
    Assumed(
        "servo loop",
        "An integrator whose output sets the level of the stage whose level it senses.",
        "The stages hold each other's levels; the integrator is not open.",
        _STATE,
    ),
    Assumed(
        "bridge-tied pair",
        "Two outputs with a load between them.",
        "Each output gives the whole current of the load, one sourcing and one sinking; both "
        "signals happen at the same instant. What the load asks too much of both is one finding.",
        "signals of one group under [signals] where they are stated",
    ),
    Assumed(
        "boosted output, current sink or source",
        "A transistor, two in a row or a complementary pair whose base or gate an output drives.",
        "A bipolar one takes its current over the gain of its model (BF), or over 50 (1,000 for "
        "the usual Darlingtons) where no model states one, and 0.7 V from base to emitter where "
        "its model gives no IS: common practice, no source. A gate stands at the square law of "
        "VTO and KP and takes C dv/dt. Lamps and other diodes between its supply and its collector "
        "or drain drop 4 V each, or what the IS of their model gives. One that stops conducting or "
        "saturates within the range of the signals, or whose current no loop holds, is not "
        "followed.",
        "a .model card with BF and IS, or with VTO, KP, CGSO and CGDO; --engine ngspice",
    ),
    Assumed(
        "4-20 mA transmitter",
        "A transistor in the loop that sets the current of its own supply.",
        "Net 0 is the circuit's own ground, behind the sense resistor where it is drawn so. The "
        "transistor is that of a current sink; it gives the loop its sign (a follower positive, "
        "a common emitter negative).",
        "as for a current sink",
    ),
    Assumed(
        "unused channel",
        "Its output reaches nothing but its own inverting input, and no signal reaches its inputs.",
        "Only how its pins are tied is judged, by bias-unused.",
        '[stages] "U3B" = { use = "linear" }',
    ),
)
