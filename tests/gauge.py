"""One output stage of a gauge: the small netlist that many tests begin with."""

DECK = """gauge output stage
VIN in 0 SIN(0 {peak} 1k)
R1 in n 10k
R2 n out {feedback}
RL out 0 {load}
XU1 0 n vp vn out TL072
VP vp 0 12
VN vn 0 -12
CP vp 0 100n
CN vn 0 100n
.end
"""


def deck(peak="0.5", feedback="20k", load="10k"):
    """Return the netlist; as delivered it is sound."""
    return DECK.format(peak=peak, feedback=feedback, load=load)


SOUND = deck()
CLIPPED = deck(feedback="470k")
"""Asks for 23.5 V on rails of 12 V."""
