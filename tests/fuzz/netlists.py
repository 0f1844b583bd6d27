"""Netlists to try the whole review on: valid ones, nearly valid ones, and hostile ones.

Each strategy draws the bytes of one main deck.
"""

from hypothesis import strategies as st

NETS = ("0", "gnd", "in", "out", "n1", "n2", "vp", "vn", "+5V", "Net-_U1-Pad2_", "/sheet/ref", "?")
DEVICES = ("TL072", "MCP6002-I/SN", "LM833", "OPA2134", "LM393", "NO_SUCH", "BRIDGE")
VALUES = (
    *("10k", "4k7", "1M", "1Meg", "100n", "1F", "10u 16V", "4,7k", "0", "-3", "1e400", "1e-400"),
    *(
        "{R}",
        "{1/0}",
        "{R*2",
        "'R'",
        "{sqrt(-1)}",
        "10k 0603",
        "1.2.3",
        "µ",
        "10µ",
        "5%",
        "",
        "nan",
    ),
    *("SIN(0 1 1k)", "DC 5 AC 1", "PULSE(0 1 0 1n 1n 1m 2m)", "PWL(0 0 1m 1)", "EXP(", "POLY(2)"),
)
CONTROL = "\x00\x07\x08\x1a\x1b\r\x7f\x85\u2028\u202e\u2066\ufeff"

net = st.sampled_from(NETS)
value = st.sampled_from(VALUES)
number = st.integers(1, 4)


@st.composite
def card(draw):
    """Draw one card with the node count its letter wants."""
    letter = draw(st.sampled_from("RCLVIEGDQJMX"))
    name = f"{letter}{draw(number)}"
    count = {"E": 4, "G": 4, "Q": 3, "J": 3, "M": 4, "X": 5}.get(letter, 2)
    nodes = " ".join(draw(net) for _ in range(count))
    if letter == "X":
        return f"{name} {nodes} {draw(st.sampled_from(DEVICES))}"
    if letter in "DQJM":
        return f"{name} {nodes} {draw(st.sampled_from(('1N4148', 'NX', 'DM')))}"
    return f"{name} {nodes} {draw(value)}"


DOTS = (
    *(
        ".param R=4k7",
        ".param A={B} B={A}",
        ".func f(x)={f(x)}",
        ".global vp",
        ".tran 1u 1m",
        ".end",
    ),
    *(
        ".subckt BRIDGE a b c d e PARAMS: k=2",
        "R9 a b {k}",
        "X9 a b c d e BRIDGE",
        ".ends",
        ".ends X",
    ),
    *(".model 1N4148 D(IS=1n)", ".model NX NPN BF=", ".lib models.lib", ".include other.cir"),
    *('.include "../../etc/passwd"', ".lib x.lib tt", ".endl", ".if (R>1)", ".else", ".endif"),
    *(".control", "shell rm -rf /", ".endc", "+ continued", "* railguard: rail vp 12 tol=10%"),
    *(
        "* railguard: signal in peak=50m",
        "* railguard: use X1 comparator",
        "* railguard: waive",
        "+",
    ),
    *(
        "* railguard: signal in low=1 high=-1 to=1e99",
        "* railguard: load out 0",
        "* railguard: rail",
    ),
)
line = st.one_of(card(), card(), card(), st.sampled_from(DOTS))


@st.composite
def nearly_valid(draw):
    """Draw cards in any order, some of them damaged in a place or two."""
    lines = draw(st.lists(line, max_size=25))
    text = "gauge\n" + "\n".join(lines) + "\n"
    for _ in range(draw(st.integers(0, 3))):
        at = draw(st.integers(0, len(text)))
        kind = draw(st.integers(0, 2))
        if kind == 0:
            text = (
                text[:at]
                + draw(st.sampled_from([*CONTROL, "(", ")", "{", "'", "=", ","]))
                + text[at:]
            )
        elif kind == 1:
            text = text[:at] + text[at + draw(st.integers(1, 9)) :]
        else:
            text = text[:at] + "\n" + text[at:]
    encoding = draw(st.sampled_from(("utf-8", "utf-16", "utf-8-sig", "cp1252")))
    return text.encode(encoding, "replace")


@st.composite
def stage(draw):
    """Draw a valid amplifier with values over many decades, sound or not."""
    decades = st.floats(-2, 9, allow_nan=False)
    ohms = [f"{10 ** draw(decades):.4g}" for _ in range(4)]
    farads = f"{10 ** draw(st.floats(-13, -4)):.4g}"
    rails = draw(st.sampled_from(((12, -12), (5, 0), (3.3, 0), (60, -60), (-5, 5), (0, 0))))
    device = draw(st.sampled_from(DEVICES[:4]))
    sign = draw(st.sampled_from(("p m", "m p")))
    source = draw(
        st.sampled_from(("SIN(0 1 1k)", "DC 1", "PULSE(0 5 0 1n 1n 1m 2m)", "AC 1", "1e12"))
    )
    return "\n".join(
        (
            "stage",
            f"VIN in 0 {source}",
            f"R1 in m {ohms[0]}",
            f"R2 m out {ohms[1]}",
            f"C2 m out {farads}",
            f"R3 p 0 {ohms[2]}",
            f"XU1 {sign} vp vn out {device}",
            f"RL out 0 {ohms[3]}",
            f"VP vp 0 {rails[0]}",
            f"VN vn 0 {rails[1]}",
            draw(
                st.sampled_from(("", "C1 vp 0 100n", "C1 in p 1u", "R9 out p 10k", "L1 out vn 1n"))
            ),
            "",
        )
    ).encode()


hostile = st.one_of(
    st.binary(max_size=400),
    st.text(max_size=300).map(lambda text: text.encode("utf-8", "surrogatepass")),
    st.lists(st.sampled_from([*CONTROL, "R1", " ", "\n", "+", "{", "(", ".subckt", "X1", "*"])).map(
        lambda bits: "".join(bits).encode()
    ),
)
